/* SPDX-License-Identifier: LGPL-3.0-or-later
 * streaming.h: Alfvenic streaming as a field-aligned exchange with a bounded nonlinear
 * coefficient.
 *
 * Regularised streaming speed v_s = -v_A tanh(ell g/e) along b, g = b.grad e (Sharma, Colella &
 * Martin 2010, SIAM J. Sci. Comput. 32, 3564). Its flux is that of a diffusion with the
 * coefficient
 *
 *     kappa_s = gamma v_A e tanh(ell g/e) / g  <=  gamma v_A ell,
 *
 * so that one exchange carries diffusion and streaming. The pair's coefficient is taken from
 * its own difference,
 *
 *     x = ell_ij |e_j - e_i| / (ebar L),  L = |b_i.r + b_j.r|/2,  kappa_s,ij = gamma v_A,ij
 * ell_ij tanh(x)/x,
 *
 * never from the mean of the two kappa_s: next to a plateau that is wrong by orders of
 * magnitude. a_ij and s_ij follow from kappa_ij + kappa_s,ij as in operator.h, stage by stage.
 *
 * The streaming part T_ij of a pair's limited exchange, kappa_s/(kappa + kappa_s) of it, heats
 * by 2 T_ij tanh[(gamma-1)/(2 gamma) ln(e_i/e_j)], half at either end. With gamma = 4/3 that is
 * 2 T_ij (w_i - w_j)/(w_i + w_j), w = e^(1/4): along a flux tube the factors telescope to e
 * v_A^gamma = const at any resolution, and no end pays more than it received. */
#ifndef WEND_KERNELS_STREAMING_H
#define WEND_KERNELS_STREAMING_H

#include "operator.h"
#include "pairs.h"

#define WEND_CR_GAMMA (4.0 / 3.0)

/** Per-particle inputs; owned particles, then ghosts. */
typedef struct wend_streaming_source {
  const double (*kappa)[2]; /**< kappa_par, kappa_perp = 0 */
  const double (*speed)[2]; /**< v_A (0 where B = 0) and ell > 0 */
} wend_streaming_source;

/** Pair columns, [entries] each; zero on padding. */
typedef struct wend_streaming_pairs {
  float
      *pull; /**< G_ij = [(A.b_i)(b_i.r) + (A.b_j)(b_j.r)]/(2 r^2): a_ij over the coefficient */
  float *share;    /**< phi (c^2)^p: s_ij over a_ij */
  float *reach;    /**< L */
  float *fraction; /**< kappa_s/(kappa + kappa_s), written by pass 2 */
} wend_streaming_pairs;

/** Computes pull, share and reach. Local, no overlap. */
void wend_streaming_columns(const wend_pairs *pairs, wend_slices slices,
                            const wend_operator_source *source, const wend_faces *faces,
                            const wend_streaming_pairs *columns);

/** Computes bounds of the sums over pairs, [rows]: room = the most of sum_j a_ij that the
 * limiter uses (see operator.h), most = the most that room and sum_j s_ij can be, for the
 * stable step. Local. */
void wend_streaming_bounds(const wend_pairs *pairs, wend_slices slices,
                           const wend_face_source *face, const wend_streaming_source *source,
                           const wend_streaming_pairs *columns, double *restrict room,
                           double *restrict most);

/** Pass 1: state [n][2] = e, q: reads e of all, writes q = -(kappa g + gamma v_A e tanh(ell
 * g/e)) of the rows. */
void wend_streaming_flux(const wend_pairs *pairs, wend_slices slices,
                         const float *restrict slope, const wend_streaming_source *source,
                         double (*state)[2]);

/** Pass 2: as in exchange.h, and s_ij (kept) and the streaming fraction for this stage. */
void wend_streaming_ratios(const wend_pairs *pairs, wend_slices slices,
                           const float *restrict alpha, const float *restrict beta,
                           const wend_streaming_source *source,
                           const wend_streaming_pairs *columns, const double *restrict room,
                           const double (*restrict state)[2], float *restrict kept,
                           float *restrict antidiffusive, double (*restrict ratio)[2]);

/** Pass 3, after wend_exchange_rate: the sum over pairs of each row's half of the heat, which
 * may be negative before it is clipped at the particle. heat [rows]. root [n] is e^(1/4). */
void wend_streaming_heat(const wend_pairs *pairs, wend_slices slices,
                         const float *restrict kept, const float *restrict fraction,
                         const double (*restrict state)[2], const double *restrict root,
                         const float *restrict antidiffusive, const double (*restrict ratio)[2],
                         double *restrict heat);

#endif
