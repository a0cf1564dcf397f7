/* SPDX-License-Identifier: LGPL-3.0-or-later
 * local_bounds.h: tests a super-step against the range that each particle's neighbourhood
 * allows. */
#ifndef WEND_SRC_LOCAL_BOUNDS_H
#define WEND_SRC_LOCAL_BOUNDS_H

#include "geometry.h"

/** Finds how far `after` [owned] (E) lies outside the ranges of `before` [owned] within
 * `layers` layers of neighbours, as an energy density, the largest over all particles. Holds
 * for transport alone: not with escape. Takes one halo exchange a layer. Collective. */
wend_status wend_local_bounds_excess(wend_team *team, wend_geometry *geometry, int layers,
                                     const double *before, const double *after, double *excess);

#endif
