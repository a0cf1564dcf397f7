/* SPDX-License-Identifier: LGPL-3.0-or-later
 * smoothing.c: shapes and slopes of the smoothing kernels, and the table of them.
 *
 * With u = max(0, 1 - q) and v = max(0, 1/2 - q):
 *   Wendland C2    s = u^4 (1 + 4 q)               s' = -20 q u^3
 *   Wendland C4    s = u^6 (1 + 6 q + 35/3 q^2)    s' = -56/3 q u^5 (1 + 5 q)
 *   cubic spline   s = u^3 - 4 v^3                 s' = -3 (u - 2 v) (u + 2 v)
 * The positive part is (x + |x|)/2, which is exact, free of branches, passes NaN on, and
 * vectorises; gcc splits a loop with a comparison in this place into two paths and then gives
 * up. */
#include "smoothing.h"

#include "clones.h"

#include <math.h>
#include <stddef.h>
#include <string.h>

#define WEND_PI 3.14159265358979323846

static inline double positive_part(double x) { return 0.5 * (x + fabs(x)); }

WEND_CLONES static void shape_wendland_c2(int n, const double *restrict q, double *restrict s) {
  for (int i = 0; i < n; i++) {
    const double u = positive_part(1.0 - q[i]);
    const double u2 = u * u;
    s[i] = u2 * u2 * (1.0 + 4.0 * q[i]);
  }
}

WEND_CLONES static void slope_wendland_c2(int n, const double *restrict q,
                                          double *restrict ds) {
  for (int i = 0; i < n; i++) {
    const double u = positive_part(1.0 - q[i]);
    ds[i] = -20.0 * q[i] * (u * u * u);
  }
}

WEND_CLONES static void shape_wendland_c4(int n, const double *restrict q, double *restrict s) {
  for (int i = 0; i < n; i++) {
    const double u = positive_part(1.0 - q[i]);
    const double u3 = u * u * u;
    s[i] = u3 * u3 * (1.0 + q[i] * (6.0 + (35.0 / 3.0) * q[i]));
  }
}

WEND_CLONES static void slope_wendland_c4(int n, const double *restrict q,
                                          double *restrict ds) {
  for (int i = 0; i < n; i++) {
    const double u = positive_part(1.0 - q[i]);
    const double u2 = u * u;
    ds[i] = (-56.0 / 3.0) * q[i] * (u2 * u2 * u) * (1.0 + 5.0 * q[i]);
  }
}

WEND_CLONES static void shape_cubic_spline(int n, const double *restrict q,
                                           double *restrict s) {
  for (int i = 0; i < n; i++) {
    const double u = positive_part(1.0 - q[i]);
    const double v = positive_part(0.5 - q[i]);
    s[i] = u * u * u - 4.0 * (v * v * v);
  }
}

WEND_CLONES static void slope_cubic_spline(int n, const double *restrict q,
                                           double *restrict ds) {
  for (int i = 0; i < n; i++) {
    const double u = positive_part(1.0 - q[i]);
    const double v = positive_part(0.5 - q[i]);
    ds[i] = -3.0 * (u - 2.0 * v) * (u + 2.0 * v);
  }
}

WEND_CLONES static void shape_count(int n, const double *restrict q, double *restrict s) {
  for (int i = 0; i < n; i++) {
    const double q2 = q[i] * q[i];
    s[i] = positive_part(1.0 - q2 * q2);
  }
}

/* The slope jumps at q = 1: zero from there on. */
WEND_CLONES static void slope_count(int n, const double *restrict q, double *restrict ds) {
  for (int i = 0; i < n; i++) ds[i] = q[i] < 1.0 ? -4.0 * (q[i] * q[i] * q[i]) : 0.0;
}

const wend_smoothing *wend_smoothing_count(void) {
  static const wend_smoothing count = {
      "count", {3.0 / (2.0 * WEND_PI), 21.0 / (16.0 * WEND_PI)}, shape_count, slope_count};
  return &count;
}

/* Norms: the integral of s over the unit disc and ball is one over these. */
static const wend_smoothing table[] = {
    {"wendland-c2",
     {7.0 / WEND_PI, 21.0 / (2.0 * WEND_PI)},
     shape_wendland_c2,
     slope_wendland_c2},
    {"wendland-c4",
     {9.0 / WEND_PI, 495.0 / (32.0 * WEND_PI)},
     shape_wendland_c4,
     slope_wendland_c4},
    {"cubic-spline",
     {80.0 / (7.0 * WEND_PI), 16.0 / WEND_PI},
     shape_cubic_spline,
     slope_cubic_spline},
};

const wend_smoothing *wend_smoothing_at(int k) {
  const int n = (int)(sizeof table / sizeof table[0]);
  return k >= 0 && k < n ? &table[k] : NULL;
}

const wend_smoothing *wend_smoothing_find(const char *name) {
  const wend_smoothing *kernel = NULL;
  for (int k = 0; (kernel = wend_smoothing_at(k)) != NULL; k++)
    if (strcmp(kernel->name, name) == 0) return kernel;
  return NULL;
}
