/* SPDX-License-Identifier: LGPL-3.0-or-later
 * support.c: the root of N(H) = target.
 *
 * With V the unit-ball volume, N(H) = V sum_j f(r_j/H) and
 * d ln N / d ln H = -sum q f' / sum f. ln N is nearly straight in ln H, so Newton steps are
 * made there. Sums are made in lanes by position in the list, and the list that the root is
 * found from is what is below a level, never what is below the trial: the root is the same bits
 * whatever the trial was. */
#include "support.h"

#include "clones.h"

#include <math.h>
#include <stdbool.h>
#include <stddef.h>

#define BLOCK 64       /* distances worked on at once */
#define LANES 8        /* partial sums: a fixed number, whatever the width of vectors */
#define CONVERGED 5e-7 /* last step in ln H: the error after it is below twice its square */
#define STEPS 60       /* bisection alone needs 50 */

/* 2^(k/4), k = 0..3, of the mantissa range [1/2, 1): exact constants, so that
 * levels are the same everywhere. */
static const double QUARTER[4] = {0x1p-1, 0x1.306fe0a31b715p-1, 0x1.6a09e667f3bcdp-1,
                                  0x1.ae89f995ad3adp-1};

/* Level number k: 2^(k/4 - 1). */
static double level_value(int k) {
  const int octave = k >= 0 ? k / 4 : -((3 - k) / 4);
  return ldexp(QUARTER[k - 4 * octave], octave);
}

/* Number of the smallest level >= h. */
static int level_number(double h) {
  int octave;
  const double mantissa = frexp(h, &octave);
  int k = 0;
  while (k < 4 && QUARTER[k] < mantissa) k++;
  return 4 * octave + k;
}

double wend_support_level(double h) { return level_value(level_number(h)); }

static double total(const double *lane) {
  return ((lane[0] + lane[4]) + (lane[2] + lane[6])) +
         ((lane[1] + lane[5]) + (lane[3] + lane[7]));
}

/* Adds s(q) of m values to the lanes. m is a multiple of LANES. */
WEND_CLONES
static void lanes_add(int m, const double *restrict s, double *restrict lane) {
  for (int k = 0; k < m; k += LANES)
#pragma GCC unroll 1 /* else gcc does not vectorise over lanes */
    for (int l = 0; l < LANES; l++) lane[l] += s[k + l];
}

/* The same for -q s'(q). */
WEND_CLONES
static void lanes_add_slope(int m, const double *restrict q, const double *restrict slope,
                            double *restrict lane) {
  for (int k = 0; k < m; k += LANES)
#pragma GCC unroll 1
    for (int l = 0; l < LANES; l++) lane[l] -= q[k + l] * slope[k + l];
}

/* What a solve works on: distances in canonical order. */
typedef struct problem {
  const wend_smoothing *smoothing;
  double factor; /* unit-ball volume x norm */
  double target;
  double least; /* the smallest distance that is not zero */
  int32_t n;
  double *r;
} problem;

/* q = r/h of a block of distances, filled up to whole lanes with 1, where s =
 * s' = 0. Returns how many. */
WEND_CLONES
static int block_load(int32_t n, const double *restrict r, double scale, double *restrict q) {
  const int some = n < BLOCK ? (int)n : BLOCK;
  for (int k = 0; k < some; k++) q[k] = r[k] * scale;
  int m = some;
  while (m % LANES != 0) q[m++] = 1.0;
  return m;
}

/* Sum of s(q) over all distances; with slope not NULL, of -q s'(q) too. */
static double shape_sum(const problem *p, double h, double *restrict slope) {
  double q[BLOCK], s[BLOCK], lane[LANES] = {0.0}, lane_slope[LANES] = {0.0};
  for (int32_t begin = 0; begin < p->n; begin += BLOCK) {
    const int m = block_load(p->n - begin, p->r + begin, 1.0 / h, q);
    p->smoothing->shape(m, q, s);
    lanes_add(m, s, lane);
    if (!slope) continue;
    p->smoothing->slope(m, q, s);
    lanes_add_slope(m, q, s, lane_slope);
  }
  if (slope) *slope = total(lane_slope);
  return total(lane);
}

/* Sum of s(q), one after the other: zeros beyond h do not change it, however
 * many they are. */
