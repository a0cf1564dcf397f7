/* SPDX-License-Identifier: LGPL-3.0-or-later
 * tree.c: boxes over consecutive particles, level upon level.
 *
 * Particles stand in Hilbert order, so that consecutive ones are neighbours and the hierarchy
 * needs no sorting of its own: one pass over the particles and one over each level. */
#include "tree.h"

#include <math.h>

/* Boxes of the next level over `below` members. */
static int32_t parents(int32_t below, int32_t fan) { return below / fan + (below % fan != 0); }

int32_t wend_tree_boxes(int32_t n) {
  int32_t boxes = 0;
  for (int32_t m = parents(n, WEND_LEAF); m > 0; m = m > 1 ? parents(m, WEND_FAN) : 0)
    boxes += m;
  return boxes;
}

static void box_clear(double *restrict lo, double *restrict hi) {
  for (int a = 0; a < 3; a++) {
    lo[a] = INFINITY;
    hi[a] = -INFINITY;
  }
  lo[3] = hi[3] = 0.0;
}

/* Widens a box by a member with corners mlo, mhi and support (or largest support) h. */
static void box_add(double *restrict lo, double *restrict hi, const double *mlo,
                    const double *mhi, double h) {
  for (int a = 0; a < 3; a++) {
    lo[a] = mlo[a] < lo[a] ? mlo[a] : lo[a];
    hi[a] = mhi[a] > hi[a] ? mhi[a] : hi[a];
  }
  lo[3] = h > lo[3] ? h : lo[3];
}

void wend_tree_build(wend_tree *tree, int32_t n, const double (*place)[4], double (*lo)[4],
                     double (*hi)[4]) {
  *tree = (wend_tree){.n = n, .lo = lo, .hi = hi};
  const int32_t leaves = parents(n, WEND_LEAF);
  for (int32_t b = 0; b < leaves; b++) {
    const int32_t begin = b * WEND_LEAF;
    const int32_t end = n - begin < WEND_LEAF ? n : begin + WEND_LEAF;
    box_clear(lo[b], hi[b]);
    for (int32_t j = begin; j < end; j++)
      box_add(lo[b], hi[b], place[j], place[j], place[j][3]);
  }
  int32_t start = 0;
  for (int32_t count = leaves; count > 0; count = count > 1 ? parents(count, WEND_FAN) : 0) {
    const int32_t next = start + count;
    tree->offset[tree->levels++] = start;
    tree->offset[tree->levels] = next;
    for (int32_t b = 0; count > 1 && b < parents(count, WEND_FAN); b++) {
      const int32_t begin = start + b * WEND_FAN;
      const int32_t end = next - begin < WEND_FAN ? next : begin + WEND_FAN;
      box_clear(lo[next + b], hi[next + b]);
      for (int32_t c = begin; c < end; c++)
        box_add(lo[next + b], hi[next + b], lo[c], hi[c], lo[c][3]);
    }
    start = next;
  }
}
