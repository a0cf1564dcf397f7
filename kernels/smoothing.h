/* SPDX-License-Identifier: LGPL-3.0-or-later
 * smoothing.h: smoothing kernels with compact support H, W(r, H) = f(r/H) / H^D.
 *
 * Wendland C2 and C4 (Wendland 1995; forms in Dehnen & Aly 2012, arXiv:1204.2471, table 1) and
 * the cubic spline (Monaghan & Lattanzio 1985). Wendland kernels do not pair at any neighbour
 * number. */
#ifndef WEND_KERNELS_SMOOTHING_H
#define WEND_KERNELS_SMOOTHING_H

/** One smoothing kernel: a row of the table. */
typedef struct wend_smoothing {
  const char *name; /**< "wendland-c2", "wendland-c4", "cubic-spline" */
  double norm[2];   /**< factor of the shape in 2-D and 3-D, so that W integrates to one */
  /** Shape s(q): f = norm s. n values; finite q >= 0 in, s out, exactly 0 for q >= 1. No
   *  overlap. */
  void (*shape)(int n, const double *restrict q, double *restrict s);
  /** Derivative ds/dq of the same. */
  void (*slope)(int n, const double *restrict q, double *restrict ds);
} wend_smoothing;

/** Finds a smoothing kernel by name; NULL where there is none of that name. Local. */
const wend_smoothing *wend_smoothing_find(const char *name);

/** The k-th smoothing kernel, k = 0, 1, ...; NULL beyond the last. Local. */
const wend_smoothing *wend_smoothing_at(int k);

/** The weight with which neighbours are counted when supports are sought: s(q) = 1 - q^4,
 * nearly flat. A count with a peaked kernel takes a close pair for a crowd: it leaves such
 * particles with few real neighbours, a badly conditioned gradient and a tiny stable step
 * (measured in 2-D on particles jittered by a whole spacing, 20 neighbours: error of the
 * oblique Gaussian 2.7e-3 against 1.8e-3, stages a run 3500 against 280). Not in the table: it
 * smooths nothing. Local. */
const wend_smoothing *wend_smoothing_count(void);

#endif
