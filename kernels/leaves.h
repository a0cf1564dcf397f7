/* SPDX-License-Identifier: LGPL-3.0-or-later
 * leaves.h: the leaves near a group of particles, in single precision about the group's centre.
 *
 * Lengths are in units of the group's largest radius. Single precision halves the work of a
 * comparison; what it cannot decide is left to double precision: every box and particle has a
 * slack, a bound on the round-off of r^2 - H^2, and only differences beyond it are decided.
 * With s = (diameter of the group) + (larger radius), coordinates that matter are below s, so
 * that r^2 - H^2 is wrong by less than 14 x 2^-24 s^2; 2^-19 s^2 is used, and the round-off of
 * positions in double precision is added. Beyond s the relative error of r^2 stays as small.
 * The slack is infinite where nothing can be said: in groups so wide that nearest images differ
 * in them. */
#ifndef WEND_KERNELS_LEAVES_H
#define WEND_KERNELS_LEAVES_H

#include "walk.h"

#define WEND_NEAR_LEAVES 512 /* a multiple of 8 */

/** Where a group stands, and what its members are measured by. */
typedef struct wend_frame {
  double centre[3];
  double scale;           /**< 1 / largest radius of the group */
  double spread;          /**< diameter, scaled */
  double round;           /**< round-off of a position, scaled, with a margin */
  double largest;         /**< scaled radius from which on nearest images cannot be trusted */
  float lo[3], hi[3], h2; /**< box and squared radius of the group, scaled, about the centre */
} wend_frame;

/** Leaves by their boxes, in canonical order. */
typedef struct wend_leaves {
  int32_t n;
  int32_t slot[WEND_NEAR_LEAVES]; /**< number in the collection these were chosen from */
  float lo[3][WEND_NEAR_LEAVES], hi[3][WEND_NEAR_LEAVES];
  float reach2[WEND_NEAR_LEAVES]; /**< square of the largest support inside; 0 if not mutual */
  float slack[WEND_NEAR_LEAVES];
} wend_leaves;

/** Frame of the group of a walk. Local. */
wend_frame wend_frame_of(const wend_walk *walk);

/** Slack of r^2 - H^2 for a scaled radius q. Local. */
static inline double wend_frame_slack(const wend_frame *f, double q) {
  const double radius = q > 1.0 ? q : 1.0, s = f->spread + radius;
  return radius < f->largest ? s * (0x1p-19 * s + f->round) : INFINITY;
}

/** Where members of a box are to be measured from, so that its nearest image results: at [4],
 * the centre moved by periods, 4th 0. False, and the centre itself, where members of the box
 * differ in which image is nearest. Local. */
bool wend_frame_image(const wend_frame *f, const wend_walk *walk, const double *lo,
                      const double *hi, double *at);

#endif
