/* SPDX-License-Identifier: LGPL-3.0-or-later
 * split.h: where to cut a sorted line of keys so that the parts weigh the same. */
#ifndef WEND_SRC_SPLIT_H
#define WEND_SRC_SPLIT_H

#include "team.h"
#include <stdint.h>

/** Finds the first key of each rank: rank r gets keys in [start[r], start[r + 1]). Collective.
 *
 * key [n] ascending on this rank (any part of all keys), each below 2^63; before [n + 1]:
 * summed weight of the keys before each, before[n] that of all. start [size] is the same on
 * every rank and depends on keys and weights of the whole team only; each cut stands within
 * half the weight of one key value of its ideal place. The same status on all ranks. */
wend_status wend_split(wend_team *team, int32_t n, const uint64_t *key, const int64_t *before,
                       uint64_t *start);

/** Number of keys below `bound`, in [0, n]. Local. */
int32_t wend_split_count(int32_t n, const uint64_t *key, uint64_t bound);

#endif
