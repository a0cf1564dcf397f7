/* SPDX-License-Identifier: LGPL-3.0-or-later
 * slope.h: derivatives along the field by second-order moving least squares, kept from
 * amplifying noise.
 *
 *   g_i = sum_j d_ij (e_j - e_i),  sum_j d_ij r_ij = b_i
 *
 * The first-order fit d = w b.(M^-1 r) has the least noise N = sum_j d_ij^2 / w_ij = b.(M^-1 b)
 * of all weights exact for linear fields, but on disordered particles it mistakes curvature
 * across the field for a slope along it, which wears away sharp edges. The second-order fit,
 * with all products of two components of r beside r itself, is free of that; where neighbours
 * are few or badly placed it is noisy. Any blend of the two is exact for linear fields, and its
 * noise is N_1 + theta^2 (N_2 - N_1): theta is the largest share, at most 1, that keeps the
 * noise below 1.5 N_1. */
#ifndef WEND_KERNELS_SLOPE_H
#define WEND_KERNELS_SLOPE_H

#include "faces.h"

#define WEND_SLOPE_TERMS 9

/** The fit of one row: d_ij = w_ij sum_k factor_k phi_k, phi the arm over H and its products.
 */
typedef struct wend_slope {
  int terms; /**< 5 in 2-D, 9 in 3-D */
  double factor[WEND_SLOPE_TERMS];
} wend_slope;

/** Fits row i to its arms [entries] along the unit vector b (zero gives zero weights). Local.
 */
void wend_slope_fit(const wend_pairs *pairs, const wend_face_source *source,
                    float *const arm[3], int32_t i, const double b[3], wend_slope *slope);

/** Returns d_ij of the entry with arm r of row i: zero beyond the row's own support. Local. */
double wend_slope_weight(const wend_face_source *source, const wend_slope *slope, int32_t i,
                         const double r[3]);

#endif
