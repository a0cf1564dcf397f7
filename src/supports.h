/* SPDX-License-Identifier: LGPL-3.0-or-later
 * supports.h: support radii that hold the target number of neighbours, over all ranks. */
#ifndef WEND_SRC_SUPPORTS_H
#define WEND_SRC_SUPPORTS_H

#include "domain.h"
#include "particles.h"
#include "smoothing.h"

/** Finds H of the owned particles, written to place[i][3]. Collective.
 *
 *  place [n][4] holds x, y, z in canonical order. The result does not depend on the ranks.
 * Where no support reaches the target (too few particles, or more than half a period would be
 * needed) the error names the particle. */
wend_status wend_supports_find(wend_team *team, const wend_domain *domain,
                               const wend_smoothing *smoothing, double target,
                               const wend_particles *particles, double (*place)[4]);

/** Checks that twice the largest support fits in the shortest period; the error names the
 * particle. Collective. */
wend_status wend_supports_check(wend_team *team, const wend_domain *domain,
                                const wend_particles *particles, const double (*place)[4]);

#endif
