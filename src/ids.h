/* SPDX-License-Identifier: LGPL-3.0-or-later
 * ids.h: checks that no particle id is used twice. */
#ifndef WEND_SRC_IDS_H
#define WEND_SRC_IDS_H

#include "team.h"
#include <stdint.h>

/** Checks that the ids of all ranks are unique. Collective; the same status on all ranks:
 * WEND_ERR_PARTICLES where an id is found twice; the message names the smallest such id. */
wend_status wend_ids_unique(wend_team *team, int32_t n, const uint64_t *id);

#endif
