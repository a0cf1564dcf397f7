/* SPDX-License-Identifier: LGPL-3.0-or-later
 * search_supports.c: support radii of many rows from one walk for neighbours. */
#include "search.h"

#include "support.h"
#include "walk.h"

#include <math.h>

/* Distances of particles within the trial radius of `place`, canonical order; counts on beyond
 * room. */
static int64_t distances(const wend_search *s, const double *place, int32_t room,
                         double *restrict r) {
  wend_walk walk = wend_walk_begin(s->tree, s->domain, false);
  wend_walk_add(&walk, place);
  int64_t count = 0;
  for (int32_t leaf; (leaf = wend_walk_next(&walk)) >= 0;) {
    const int32_t begin = leaf * WEND_LEAF;
    const int32_t end = s->tree->n - begin < WEND_LEAF ? s->tree->n : begin + WEND_LEAF;
    for (int32_t j = begin; j < end; j++) {
      double r2 = 0.0;
      for (int axis = 0; axis < 3; axis++) {
        const double dx = wend_domain_wrap(s->domain, axis, s->place[j][axis] - place[axis]);
        r2 += dx * dx;
      }
      if (!(r2 < place[3] * place[3])) continue;
      if (count < room) r[count] = sqrt(r2);
      count++;
    }
  }
  return count;
}

int32_t wend_search_supports(const wend_search *search, const wend_smoothing *smoothing,
                             double target, int32_t n, const int32_t *restrict todo,
                             double *restrict support, int32_t room, double *restrict scratch) {
  int32_t solved = 0;
  for (int32_t k = 0; k < n; k++) {
    const double *place = search->place[search->row[todo[k]]];
    const int64_t m = distances(search, place, room, scratch);
    if (m > room) return -1;
    support[k] = wend_support_solve(smoothing, search->domain->dim, target, place[3],
                                    (int32_t)m, scratch);
    solved += support[k] > 0.0;
  }
  return solved;
}
