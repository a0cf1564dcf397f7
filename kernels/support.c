/* SPDX-License-Identifier: LGPL-3.0-or-later
 * support.c: the root of N(H) = target.
 *
 * With V the unit-ball volume, N(H) = V sum_j f(r_j/H) and d ln N / d ln H = -sum q f' / sum f.
 * ln N is nearly straight in ln H, so Newton steps are made there. Distances beyond H are left
 * out before summing: every sum, and with it the root, is then the same bits whatever the trial
 * was. */
#include "support.h"

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

typedef struct sums {
  double shape[LANES]; /* sum s(q) */
  double slope[LANES]; /* sum -q s'(q) */
  bool distinct;       /* some distance is not zero */
} sums;

static double total(const double *lane) {
  return ((lane[0] + lane[4]) + (lane[2] + lane[6])) +
         ((lane[1] + lane[5]) + (lane[3] + lane[7]));
}

/* Adds a block of q = r/H to the sums; q is filled up to whole lanes with 1, where s = s' = 0.
 */
static void block_add(const wend_smoothing *smoothing, int m, double *restrict q,
                      bool with_slope, sums *restrict out) {
  double s[BLOCK];
  while (m % LANES != 0) q[m++] = 1.0;
  smoothing->shape(m, q, s);
  for (int k = 0; k < m; k += LANES)
    for (int lane = 0; lane < LANES; lane++) out->shape[lane] += s[k + lane];
  if (!with_slope) return;
  smoothing->slope(m, q, s);
  for (int k = 0; k < m; k += LANES)
    for (int lane = 0; lane < LANES; lane++) out->slope[lane] -= q[k + lane] * s[k + lane];
}

/* Sums over the distances below h. */
static sums sums_within(const wend_smoothing *smoothing, double h, int32_t n,
                        const double *restrict r, bool with_slope) {
  sums out = {.distinct = false};
  double q[BLOCK];
  int m = 0;
  double largest = 0.0;
  for (int32_t j = 0; j < n; j++) {
    q[m] = r[j] / h;
    const bool within = r[j] < h;
    largest = within && r[j] > largest ? r[j] : largest;
    m += within;
    if (m == BLOCK) {
      block_add(smoothing, m, q, with_slope, &out);
      m = 0;
    }
  }
  block_add(smoothing, m, q, with_slope, &out);
  out.distinct = largest > 0.0;
  return out;
}

/* What a solve works on. */
typedef struct problem {
  const wend_smoothing *smoothing;
  double factor; /* unit-ball volume x norm */
  double target;
  int32_t n;
  const double *r;
} problem;

/* N at level k; *distinct tells whether anything but coincident particles is inside. */
static double level_sum(const problem *p, int k, bool *distinct) {
  const sums s = sums_within(p->smoothing, level_value(k), p->n, p->r, false);
  *distinct = s.distinct;
  return p->factor * total(s.shape);
}

/* The root between h[0] and h[1], where N is number[0] < target <= number[1]. */
static double root_between(const problem *p, double h[2], const double number[2]) {
  const double share = log(p->target / number[0]) / log(number[1] / number[0]);
  double x = h[0] * pow(h[1] / h[0], share);
  for (int step = 0; step < STEPS; step++) {
    const sums s = sums_within(p->smoothing, x, p->n, p->r, true);
    const double sum = total(s.shape);
    const double excess = log(p->factor * sum / p->target);
    h[excess >= 0.0] = x;
    double move = -excess * sum / total(s.slope);
    const double next = x * exp(move);
    const bool inside = next >= h[0] && next <= h[1];
    const double middle = sqrt(h[0] * h[1]);
    move = inside ? move : middle / x - 1.0;
    x = inside ? next : middle;
    if (fabs(move) < CONVERGED) break;
  }
  return x;
}

double wend_support_solve(const wend_smoothing *smoothing, int dim, double target, double trial,
                          int32_t n, const double *restrict r) {
  const double pi = 0x1.921fb54442d18p+1;
  const double ball = dim == 3 ? 4.0 / 3.0 * pi : pi;
  const problem p = {smoothing, ball * smoothing->norm[dim - 2], target, n, r};
  int top = level_number(trial);
  bool distinct;
  double above = level_sum(&p, top, &distinct), below = above;
  if (!(above >= target && distinct)) return 0.0;
  while (below >= target && distinct) {
    above = below;
    below = level_sum(&p, --top, &distinct);
  }
  if (below >= target) return level_value(top + 1);
  double h[2] = {level_value(top), level_value(top + 1)};
  return root_between(&p, h, (double[2]){below, above});
}
