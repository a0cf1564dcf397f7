/* SPDX-License-Identifier: LGPL-3.0-or-later
 * operator.h: pair coefficients of diffusion along and across the field.
 *
 * With K = kappa_par b b + kappa_perp (1 - b b):
 *   high order   Q_i = -K_i grad e,  f_ij = A_ij.(Q_i + Q_j)/2          linearly exact
 *   low order    a_ij (e_i - e_j),  a_ij = max(0, a^b + a^o)            monotone, smearing
 *     a^b = k_ij [(A.b_i)(b_i.r) + (A.b_j)(b_j.r)] / (2 r^2),  k_ij = mean of (kappa_par -
 * kappa_perp) a^o = (mean kappa_perp) A.r / r^2 kept         s_ij = min(a_ij, max(0, phi
 * (c^2)^p a^b + a^o)),  c^2 = [(b_i.r)^2 + (b_j.r)^2] / (2 r^2)
 *
 * Pairs that lie across the field, which do the smearing, lose nearly all of their low-order
 * part; pairs along it keep the damping. Where kappa_perp = 0 everywhere one scalar a particle,
 * q = -kappa_par g, is enough: f_ij = alpha_ij q_i + beta_ij q_j with alpha_ij = A_ij.b_i/2,
 * beta_ij = A_ij.b_j/2. */
#ifndef WEND_KERNELS_OPERATOR_H
#define WEND_KERNELS_OPERATOR_H

#include "faces.h"

/** Per-particle inputs beside those of the faces; owned particles, then ghosts. */
typedef struct wend_operator_source {
  wend_face_source face;
  const double (*field)[3]; /**< unit field b; zero where B = 0 */
  const double (*kappa)[2]; /**< kappa_par, kappa_perp; equal where B = 0 */
  double angle_power;       /**< p >= 0 */
  double angle_share;       /**< phi in [0, 1] */
} wend_operator_source;

/** Computes s_ij [entries], and [rows] the limiter's room, min(sum_j a_ij, 10 kappa V_i/H_i^2),
 * and the room + sum_j s_ij, which sets the explicit step. kappa is the largest of the row's
 * pairs, max(0, kappa_par - kappa_perp) + D kappa_perp of the pair's means. Local, no overlap.
 */
void wend_operator_low_order(const wend_pairs *pairs, wend_slices slices,
                             const wend_operator_source *source, const wend_faces *faces,
                             float *restrict kept, double *restrict sum_full,
                             double *restrict sum_both);

/** Computes d_ij [entries], g_i = sum_j d_ij (e_j - e_i), from the arms. They may take the
 * place of a column of arms. Local. */
void wend_operator_slope(const wend_pairs *pairs, wend_slices slices,
                         const wend_operator_source *source, float *const arm[3], float *slope);

/** Computes alpha_ij = A_ij.b_i/2 and beta_ij = A_ij.b_j/2 [entries]. They may take the place
 * of columns of areas. Local. */
void wend_operator_along(const wend_pairs *pairs, wend_slices slices,
                         const double (*restrict field)[3], float *const area[3], float *alpha,
                         float *beta);

/** Computes the three components of c_ij (grad e = sum_j c_ij (e_j - e_i)), [entries] each.
 * They may take the place of the arms. */
void wend_operator_gradient(const wend_pairs *pairs, wend_slices slices,
                            const wend_operator_source *source, float *const arm[3],
                            float *const gradient[3]);

/** Escape rate [rows] through the missing area m_i = -sum_j A_ij of surface particles: the
 * energy that leaves a time is rate e_i, rate = [kappa_par (m.b)^2 + kappa_perp (|m|^2 -
 * (m.b)^2)] / (|m| d), with d half the particle's width. Components of m along axes that are
 * not open pass nothing. */
void wend_operator_escape(const wend_pairs *pairs, wend_slices slices,
                          const wend_operator_source *source, const wend_faces *faces,
                          const unsigned char *restrict surface, double *restrict rate);

#endif
