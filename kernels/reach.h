/* SPDX-License-Identifier: LGPL-3.0-or-later
 * reach.h: the range of values within so many layers of neighbours.
 *
 * One limited stage keeps a value within the range of its neighbours before it; s stages move
 * energy s layers legally, so the range after a super-step is widened by one layer a stage. */
#ifndef WEND_KERNELS_REACH_H
#define WEND_KERNELS_REACH_H

#include "pairs.h"

/** Widens ranges by one layer: wide [rows][2] = least and largest of range [n][2] over each row
 * and its neighbours. Local, no overlap. */
void wend_reach_widen(const wend_pairs *pairs, wend_slices slices,
                      const double (*restrict range)[2], double (*restrict wide)[2]);

/** Farthest that a value [n] lies outside its range [n][2]; 0 where all lie within, NaN where
 * one is NaN. */
double wend_reach_excess(int32_t n, const double *restrict value,
                         const double (*restrict range)[2]);

#endif