static double shape_sum_in_order(const problem *p, double h) {
  double q[BLOCK], s[BLOCK], sum = 0.0;
  for (int32_t begin = 0; begin < p->n; begin += BLOCK) {
    const int m = block_load(p->n - begin, p->r + begin, 1.0 / h, q);
    p->smoothing->shape(m, q, s);
    for (int k = 0; k < m; k++) sum += s[k];
  }
  return sum;
}

/* N at a level. Its round-off depends on the list, so near the target it is
 * summed in order. */
static double number_at(const problem *p, int k) {
  const double h = level_value(k), number = p->factor * shape_sum(p, h, NULL);
  const double doubt = 1e-9 + 0x1p-53 * p->n;
  return fabs(number - p->target) > doubt * p->target ? number
                                                      : p->factor * shape_sum_in_order(p, h);
}

/* The least distance that is not zero. */
WEND_CLONES
static double nearest(int32_t n, const double *restrict r) {
  double lane[LANES], least = INFINITY;
  for (int l = 0; l < LANES; l++) lane[l] = INFINITY;
  const int32_t whole = n - n % LANES;
  for (int32_t j = 0; j < whole; j += LANES)
#pragma GCC unroll 1
    for (int l = 0; l < LANES; l++) {
      const double distinct = r[j + l] > 0.0 ? r[j + l] : INFINITY;
      lane[l] = distinct < lane[l] ? distinct : lane[l];
    }
  for (int l = 0; l < LANES; l++) least = lane[l] < least ? lane[l] : least;
  for (int32_t j = whole; j < n; j++) least = r[j] > 0.0 && r[j] < least ? r[j] : least;
  return least;
}

/* Leaves out what is not below h, for good. */
static void shorten(problem *p, double h) {
  double *r = p->r;
  int64_t m = 0;
  for (int64_t j = 0, n = p->n; j < n; j++) {
    const double one = r[j];
    r[m] = one;
    m += one < h;
  }
  p->n = (int32_t)m;
}

/* The root between levels h[0] and h[1]. From here on the list is what is below
 * h[1], and all sums are the same bits whatever the trial was. */
static double root_between(problem *p, double h[2]) {
  shorten(p, h[1]);
  const double below = p->factor * shape_sum(p, h[0], NULL);
  const double above = p->factor * shape_sum(p, h[1], NULL);
  const double share = log(p->target / below) / log(above / below);
  double x = h[0] + (h[1] - h[0]) * (share > 0.0 && share < 1.0 ? share : 0.5);
  for (int step = 0; step < STEPS; step++) {
    double slope;
    const double shape = shape_sum(p, x, &slope);
    const double excess = log(p->factor * shape / p->target);
    h[excess >= 0.0] = x;
    double move = -excess * shape / slope;
    const double next = x * exp(move);
    const bool inside = next >= h[0] && next <= h[1];
    const double middle = sqrt(h[0] * h[1]);
    move = inside ? move : middle / x - 1.0;
    x = inside ? next : middle;
    if (fabs(move) < CONVERGED) break;
  }
  return x;
}

/* A level below one that holds the target, probably the one that holds it
 * barely, or the next: N grows about as H^dim. */
static int lower_guess(int top, double number, double target, int dim) {
  const int levels = (int)(4.0 * log2(number / target) / dim);
  return levels > 1 ? top - levels : top - 1;
}

double wend_support_solve(const wend_smoothing *smoothing, int dim, double target, double trial,
                          int32_t n, double *restrict r) {
  const double pi = 0x1.921fb54442d18p+1;
  const double ball = dim == 3 ? 4.0 / 3.0 * pi : pi;
  problem p = {smoothing, ball * smoothing->norm[dim - 2], target, nearest(n, r), n, r};
  int top = level_number(trial), bottom = top; /* bottom < top: it does not hold the target */
  double above = number_at(&p, top), below = 0.0;
  if (!(above >= target && p.least < level_value(top))) return 0.0;
  while (top - bottom != 1) {
    const int next =
        bottom < top ? bottom + (top - bottom + 3) / 4 : lower_guess(top, above, target, dim);
    const double number = number_at(&p, next);
    if (number >= target && p.least < level_value(next)) {
      if (next < top - 2) shorten(&p, level_value(next));
      bottom = bottom < top ? bottom : next;
      top = next;
      above = number;
    } else {
      bottom = next;
      below = number;
    }
  }
  if (below >= target) return level_value(top);
  return root_between(&p, (double[2]){level_value(bottom), level_value(top)});
}
