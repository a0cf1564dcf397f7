/* SPDX-License-Identifier: LGPL-3.0-or-later
 * support.c: the root of N(H) = target.
 *
 * With V the unit-ball volume, N(H) = V sum_j f(r_j/H) and d ln N / d ln H = -sum q f' / sum f.
 * ln N is nearly straight in ln H, so Newton steps are made there. Distances beyond H are left
 * out before summing: every sum, and with it the root, is then the same bits whatever the trial
 * was. */
#include "support.h"

#include "clones.h"

#include <math.h>
#include <stdbool.h>

#define BLOCK 64 /* distances worked on at once */
#define LANES                                                                                  \
  8 /* partial sums; a fixed number, so that any vector width gives the same bits              \
     */
#define CONVERGED 1e-7 /* last step in ln H: the error after it is about its square */
#define STEPS 60       /* bisection alone needs 50 */

/* 2^(k/4), k = 0..3, of the mantissa range [1/2, 1): exact constants, so that levels are the
 * same everywhere. */
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

/* Fills q up to whole lanes with 1, where s = s' = 0. */
static int fill_up(int m, double *q) {
  while (m % LANES != 0) q[m++] = 1.0;
  return m;
}

/* What a solve works on: distances in canonical order. */
typedef struct problem {
  const wend_smoothing *smoothing;
  double factor; /* unit-ball volume x norm */
  double target;
  int32_t n;
  double *r;
} problem;

/* N at level k from the distances below it; *distinct tells whether anything but coincident
 * particles is inside. */
static double level_sum(const problem *p, int k, bool *distinct) {
  const double h = level_value(k), scale = 1.0 / h;
  double q[BLOCK], s[BLOCK], lane[LANES] = {0.0}, largest = 0.0;
  int m = 0;
  for (int32_t j = 0; j < p->n; j++) {
    const bool within = p->r[j] < h;
    q[m] = p->r[j] * scale;
    largest = within && p->r[j] > largest ? p->r[j] : largest;
    m += within;
    if (m == BLOCK || (j == p->n - 1 && m > 0)) {
      m = fill_up(m, q);
      p->smoothing->shape(m, q, s);
      lanes_add(m, s, lane);
      m = 0;
    }
  }
  *distinct = largest > 0.0;
  return p->factor * total(lane);
}

/* Leaves out what is not below h, for good. */
static void shorten(problem *p, double h) {
  int32_t m = 0;
  for (int32_t j = 0; j < p->n; j++) {
    p->r[m] = p->r[j];
    m += p->r[m] < h;
  }
  p->n = m;
}

/* Sums s(q) and -q s'(q) over all distances left. */
static void both_sums(const problem *p, double h, double *restrict shape,
                      double *restrict slope) {
  const double scale = 1.0 / h;
  double q[BLOCK], s[BLOCK], lane[LANES] = {0.0}, lane_slope[LANES] = {0.0};
  for (int32_t begin = 0; begin < p->n; begin += BLOCK) {
    const int32_t left = p->n - begin, some = left < BLOCK ? left : BLOCK;
    for (int32_t k = 0; k < some; k++) q[k] = p->r[begin + k] * scale;
    const int m = fill_up(some, q);
    p->smoothing->shape(m, q, s);
    lanes_add(m, s, lane);
    p->smoothing->slope(m, q, s);
    lanes_add_slope(m, q, s, lane_slope);
  }
  *shape = total(lane);
  *slope = total(lane_slope);
}

/* The root between h[0] and h[1], where N is number[0] < target <= number[1]. */
static double root_between(const problem *p, double h[2], const double number[2]) {
  const double share = log(p->target / number[0]) / log(number[1] / number[0]);
  double x = h[0] * pow(h[1] / h[0], share);
  for (int step = 0; step < STEPS; step++) {
    double shape, slope;
    both_sums(p, x, &shape, &slope);
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

/* A level below one that holds the target, probably the one that holds it barely, or the next:
 * N grows about as H^dim. */
static int lower_guess(int top, double sum, double target, int dim) {
  const int levels = (int)(4.0 * log2(sum / target) / dim);
  return levels > 1 ? top - levels : top - 1;
}

double wend_support_solve(const wend_smoothing *smoothing, int dim, double target, double trial,
                          int32_t n, double *restrict r) {
  const double pi = 0x1.921fb54442d18p+1;
  const double ball = dim == 3 ? 4.0 / 3.0 * pi : pi;
  problem p = {smoothing, ball * smoothing->norm[dim - 2], target, n, r};
  int top = level_number(trial), bottom = top; /* bottom < top: it does not hold the target */
  bool distinct;
  double above = level_sum(&p, top, &distinct), below = 0.0;
  if (!(above >= target && distinct)) return 0.0;
  while (top - bottom != 1) {
    const int next =
        bottom < top ? bottom + (top - bottom + 3) / 4 : lower_guess(top, above, target, dim);
    const double sum = level_sum(&p, next, &distinct);
    if (sum >= target && distinct) {
      shorten(&p, level_value(next));
      bottom = bottom < top ? bottom : next;
      top = next;
      above = sum;
    } else {
      bottom = next;
      below = sum;
    }
  }
  if (below >= target) return level_value(top);
  shorten(&p, level_value(top));
  double h[2] = {level_value(bottom), level_value(top)};
  return root_between(&p, h, (double[2]){below, above});
}
