/* SPDX-License-Identifier: LGPL-3.0-or-later
 * search_supports.c: support radii of many rows from one walk for neighbours.
 *
 * Rows that stand together share what is laid out near them, as in search.c. A row whose trial
 * holds too much for that is served alone, in as many parts as it takes. */
#include "search.h"

#include "near.h"
#include "support.h"

#include <stddef.h>

#define TOGETHER 8 /* rows that share a narrowed choice of leaves */

/* A solution under way. */
typedef struct work {
  const wend_near_kit *kit;
  const wend_smoothing *smoothing;
  int dim;
  double target;
  int32_t room;
  double *scratch;
  wend_near near;
} work;

/* Appends the distances of what a member reaches among some leaves to `count` distances, and
 * returns their number, or -1 where there is no room. */
static int32_t member_distances(work *w, const wend_leaves *leaves, const wend_member *m,
                                int32_t count) {
  int32_t slots[WEND_NEAR_LEAVES + 8], hits[WEND_NEAR + 8];
  const int32_t n = w->kit->choose(leaves, m, slots);
  const int32_t found = w->kit->sieve(&w->near, m, n, slots, hits);
  if (found > w->room - count) return -1;
  w->kit->distances(&w->near.places, m->self, found, hits, w->scratch + count);
  return count + found;
}

static double member_solve(const work *w, const wend_member *m, int32_t count) {
  return wend_support_solve(w->smoothing, w->dim, w->target, w->near.places.place[m->self][3],
                            count, w->scratch);
}

/* Solves n members of a group that has all it needs laid out; false where there is no room. */
static bool group_solve(work *w, int32_t n, const int32_t *self, double *restrict support) {
  for (int32_t begin = 0; begin < n; begin += TOGETHER) {
    const int32_t some = n - begin < TOGETHER ? n - begin : TOGETHER;
    wend_member m[TOGETHER];
    wend_leaves leaves;
    wend_near_narrow(&w->near, w->kit, some, self + begin, m, &leaves);
    for (int32_t k = 0; k < some; k++) {
      const int32_t count = member_distances(w, &leaves, &m[k], 0);
      if (count < 0) return false;
      support[begin + k] = member_solve(w, &m[k], count);
    }
  }
  return true;
}

/* Solves one particle, laying out what is near as often as it takes; false without room. */
static bool one_solve(work *w, int32_t self, double *support) {
  wend_walk walk;
  wend_near_gather(&w->near, 1, &self, &walk);
  wend_member m;
  int32_t count = 0;
  for (bool first = true, last = false; !last && count >= 0; first = false) {
    last = wend_near_fill(&w->near, w->kit, &walk, first);
    m = wend_near_member(&w->near, self);
    count = member_distances(w, &w->near.leaves, &m, count);
  }
  if (count < 0) return false;
  *support = member_solve(w, &m, count);
  return true;
}

int32_t wend_search_supports(const wend_search *search, const wend_smoothing *smoothing,
                             double target, int32_t n, const int32_t *restrict todo,
                             double *restrict support, int32_t room, double *restrict scratch) {
  work w = {.kit = wend_near_kit_best(),
            .smoothing = smoothing,
            .dim = search->domain->dim,
            .target = target,
            .room = room,
            .scratch = scratch};
  w.near.places = (wend_places){search->domain, search->tree, search->place, NULL};
  w.near.mutual = false;
  int32_t solved = 0;
  for (int32_t k = 0, taken; k < n; k += taken) {
    int32_t self[WEND_GROUP];
    const int32_t most = n - k < WEND_GROUP ? n - k : WEND_GROUP;
    for (int32_t i = 0; i < most; i++) self[i] = search->row[todo[k + i]];
    taken = wend_near_group(&w.near, w.kit, most, self, 1);
    if (taken == 0) {
      taken = 1;
      if (!one_solve(&w, self[0], &support[k])) return -1;
    } else if (!group_solve(&w, taken, self, &support[k])) {
      return -1;
    }
    for (int32_t i = 0; i < taken; i++) solved += support[k + i] > 0.0;
  }
  return solved;
}
