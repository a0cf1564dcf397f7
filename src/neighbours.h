/* SPDX-License-Identifier: LGPL-3.0-or-later
 * neighbours.h: the pair lists of a rank's particles, with exactly the ghosts that they need.
 */
#ifndef WEND_SRC_NEIGHBOURS_H
#define WEND_SRC_NEIGHBOURS_H

#include "domain.h"
#include "halo.h"
#include "pairs.h"
#include "particles.h"

typedef struct wend_neighbours {
  wend_halo halo;
  int32_t owned, local; /**< rows; rows and ghosts */
  double (*place)[4];   /**< [local] x, y, z, H */
  int64_t *first;       /**< the lists: see pairs.h */
  int32_t *count;
  int32_t *index;
  wend_pairs pairs;     /**< the same, as kernels want it */
  int32_t *slice;       /**< slice numbers, interior ones first */
  wend_slices interior; /**< slices that see no ghost */
  wend_slices border;   /**< slices that see one */
  wend_slices all;
} wend_neighbours;

/** Finds all pairs r_ij < max(H_i, H_j) of owned particles. Collective.
 *  place [n][4]: x, y, z, H of the particles, which stand in canonical order. */
wend_status wend_neighbours_init(wend_team *team, const wend_domain *domain,
                                 const wend_particles *particles, const double (*place)[4],
                                 wend_neighbours *neighbours);
/** Frees all of it. Local. */
void wend_neighbours_reset(wend_neighbours *neighbours);

/** Entries of the pair lists, padding included. Local. */
int64_t wend_neighbours_entries(const wend_neighbours *neighbours);

#endif
