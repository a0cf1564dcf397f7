/* SPDX-License-Identifier: LGPL-3.0-or-later
 * support.h: the support radius that holds a target number of neighbours.
 *
 * N(H) = (unit-ball volume) sum_j f(r_j / H), self included, grows with H. Its root must not
 * depend on where a search began (another rank may begin elsewhere), so trials sit on fixed
 * levels, four an octave: the lowest level with N >= target is found first, then the root
 * between it and the level below by safeguarded Newton steps from a fixed start. */
#ifndef WEND_KERNELS_SUPPORT_H
#define WEND_KERNELS_SUPPORT_H

#include "smoothing.h"
#include <stdint.h>

/** The smallest level >= h: levels are 2^(k/4), exact constants times powers of two. */
double wend_support_level(double h);

/** Solves N(H) = target from the n distances below `trial` (a level), in canonical order, self
 *  (r = 0) included; r is spoiled. Returns H, or 0 where N(trial) < target. dim 2 or 3.
 * Relative error 1e-12.
 *
 *  Where coincident particles alone exceed the target at any radius (four in 3-D, three in 2-D
 *  with the usual targets), H is the smallest level beyond the nearest distinct particle, or 0
 *  where there is none. */
double wend_support_solve(const wend_smoothing *smoothing, int dim, double target, double trial,
                          int32_t n, double *restrict r);

#endif
