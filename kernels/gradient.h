/* SPDX-License-Identifier: LGPL-3.0-or-later
 * gradient.h: first-order moving-least-squares gradients, exact for linear fields.
 *
 *   grad e_i = sum_j c_ij (e_j - e_i),  c_ij = M_i^-1 r_ij w_ij,  M_i = sum_j w_ij r_ij r_ij^T,
 *
 * with w_ij = W(|r_ij|, H_i): entries beyond a row's own support weigh nothing. Where particles
 * stand on a plane or a line (in 2-D on a line) M_i has no usable inverse; its isotropic part,
 * M_i = 1 (sum_j w_ij r_ij^2) / D, takes its place. */
#ifndef WEND_KERNELS_GRADIENT_H
#define WEND_KERNELS_GRADIENT_H

#include "batch.h"

/** Computes the inverse moment matrices of the rows in `slices`, inverse [rows][6] as xx, xy,
 * xz, yy, yz, zz; in 2-D all with z are zero. place [n][4]: x, y, z, H > 0; owned particles,
 * then ghosts.
 *
 *  Returns the number of rows that fell back to the isotropic part, among them rows without any
 *  neighbour inside their own support, whose inverse is zero. Local, no overlap. */
int32_t wend_gradient_matrices(const wend_pairs *pairs, wend_slices slices,
                               const wend_domain *domain, const wend_smoothing *smoothing,
                               const double (*restrict place)[4],
                               double (*restrict inverse)[6]);

/** Computes c_ij of the entries in a piece of a slice; 0 on padding. inverse [rows][6]. Local.
 */
void wend_gradient_coefficients(const wend_batch *batch, const double (*restrict inverse)[6],
                                double c[restrict 3][WEND_BATCH]);

/** Computes gradient [rows][3] of a field [owned, then ghosts] for the rows in `slices`; its
 * third component is 0 in 2-D. Local, no overlap. */
void wend_gradient_apply(const wend_batch_source *source, wend_slices slices,
                         const double (*restrict inverse)[6], const double *restrict field,
                         double (*restrict gradient)[3]);

#endif
