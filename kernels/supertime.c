/* SPDX-License-Identifier: LGPL-3.0-or-later
 * supertime.c: stage coefficients of RKG2, RKL2 and Euler.
 *
 * R_j(z) = a_j + b_j P_j(1 + w z), P_j the Gegenbauer polynomial of index 3/2 (RKG2) or
 * Legendre's (RKL2). Matching R_s'(0) = R_s''(0) = 1 gives w = P_s'(1)/P_s''(1), b_j =
 * P_j''(1)/P_j'(1)^2, and a_j = 1 - b_j P_j(1). All values at 1 have closed forms, for
 * Gegenbauer's P_j(1) = (j+1)(j+2)/2,  P_j'(1) = j(j+1)(j+2)(j+3)/8, P_j''(1) =
 * (j-1)j(j+1)(j+2)(j+3)(j+4)/48, and for Legendre's 1, j(j+1)/2, (j-1)j(j+1)(j+2)/8. The
 * three-term recurrence j P_j = k1 x P_(j-1) - k2 P_(j-2),  k1 = 2j+1, k2 = j+1 (Gegenbauer);
 * 2j-1, j-1 (Legendre) becomes mu = k1 b_j/(j b_(j-1)), nu = -k2 b_j/(j b_(j-2)), mt = mu w, ga
 * = -a_(j-1) mt. Even s is well defined too, but undamped at the stability limit, so callers
 * use odd s. */
#include "supertime.h"

#include <stddef.h>
#include <string.h>

static double reach_rkg2(int s) { return (s + 4.0) * (s - 1.0) / 6.0; }

/* b_0 = 1 and b_1 = 1/3 are free choices that make a_0 = a_1 = 0. */
static double gegenbauer_b(int s) {
  const double j = s;
  if (s < 2) return s == 0 ? 1.0 : 1.0 / 3.0;
  return 4.0 * (j - 1.0) * (j + 4.0) / (3.0 * j * (j + 1.0) * (j + 2.0) * (j + 3.0));
}

static double gegenbauer_a(int j) {
  return j < 2 ? 0.0 : 1.0 - gegenbauer_b(j) * (j + 1.0) * (j + 2.0) / 2.0;
}

static void stages_rkg2(int s, wend_stage *stage) {
  const double w = 1.0 / reach_rkg2(s);
  stage[1] = (wend_stage){.mt = w};
  for (int j = 2; j <= s; j++) {
    const double b = gegenbauer_b(j);
    const double mu = (2.0 * j + 1.0) * b / (j * gegenbauer_b(j - 1));
    const double nu = -(j + 1.0) * b / (j * gegenbauer_b(j - 2));
    stage[j] =
        (wend_stage){.mu = mu, .nu = nu, .mt = mu * w, .ga = -gegenbauer_a(j - 1) * mu * w};
  }
}

static double reach_rkl2(int s) { return (s + 2.0) * (s - 1.0) / 4.0; }

/* b_0 = b_1 = b_2, the authors' choice. */
static double legendre_b(int s) {
  const double j = s;
  return s < 2 ? 1.0 / 3.0 : (j - 1.0) * (j + 2.0) / (2.0 * j * (j + 1.0));
}

static void stages_rkl2(int s, wend_stage *stage) {
  const double w = 1.0 / reach_rkl2(s);
  stage[1] = (wend_stage){.mt = legendre_b(1) * w};
  for (int j = 2; j <= s; j++) {
    const double b = legendre_b(j);
    const double mu = (2.0 * j - 1.0) * b / (j * legendre_b(j - 1));
    const double nu = -(j - 1.0) * b / (j * legendre_b(j - 2));
    const double a_before = 1.0 - legendre_b(j - 1);
    stage[j] = (wend_stage){.mu = mu, .nu = nu, .mt = mu * w, .ga = -a_before * mu * w};
  }
}

static double reach_euler(int s) {
  (void)s;
  return 1.0;
}

static void stages_euler(int s, wend_stage *stage) {
  (void)s;
  stage[1] = (wend_stage){.mt = 1.0};
}

static const wend_supertime table[] = {
    {"rkg2", 3, WEND_STAGES_MOST, reach_rkg2, stages_rkg2},
    {"rkl2", 3, WEND_STAGES_MOST, reach_rkl2, stages_rkl2},
    {"euler", 1, 1, reach_euler, stages_euler},
};

const wend_supertime *wend_supertime_at(int k) {
  const int n = (int)(sizeof table / sizeof table[0]);
  return k >= 0 && k < n ? &table[k] : NULL;
}

const wend_supertime *wend_supertime_find(const char *name) {
  const wend_supertime *family = NULL;
  for (int k = 0; (family = wend_supertime_at(k)) != NULL; k++)
    if (strcmp(family->name, name) == 0) return family;
  return NULL;
}

int wend_supertime_fit(const wend_supertime *family, double ratio) {
  for (int s = family->least; s <= family->most; s += 2)
    if (family->reach(s) >= ratio) return s;
  return 0;
}
