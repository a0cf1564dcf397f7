/* SPDX-License-Identifier: LGPL-3.0-or-later
 * supports.c: support radii by growing trial radii until each holds the target number.
 *
 * A trial that is too small is widened and its neighbours are fetched anew; since trials sit on
 * fixed levels and the root is sought from there, the result does not depend on the first
 * guess, and so not on the ranks, which guess from their own particles only. */
#include "supports.h"
#include "support.h"
#include "vicinity.h"
#include <inttypes.h>
#include <math.h>
#include <stdlib.h>

/* Widening of a trial that was too small: two levels. */
static const double widen = 1.4142135623730951;

/* Radius of a ball that holds `target` particles where the eight of a leaf fill its box: boxes
 * of eight scattered points span about 0.6 of what is theirs, an axis each. Leaves come long
 * and flat as well as round: a side counts as a quarter of the longest at least. */
static double guess(const double *lo, const double *hi, int dim, double target) {
  double longest = 0, volume = 1;
  for (int a = 0; a < dim; a++) longest = fmax(longest, hi[a] - lo[a]);
  for (int a = 0; a < dim; a++) volume *= 1.6 * fmax(hi[a] - lo[a], longest / 4);
  const double ball = dim == 2 ? M_PI : 4 * M_PI / 3;
  return pow(target * volume / (WEND_LEAF * ball), 1.0 / dim);
}

/* The widest trial that can make sense: half the shortest period, or the whole box. */
static double widest(const wend_domain *domain) {
  double diagonal2 = 0, half = INFINITY;
  for (int a = 0; a < domain->dim; a++) {
    diagonal2 += (domain->hi[a] - domain->lo[a]) * (domain->hi[a] - domain->lo[a]);
    half = fmin(half, domain->half[a]);
  }
  return fmin(half, 2 * sqrt(diagonal2));
}

/* Radius that holds `target` particles where all of them fill the box evenly. */
static double even_radius(wend_team *team, const wend_domain *domain, double target,
                          int32_t n) {
  int64_t all = n;
  wend_team_count(team, 1, &all);
  double box = 1;
  for (int a = 0; a < domain->dim; a++) box *= domain->hi[a] - domain->lo[a];
  const double ball = domain->dim == 2 ? M_PI : 4 * M_PI / 3;
  return pow(target * box / ((double)all * ball), 1.0 / domain->dim);
}

/* Trials from the leaf that holds each particle. A leaf that is not full tells nothing, and
 * coincident particles tell too little: the even radius stands in, and bounds the guess from
 * below. */
static wend_status first_trials(wend_team *team, const wend_domain *domain, double target,
                                int32_t n, double (*place)[4]) {
  const double even = even_radius(team, domain, target, n);
  const double most = widest(domain), least = even / 1024;
  const int32_t boxes = wend_tree_boxes(n);
  wend_tree tree;
  double(*lo)[4] = wend_allocate(team, boxes, sizeof *lo);
  double(*hi)[4] = wend_allocate(team, boxes, sizeof *hi);
  const wend_status status = wend_agree(team);
  if (status == WEND_OK) {
    for (int32_t i = 0; i < n; i++) place[i][3] = 0;
    wend_tree_build(&tree, n, (const double(*)[4])place, lo, hi);
    for (int32_t i = 0; i < n; i++) {
      const int32_t leaf = i / WEND_LEAF;
      const bool full = (leaf + 1) * WEND_LEAF <= n;
      const double h = full ? guess(lo[leaf], hi[leaf], domain->dim, target) : even;
      place[i][3] = wend_support_level(fmin(fmax(h, least), most));
    }
  }
  free(lo);
  free(hi);
  return status;
}

/* Solves the rows in todo[n]; the unsolved ones are kept in todo and their number returned. */
static int32_t solve(wend_team *team, const wend_vicinity *vicinity,
                     const wend_smoothing *smoothing, double target, int32_t n, int32_t *todo,
                     double *support, double (*place)[4]) {
  int32_t room = 1024, left = 0;
  double *scratch = wend_allocate(team, room, sizeof *scratch);
  while (scratch != NULL && wend_search_supports(&vicinity->search, smoothing, target, n, todo,
                                                 support, room, scratch) < 0) {
    free(scratch);
    room *= 2;
    scratch = wend_allocate(team, room, sizeof *scratch);
  }
  for (int32_t k = 0; scratch != NULL && k < n; k++) {
    const int32_t i = todo[k];
    if (support[k] > 0)
      place[i][3] = support[k];
    else
      todo[left++] = i;
  }
  free(scratch);
  return left;
}

/* Widens the trials of the rows in todo, or fails where the box has no room for more. */
static void widen_trials(wend_team *team, const wend_domain *domain, double target,
                         const wend_particles *particles, int32_t n, const int32_t *todo,
                         double (*place)[4]) {
  const double most = wend_support_level(widest(domain));
  for (int32_t k = 0; k < n; k++) {
    double *h = &place[todo[k]][3];
    if (*h >= most)
      wend_fail(team, WEND_ERR_GEOMETRY,
                "particle %" PRIu64
                ": no support radius up to %.4g reaches %g neighbours: ask for "
                "fewer (geometry: neighbours), give supports, or enlarge the box",
                particles->id[todo[k]], *h, target);
    *h = wend_support_level(fmin(*h * widen, most));
  }
}

wend_status wend_supports_find(wend_team *team, const wend_domain *domain,
                               const wend_smoothing *smoothing, double target,
                               const wend_particles *particles, double (*place)[4]) {
  wend_status status = first_trials(team, domain, target, particles->n, place);
  if (status != WEND_OK) return status;
  int32_t *todo = wend_allocate(team, particles->n, sizeof *todo);
  double *support = wend_allocate(team, particles->n, sizeof *support);
  WEND_TRY(wend_agree(team));
  int32_t n = particles->n;
  int64_t open = 1;
  for (int32_t i = 0; i < n; i++) todo[i] = i;
  while (open > 0) {
    wend_vicinity vicinity;
    WEND_TRY(wend_vicinity_init(team, domain, particles->n, (const double(*)[4])place,
                                particles->key, particles->id, &vicinity));
    n = solve(team, &vicinity, smoothing, target, n, todo, support, place);
    wend_vicinity_reset(&vicinity);
    widen_trials(team, domain, target, particles, n, todo, place);
    WEND_TRY(wend_agree(team));
    open = n;
    wend_team_count(team, 1, &open);
  }
done:
  free(todo);
  free(support);
  return status;
}

wend_status wend_supports_check(wend_team *team, const wend_domain *domain,
                                const wend_particles *particles, const double (*place)[4]) {
  double half = INFINITY;
  for (int a = 0; a < domain->dim; a++) half = fmin(half, domain->half[a]);
  for (int32_t i = 0; i < particles->n; i++)
    if (!(place[i][3] > 0) || place[i][3] >= half)
      wend_fail(team, WEND_ERR_GEOMETRY,
                "particle %" PRIu64 ": support radius %.6g must be positive and below half the "
                "shortest period, %.6g: use fewer neighbours, more particles or a larger box",
                particles->id[i], place[i][3], half);
  return wend_agree(team);
}
