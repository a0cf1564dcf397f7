/* SPDX-License-Identifier: LGPL-3.0-or-later
 * exchange.h: the limited pairwise exchange of energy, in three passes over the pairs.
 *
 *   1. flux     g_i = sum_j d_ij (e_j - e_i),  q_i = -kappa_i g_i      (or the vector Q_i)
 *   2. ratios   t_ij = -(f_ij - s_ij (e_i - e_j)), the antidiffusive part; Zalesak's ratios R+-
 *   3. rate     dE_i/dt = sum_j [ s_ij (e_j - e_i) + C_ij t_ij ]
 *
 * Algebraic flux correction (Kuzmin, Shashkov & Svyatskiy 2009, J. Comput. Phys. 228, 3448;
 * Zalesak 1979): P+- are the sums of positive and negative t_ij, Q+- = (sum_j a_ij) x (largest,
 * smallest e_j - e_i, 0 included), R = min(1, Q/P), and C_ij = min(R+_i, R-_j) for t_ij > 0,
 * else min(R-_i, R+_j). No new extremum.
 *
 * t_ij is rounded to float once, in pass 2; sums and limits use the rounded value, so that
 * bounds and the total hold to the last bit of a double.
 *
 * Every quantity of a pair is odd or even under the exchange of its ends bit for bit, so the
 * exchange conserves the total. Between passes the ghosts of the column just written must be
 * filled. */
#ifndef WEND_KERNELS_EXCHANGE_H
#define WEND_KERNELS_EXCHANGE_H

#include "pairs.h"

/** Pass 1 along the field: state [n][2] = e, q; reads e of all, writes q of the rows.
 *  kappa [rows] is the coefficient along the field. Local. */
void wend_exchange_flux_along(const wend_pairs *pairs, wend_slices slices,
                              const float *restrict slope, const double *restrict kappa,
                              double (*state)[2]);

/** Pass 1 in full: state [n][4] = e, Q; writes Q = -[kappa_par b b.grad e + kappa_perp (grad e
 * - b b.grad e)]. */
void wend_exchange_flux_full(const wend_pairs *pairs, wend_slices slices,
                             float *const gradient[3], const double (*restrict field)[3],
                             const double (*restrict kappa)[2], double (*state)[4]);

/** Pass 2 along the field: writes the antidiffusive part [entries] and ratio [rows][2] = R+,
 * R-. sum_full [rows] is sum_j a_ij. Local, no overlap. */
void wend_exchange_ratios_along(const wend_pairs *pairs, wend_slices slices,
                                const float *restrict alpha, const float *restrict beta,
                                const float *restrict kept, const double *restrict sum_full,
                                const double (*restrict state)[2],
                                float *restrict antidiffusive, double (*restrict ratio)[2]);

/** Pass 2 in full. */
void wend_exchange_ratios_full(const wend_pairs *pairs, wend_slices slices,
                               float *const area[3], const float *restrict kept,
                               const double *restrict sum_full,
                               const double (*restrict state)[4], float *restrict antidiffusive,
                               double (*restrict ratio)[2]);

/** Pass 3: rate [rows] = dE/dt by exchange. `width` is the stride of state (2 or 4), whose
 * first value is e. */
void wend_exchange_rate(const wend_pairs *pairs, wend_slices slices, const float *restrict kept,
                        const double *restrict state, int width,
                        const float *restrict antidiffusive, const double (*restrict ratio)[2],
                        double *restrict rate);

/** Counts entries of which the limiter keeps less than all (C_ij < 1 with t_ij != 0), and
 * entries with t_ij != 0. Each pair is seen from both its ends. */
void wend_exchange_count_limited(const wend_pairs *pairs, wend_slices slices,
                                 const float *restrict antidiffusive,
                                 const double (*restrict ratio)[2], int64_t counts[2]);

#endif
