/* SPDX-License-Identifier: LGPL-3.0-or-later
 * leaves.c: the leaves near a group of particles, in single precision about the group's centre.
 */
#include "leaves.h"

/* Beyond this scaled radius squares leave the range of float. */
#define LARGEST 1e15

wend_frame wend_frame_of(const wend_walk *w) {
  const wend_tree *t = w->tree;
  const int32_t root = t->levels > 0 ? t->offset[t->levels - 1] : 0;
  wend_frame f = {.scale = w->reach > 0.0 ? 1.0 / w->reach : 1.0, .largest = LARGEST};
  double extent = 0.0, far = 0.0;
  for (int a = 0; a < 3; a++) {
    f.centre[a] = 0.5 * (w->lo[a] + w->hi[a]);
    extent = fmax(extent, fmax(f.centre[a] - w->lo[a], w->hi[a] - f.centre[a]));
    far = fmax(far, fmax(fabs(t->lo[root][a]), fabs(t->hi[root][a])));
    far = w->period[a] < INFINITY ? fmax(far, w->period[a]) : far;
  }
  for (int a = 0; a < 3; a++)
    f.largest = fmin(f.largest, (0.499 * w->period[a] - extent) * f.scale);
  f.spread = 2.0 * extent * f.scale;
  f.round = 0x1p-46 * far * f.scale;
  return f;
}

/* Moves the origin of a leaf on one axis to the image nearest the leaf. Corners lo and hi are
 * those of the nearest image, or the whole axis where members of the leaf differ in their
 * nearest image. */
static void leaf_image(const wend_walk *w, const wend_frame *f, int axis, wend_origin *origin,
                       float *restrict lo, float *restrict hi) {
  const double half = 0.5 * w->period[axis], centre = f->centre[axis];
  const double a = w->tree->lo[origin->leaf][axis] - centre;
  const double b = w->tree->hi[origin->leaf][axis] - centre;
  const double shift = a > half ? w->period[axis] : b < -half ? -w->period[axis] : 0.0;
  const bool straddles = shift == 0.0 && (a < -half || b > half);
  origin->at[axis] = centre + shift;
  origin->straddles |= straddles;
  *lo = straddles ? -INFINITY : (float)((a - shift) * f->scale);
  *hi = straddles ? INFINITY : (float)((b - shift) * f->scale);
}

void wend_leaves_collect(wend_walk *w, const wend_frame *f, wend_leaves *leaves,
                         wend_origin origin[WEND_NEAR_LEAVES]) {
  int32_t n = 0;
  for (int32_t leaf; n < WEND_NEAR_LEAVES && (leaf = wend_walk_next(w)) >= 0; n++) {
    const double q = w->mutual ? w->tree->lo[leaf][3] * f->scale : 0.0;
    leaves->slot[n] = n;
    leaves->reach2[n] = (float)(q * q);
    leaves->slack[n] = (float)wend_frame_slack(f, q);
    origin[n] = (wend_origin){.leaf = leaf};
    for (int a = 0; a < 3; a++)
      leaf_image(w, f, a, &origin[n], &leaves->lo[a][n], &leaves->hi[a][n]);
    for (int a = 0; a < 3 && origin[n].straddles; a++) origin[n].at[a] = f->centre[a];
  }
  leaves->n = n;
}
