/* SPDX-License-Identifier: LGPL-3.0-or-later
 * boxes.h: boxes around particles, and which of them may hold pairs.
 *
 * Every step is monotone in floating point and in the same order as the distance of a pair, so
 * the distance of two boxes is never above that of two particles in them, rounding included. */
#ifndef WEND_SRC_BOXES_H
#define WEND_SRC_BOXES_H

#include "domain.h"

typedef struct wend_box {
  double lo[4]; /**< lower corner; 4th: largest support inside */
  double hi[4]; /**< upper corner; 4th not used */
} wend_box;

/** Relative margin on support radii in tests of boxes: costs no ghosts, forgives last bits. */
#define WEND_BOX_MARGIN 1e-12

/** Distance from 0 to the interval [low, high]. */
static inline double wend_interval_distance(double low, double high) {
  return low > 0 ? low : high < 0 ? -high : 0;
}

/** Smallest minimum-image |x_b - x_a| on one axis. */
static inline double wend_axis_distance(const wend_domain *domain, int axis, const wend_box *a,
                                        const wend_box *b) {
  const double low = b->lo[axis] - a->hi[axis], high = b->hi[axis] - a->lo[axis];
  const double period = domain->period[axis];
  const double here = wend_interval_distance(low, high);
  if (period == 0 || here == 0) return here;
  const double down = wend_interval_distance(low - period, high - period);
  const double up = wend_interval_distance(low + period, high + period);
  return fmin(here, fmin(down, up));
}

/** True where a pair, r < max(H_i, H_j), with one end in either box is possible. */
static inline bool wend_boxes_near(const wend_domain *domain, const wend_box *a,
                                   const wend_box *b) {
  const double dx = wend_axis_distance(domain, 0, a, b);
  const double dy = wend_axis_distance(domain, 1, a, b);
  const double dz = wend_axis_distance(domain, 2, a, b);
  const double reach = fmax(a->lo[3], b->lo[3]) * (1 + WEND_BOX_MARGIN);
  return dx * dx + dy * dy + dz * dz < reach * reach;
}

#endif
