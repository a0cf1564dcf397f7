/* SPDX-License-Identifier: LGPL-3.0-or-later
 * surface.h: which particles lie on a free surface.
 *
 * Particle i is on a surface when n = -sum_j w_ij r_ij is longer than 0.1 H_i sum_j w_ij and no
 * pair neighbour lies within 45 degrees of n. The second test uses the neighbours of both
 * supports: a particle's own support alone mistakes every jump of resolution for a surface; and
 * the raw closure is no test at all, since it passes 0.3 inside any gas. */
#ifndef WEND_KERNELS_SURFACE_H
#define WEND_KERNELS_SURFACE_H

#include "domain.h"
#include "pairs.h"
#include "smoothing.h"

/** Sets surface[i] to 1 for rows on a free surface, else 0. place [n][4]: x, y, z, H. Local, no
 * overlap. */
void wend_surface_find(const wend_pairs *pairs, wend_slices slices, const wend_domain *domain,
                       const wend_smoothing *smoothing, const double (*restrict place)[4],
                       unsigned char *restrict surface);

#endif
