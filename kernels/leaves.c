/* SPDX-License-Identifier: LGPL-3.0-or-later
 * leaves.c: where a group of particles stands, and nearest images about it. */
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
    f.lo[a] = (float)((w->lo[a] - f.centre[a]) * f.scale);
    f.hi[a] = (float)((w->hi[a] - f.centre[a]) * f.scale);
    extent = fmax(extent, fmax(f.centre[a] - w->lo[a], w->hi[a] - f.centre[a]));
    far = fmax(far, fmax(fabs(t->lo[root][a]), fabs(t->hi[root][a])));
    far = w->period[a] < INFINITY ? fmax(far, w->period[a]) : far;
  }
  for (int a = 0; a < 3; a++)
    f.largest = fmin(f.largest, (0.499 * w->period[a] - extent) * f.scale);
  const double radius = w->reach * f.scale;
  f.h2 = (float)(radius * radius);
  f.spread = 2.0 * extent * f.scale;
  f.round = 0x1p-46 * far * f.scale;
  return f;
}

bool wend_frame_image(const wend_frame *f, const wend_walk *w, const double *lo,
                      const double *hi, double *at) {
  bool same = true;
  for (int a = 0; a < 3; a++) {
    const double half = 0.5 * w->period[a];
    const double below = lo[a] - f->centre[a], above = hi[a] - f->centre[a];
    const double shift = below > half ? w->period[a] : above < -half ? -w->period[a] : 0.0;
    same = same && (shift != 0.0 || (below >= -half && above <= half));
    at[a] = f->centre[a] + shift;
  }
  at[3] = 0.0;
  for (int a = 0; a < 3 && !same; a++) at[a] = f->centre[a];
  return same;
}
