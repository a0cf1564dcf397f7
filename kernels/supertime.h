/* SPDX-License-Identifier: LGPL-3.0-or-later
 * supertime.h: coefficients of super-time-stepping, advancing increments d_j = y_j - y_0.
 *
 *   d_0 = 0,  d_1 = first dt L(y_0),
 *   d_j = mu d_(j-1) + nu d_(j-2) + dt [ mt L(y_0 + d_(j-1)) + ga L(y_0) ],   j = 2..s
 *
 * RKL2: Meyer, Balsara & Aslam 2014, J. Comput. Phys. 257, 594 (Legendre).
 *
 * RKG2: Skaras, Saxton, Meyer & Aslam 2021, J. Comput. Phys. 425, 109879 (Gegenbauer's
 * polynomials of index 3/2).
 *
 * Euler: one stage, d_1 = dt L(y_0). */
#ifndef WEND_KERNELS_SUPERTIME_H
#define WEND_KERNELS_SUPERTIME_H

#define WEND_STAGES_MOST 255

typedef struct wend_stage {
  double mu, nu, mt, ga;
} wend_stage;

/** A family of stabilised schemes: a row of the table. */
typedef struct wend_supertime {
  const char *name; /**< "rkg2", "rkl2", "euler" */
  int least;        /**< fewest stages: 3 (odd numbers only), 1 for Euler */
  int most;         /**< most stages: WEND_STAGES_MOST, 1 for Euler */
  /** Stable super-step over the forward-Euler limit, for s stages. */
  double (*reach)(int s);
  /** Fills stage[1..s] (stage[0] is not used); stage[1].mt is `first`. s is odd, from least to
   * most; even s >= 2 is defined as well, but not damped at the stability limit. */
  void (*stages)(int s, wend_stage *stage);
} wend_supertime;

/** Finds a family by name; NULL where there is none. Local. */
const wend_supertime *wend_supertime_find(const char *name);
/** The k-th family; NULL beyond the last. Local. */
const wend_supertime *wend_supertime_at(int k);
/** The smallest odd s whose reach is at least `ratio`; 0 where even the most stages fall
 * short, or ratio is NaN. Local. */
int wend_supertime_fit(const wend_supertime *family, double ratio);

#endif
