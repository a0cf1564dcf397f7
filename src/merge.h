/* SPDX-License-Identifier: LGPL-3.0-or-later
 * merge.h: owned particles and ghosts as one line in canonical order, for the search.
 *
 * Storage order: owned particles first, then ghosts as halo.h groups them. Owned particles need
 * not be neighbours in the merged line: a host may have cut its particles as it likes. */
#ifndef WEND_SRC_MERGE_H
#define WEND_SRC_MERGE_H

#include "team.h"
#include <stdint.h>

typedef struct wend_merge {
  int32_t n;      /**< owned particles and ghosts */
  int32_t rows;   /**< owned particles */
  int32_t *store; /**< [n] storage index of each merged particle */
  int32_t *row;   /**< [rows] merged index of each owned particle; ascending */
} wend_merge;

/** Merges owned particles, sorted by (key, id), with ghosts; key and id [owned + ghosts] in
 * storage order. Local; a failing allocation, or owned particles out of order
 * (WEND_ERR_ARGUMENT), is recorded and returned. */
wend_status wend_merge_init(wend_team *team, int32_t owned, int32_t ghosts, const uint64_t *key,
                            const uint64_t *id, wend_merge *merge);
/** Gathers items of `width` doubles from storage order into merged order [n][width]. No
 * overlap. Local. */
void wend_merge_gather(const wend_merge *merge, int width, const double *restrict stored,
                       double *restrict merged);
/** Frees the maps and zeroes the struct. Local. */
void wend_merge_reset(wend_merge *merge);

#endif
