/* SPDX-License-Identifier: LGPL-3.0-or-later
 * deal.h: deals columns of 8-byte values out to ranks.
 *
 * One column travels at a time: the memory needed beside the table is two columns instead of
 * two tables of records, and counts stay far from the 2^31 limit of the message layer. */
#ifndef WEND_SRC_DEAL_H
#define WEND_SRC_DEAL_H

#include "team.h"
#include <stdint.h>

typedef struct wend_deal {
  int *send_count, *send_first; /**< [size] items for each rank, and where they start */
  int *recv_count, *recv_first; /**< [size] items from each rank, and where they go */
  int32_t received;             /**< items this rank receives in all */
} wend_deal;

/** Allocates the counts, all zero. Collective, agreed: the same status on all ranks. */
wend_status wend_deal_init(wend_team *team, wend_deal *deal);
/** Completes the deal once send_count is filled in. Collective; a rank that would receive more
 * than 2^31 - 1 items records WEND_ERR_PARTICLES, agreed on: the same status on all ranks. */
wend_status wend_deal_begin(wend_team *team, wend_deal *deal);
/** Sends a column of 8-byte values, grouped by receiver; receives one, grouped by sender.
 * Collective; a failure is recorded and returned. */
wend_status wend_deal_column(wend_team *team, const wend_deal *deal, const void *send,
                             void *recv);
/** Frees the counts and zeroes the struct. Local. */
void wend_deal_reset(wend_deal *deal);

#endif
