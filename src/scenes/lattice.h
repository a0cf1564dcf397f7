/* SPDX-License-Identifier: GPL-3.0-or-later
 * lattice.h: particles on a jittered lattice, dealt out evenly to the ranks. */
#ifndef WEND_SCENES_LATTICE_H
#define WEND_SCENES_LATTICE_H

#include "domain.h"
#include "particles.h"

/** A domain from corner to corner, periodic on all axes or closed on all. dim 2 or 3. */
wend_domain wend_scene_domain(int dim, const double lo[3], const double hi[3], bool periodic);

typedef struct wend_lattice {
  int32_t side[3]; /**< particles an axis; side[2] = 1 in 2-D */
  double jitter;   /**< each coordinate moves by up to +- jitter spacings, evenly */
  uint64_t seed;
} wend_lattice;

/** Fills this rank's share of a lattice at cell centres, ids from 1 in lattice order, with the
 * columns in `mask` added to the positions. Jittered places are wrapped into periodic domains
 * and reflected at other borders. Collective. */
wend_status wend_lattice_fill(wend_team *team, const wend_domain *domain,
                              const wend_lattice *lattice, uint64_t mask,
                              wend_particles *particles);

/** Appends this rank's particles of another set with the same columns; ids must differ.
 * Collective. */
wend_status wend_lattice_join(wend_team *team, wend_particles *particles,
                              const wend_particles *more);

#endif
