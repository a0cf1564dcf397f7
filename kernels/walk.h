/* SPDX-License-Identifier: LGPL-3.0-or-later
 * walk.h: a resumable walk over the boxes of the hierarchy that lie near a group of particles.
 *
 * It ends at branches, boxes of the level above the leaves (leaves, where there is no other
 * level). Boxes are visited in order, so branches come out in canonical order. The test never
 * loses a pair to round-off: corners are differenced and squared exactly as places are, and
 * rounding is monotone, so the distance of two boxes is at most the distance of any two
 * members, bit for bit. */
#ifndef WEND_KERNELS_WALK_H
#define WEND_KERNELS_WALK_H

#include "domain.h"
#include "tree.h"

typedef struct wend_walk {
  const wend_tree *tree;
  double lo[3], hi[3]; /**< corners of the group */
  double period[3];    /**< INFINITY where not periodic */
  double reach;        /**< largest radius of the group */
  bool mutual;         /**< a box also reaches out with the largest support inside it */
  int floor;           /**< level of the branches: 1, or 0 */
  int level;           /**< next box to visit; -1 at the end */
  int32_t box;         /**< its number within the level */
} wend_walk;

/** Begins a walk around one place; further members by wend_walk_add before the first step.
 * Local. */
static inline wend_walk wend_walk_begin(const wend_tree *tree, const wend_domain *domain,
                                        bool mutual) {
  wend_walk w = {.tree = tree, .mutual = mutual, .level = tree->levels - 1};
  w.floor = tree->levels > 1 ? 1 : 0;
  for (int a = 0; a < 3; a++) {
    w.lo[a] = INFINITY;
    w.hi[a] = -INFINITY;
    w.period[a] = domain->period[a] > 0.0 ? domain->period[a] : INFINITY;
  }
  return w;
}

/** Adds a member, place and radius, to the group. Local. */
static inline void wend_walk_add(wend_walk *w, const double *place) {
  for (int a = 0; a < 3; a++) {
    w->lo[a] = place[a] < w->lo[a] ? place[a] : w->lo[a];
    w->hi[a] = place[a] > w->hi[a] ? place[a] : w->hi[a];
  }
  w->reach = place[3] > w->reach ? place[3] : w->reach;
}

/* Does box b reach the group? On one axis |x_j - x_i| lies in [near, far], and the minimum
 * image min(|dx|, period - |dx|) is least at one of the two ends. */
static inline bool wend_walk_reaches(const wend_walk *w, int32_t b) {
  const double *lo = w->tree->lo[b], *hi = w->tree->hi[b];
  double r2 = 0.0;
  for (int a = 0; a < 3; a++) {
    const double below = lo[a] - w->hi[a], above = w->lo[a] - hi[a];
    const double near = below > above ? below : above;
    const double far = w->period[a] + (below < above ? below : above);
    double d = near < far ? near : far;
    d = d > 0.0 ? d : 0.0;
    r2 += d * d;
  }
  const double h = w->mutual && lo[3] > w->reach ? lo[3] : w->reach;
  return r2 < h * h;
}

/* Moves on to the box after the present one, without going down. */
static inline void wend_walk_skip(wend_walk *w) {
  const wend_tree *t = w->tree;
  while (w->level >= 0) {
    const int32_t next = w->box + 1;
    if (next % WEND_FAN != 0 && next < t->offset[w->level + 1] - t->offset[w->level]) {
      w->box = next;
      return;
    }
    w->box /= WEND_FAN;
    w->level = w->level + 1 < t->levels ? w->level + 1 : -1;
  }
}

/** Number of the next leaf (particles 8 leaf .. 8 leaf + 7) that reaches the group, or -1.
 * Local. */
static inline int32_t wend_walk_next(wend_walk *w) {
  while (w->level >= 0) {
    const int32_t box = w->box;
    if (!wend_walk_reaches(w, w->tree->offset[w->level] + box)) {
      wend_walk_skip(w);
    } else if (w->level == w->floor) {
      wend_walk_skip(w);
      return box;
    } else {
      w->level--;
      w->box = box * WEND_FAN;
    }
  }
  return -1;
}

#endif
