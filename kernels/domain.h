/* SPDX-License-Identifier: LGPL-3.0-or-later
 * domain.h: the box the particles live in, and the difference of two places in it.
 *
 * A periodic difference must be odd, wrap(-x) = -wrap(x), bit for bit: both ends of a pair
 * compute it and must agree. Hence differences of unshifted positions and a
 * compare-and-subtract, which also vectorises on processors that have no rounding instruction.
 */
#ifndef WEND_KERNELS_DOMAIN_H
#define WEND_KERNELS_DOMAIN_H

#include <math.h>
#include <stdbool.h>

typedef struct wend_domain {
  int dim;          /**< 2 or 3 */
  double lo[3];     /**< lower corner */
  double hi[3];     /**< upper corner; axis 2 is [0, 0] in 2-D */
  double period[3]; /**< hi - lo on a periodic axis, else 0 */
  double half[3];   /**< period / 2 on a periodic axis, else INFINITY */
  bool open[3];     /**< axis not periodic, and absorbing (else closed) at free surfaces */
  double thickness; /**< depth of a 2-D run; 1 in 3-D */
} wend_domain;

/** Minimum-image difference on one axis, for |dx| <= period: an odd function of dx. Two masks
 * and no product with a comparison, which gcc would turn into scalar integer code. */
static inline double wend_domain_wrap(const wend_domain *d, int axis, double dx) {
  const double period = d->period[axis], half = d->half[axis];
  return dx - ((dx > half ? period : 0.0) - (dx < -half ? period : 0.0));
}

#endif
