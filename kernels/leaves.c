/* SPDX-License-Identifier: LGPL-3.0-or-later
 * leaves.c: the leaves near a group of particles, in single precision about the group's centre.
 */
#include "leaves.h"

#include "clones.h"

/* Beyond this scaled radius squares leave the range of float. */
#define LARGEST 1e15

wend_frame wend_frame_of(const wend_walk *w) {
  const wend_tree *t = w->tree;
  wend_frame f = {.scale = w->reach > 0.0 ? 1.0 / w->reach : 1.0, .largest = LARGEST};
  double extent = 0.0, far = 0.0;
  for (int a = 0; a < 3; a++) {
    f.centre[a] = 0.5 * (w->lo[a] + w->hi[a]);
    const double lo = f.centre[a] - w->lo[a], hi = w->hi[a] - f.centre[a];
    extent = fmax(extent, fmax(lo, hi));
    const int32_t root = t->levels > 0 ? t->offset[t->levels - 1] : 0;
    far = fmax(far, fmax(fabs(t->lo[root][a]), fabs(t->hi[root][a])));
    far = w->period[a] < INFINITY ? fmax(far, w->period[a]) : far;
  }
  for (int a = 0; a < 3; a++)
    f.largest = fmin(f.largest, (0.499 * w->period[a] - extent) * f.scale);
  f.spread = 2.0 * extent * f.scale;
  f.round = 0x1p-46 * far * f.scale;
  return f;
}

/* Corners of a box on one axis about the centre: its nearest image, or the whole axis where the
 * nearest image is not the same all over the box. */
static void image(const wend_walk *w, const wend_frame *f, int axis, double lo, double hi,
                  float *restrict out_lo, float *restrict out_hi) {
  const double half = 0.5 * w->period[axis];
  const double a = lo - f->centre[axis], b = hi - f->centre[axis];
  double shift = 0.0;
  if (a > half)
    shift = w->period[axis];
  else if (b < -half)
    shift = -w->period[axis];
  else if (a < -half || b > half) {
    *out_lo = -INFINITY;
    *out_hi = INFINITY;
    return;
  }
  *out_lo = (float)((a - shift) * f->scale);
  *out_hi = (float)((b - shift) * f->scale);
}

void wend_leaves_collect(wend_walk *w, const wend_frame *f, wend_leaves *leaves) {
  int32_t n = 0;
  for (int32_t leaf; n < WEND_NEAR_LEAVES && (leaf = wend_walk_next(w)) >= 0; n++) {
    const double *lo = w->tree->lo[leaf], *hi = w->tree->hi[leaf];
    const double q = w->mutual ? lo[3] * f->scale : 0.0;
    leaves->slot[n] = n;
    leaves->leaf[n] = leaf;
    leaves->reach2[n] = (float)(q * q);
    leaves->slack[n] = (float)wend_frame_slack(f, q);
    for (int a = 0; a < 3; a++)
      image(w, f, a, lo[a], hi[a], &leaves->lo[a][n], &leaves->hi[a][n]);
  }
  leaves->n = n;
}

/* Distance of a box from the interval [lo, hi] on one axis. */
static inline float gap(float box_lo, float box_hi, float lo, float hi) {
  const float below = box_lo - hi, above = lo - box_hi;
  const float d = below > above ? below : above;
  return d > 0.0f ? d : 0.0f;
}

WEND_CLONES
static void reaches(const wend_leaves *restrict v, int32_t n, const float *restrict lo,
                    const float *restrict hi, float h2, int32_t *restrict near) {
  for (int32_t k = 0; k < n; k++) {
    const float x = gap(v->lo[0][k], v->hi[0][k], lo[0], hi[0]);
    const float y = gap(v->lo[1][k], v->hi[1][k], lo[1], hi[1]);
    const float z = gap(v->lo[2][k], v->hi[2][k], lo[2], hi[2]);
    const float r2 = v->reach2[k] > h2 ? v->reach2[k] : h2;
    near[k] = !(x * x + y * y + z * z - r2 > v->slack[k]);
  }
}

int32_t wend_leaves_choose(const wend_leaves *leaves, const float lo[3], const float hi[3],
                           float h2, int32_t *restrict list) {
  int32_t near[WEND_NEAR_LEAVES], m = 0;
  reaches(leaves, leaves->n, lo, hi, h2, near);
  for (int32_t k = 0; k < leaves->n; k++) {
    list[m] = k;
    m += near[k];
  }
  return m;
}

void wend_leaves_copy(const wend_leaves *from, int32_t n, const int32_t *restrict list,
                      wend_leaves *restrict to) {
  to->n = n;
  for (int32_t m = 0; m < n; m++) {
    const int32_t k = list[m];
    to->slot[m] = from->slot[k];
    to->leaf[m] = from->leaf[k];
    to->reach2[m] = from->reach2[k];
    to->slack[m] = from->slack[k];
    for (int a = 0; a < 3; a++) {
      to->lo[a][m] = from->lo[a][k];
      to->hi[a][m] = from->hi[a][k];
    }
  }
}
