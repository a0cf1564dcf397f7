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

/** Computes keys, moves particles to their owners and sorts them. Collective; the same status
 * on all ranks, and whatever fails, the particles stay as they were.
 *
 * weight [n] is the work of each particle (counted pairs + 1; 0 counts as 1; NULL: one each),
 * carried nowhere. Each boundary stands within half the weight of one key value of its level
 * place; a rank may end up empty. WEND_ERR_PARTICLES: a place outside the domain (periodic
 * axes: [lo, hi), others: [lo, hi]), an id used twice on any ranks (both named in the message),
 * no particles at all, or more than 2^31 - 1 for one rank. WEND_ERR_ARGUMENT: no positions, or
 * columns that differ between ranks. */
wend_status wend_cut_particles(wend_team *team, const wend_domain *domain,
                               wend_particles *particles, const uint32_t *weight);

#endif
