/* SPDX-License-Identifier: LGPL-3.0-or-later
 * vicinity.h: a rank's own particles and their ghosts, merged in canonical order, ready to be
 * searched. */
#ifndef WEND_SRC_VICINITY_H
#define WEND_SRC_VICINITY_H

#include "halo.h"
#include "merge.h"
#include "search.h"

typedef struct wend_vicinity {
  wend_halo halo;
  int32_t local;       /**< owned + ghosts */
  double (*place)[4];  /**< [local] x, y, z, H: owned, then ghosts */
  double (*merged)[4]; /**< [local] the same in canonical order */
  wend_merge order;    /**< maps between storage and canonical order */
  wend_tree tree;      /**< over merged */
  wend_search search;  /**< all of the above, for the search kernels */
} wend_vicinity;

/** Finds the ghosts of the owned particles and merges them in. Collective.
 *
 *  place [owned][4] holds x, y, z and the radius within which neighbours are wanted; key and id
 * [owned] in canonical order. The domain must outlive the vicinity. */
wend_status wend_vicinity_init(wend_team *team, const wend_domain *domain, int32_t owned,
                               const double (*place)[4], const uint64_t *key,
                               const uint64_t *id, wend_vicinity *vicinity);
/** Frees all of it. Local. */
void wend_vicinity_reset(wend_vicinity *vicinity);

#endif
