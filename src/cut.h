/* SPDX-License-Identifier: LGPL-3.0-or-later
 * cut.h: cuts the particles among ranks along the Hilbert curve.
 *
 * Rank r owns the keys in [start_r, start_(r+1)), chosen so that the summed weights are level.
 * Owned particles are sorted by (key, id): the canonical order, which is also the order of
 * output files. */
#ifndef WEND_SRC_CUT_H
#define WEND_SRC_CUT_H

#include "domain.h"
#include "particles.h"

/** Computes keys, moves particles to their owners and sorts them. Collective.
 *
 *  weight [n] is the work of each particle (counted pairs + 1; NULL: one each), carried
 * nowhere. Positions must lie inside the domain (periodic ones in [lo, hi)). An id found twice,
 * on any two ranks, is WEND_ERR_PARTICLES and the message names it; the particles are then
 * unchanged. */
wend_status wend_cut_particles(wend_team *team, const wend_domain *domain,
                               wend_particles *particles, const uint32_t *weight);

#endif
