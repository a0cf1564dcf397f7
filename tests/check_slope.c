/* SPDX-License-Identifier: GPL-3.0-or-later
 * check_slope.c: slopes along the field: exact for linear and, on a good set, quadratic fields;
 * bounded noise; sets on a line. */
#include "slope.h"

#include "gradient.h"
#include "lists.h"

#include <check.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>

typedef struct set {
  lists l;
  double (*inverse)[6];
  float *arm[3];
  wend_face_source source;
} set;

/* A random set, or one squeezed onto a plane or line across the last axis. */
static void set_create(set *s, int dim, int32_t n, double support, bool squeezed,
                       uint64_t seed) {
  *s = (set){.l = lists_create(lists_box(dim, squeezed ? 0 : 7 >> (3 - dim)), n)};
  lists_scatter(&s->l, support, seed);
  for (int32_t i = 0; squeezed && i < n; i++) s->l.place[i][dim - 1] = 0;
  lists_find(&s->l, n, 1);
  s->inverse = calloc((size_t)n, sizeof *s->inverse);
  const wend_smoothing *smoothing = wend_smoothing_find("wendland-c2");
  wend_gradient_matrices(&s->l.pairs, s->l.all, &s->l.domain, smoothing,
                         (const double(*)[4])s->l.place, s->inverse);
  const int64_t entries = s->l.pairs.first[s->l.pairs.slices];
  for (int d = 0; d < 3; d++) s->arm[d] = calloc((size_t)entries, sizeof(float));
  for (int32_t i = 0; i < n; i++)
    for (int32_t m = 0; m < s->l.pairs.count[i]; m++) {
      const int64_t k = wend_pairs_entry(&s->l.pairs, i, m);
      for (int d = 0; d < dim; d++)
        s->arm[d][k] = (float)wend_domain_wrap(
            &s->l.domain, d, s->l.place[s->l.pairs.index[k]][d] - s->l.place[i][d]);
    }
  s->source = (wend_face_source){.domain = &s->l.domain,
                                 .smoothing = smoothing,
                                 .place = (const double(*)[4])s->l.place,
                                 .inverse = (const double(*)[6])s->inverse};
}

static void set_destroy(set *s) {
  lists_destroy(&s->l);
  free(s->inverse);
  for (int d = 0; d < 3; d++) free(s->arm[d]);
}

/* Slope of a polynomial of the arm, and the size of its terms: value r.g + r.A.r. */
static double slope_of(const set *s, const wend_slope *fit, int32_t i, const double g[3],
                       const double a[3][3], double *size) {
  double sum = 0;
  *size = 0;
  for (int32_t m = 0; m < s->l.pairs.count[i]; m++) {
    const int64_t k = wend_pairs_entry(&s->l.pairs, i, m);
    const double r[3] = {s->arm[0][k], s->arm[1][k], s->arm[2][k]};
    double value = 0;
    for (int c = 0; c < 3; c++) {
      value += g[c] * r[c];
      for (int d = 0; d < 3; d++) value += a[c][d] * r[c] * r[d];
    }
    const double term = wend_slope_weight(&s->source, fit, i, r) * value;
    sum += term;
    *size += fabs(term);
  }
  return sum;
}

/* Is the inverse matrix that of the row, not the isotropic stand-in of a row on a line or
 * plane? */
static bool regular(const set *s, int32_t i) {
  const int dim = s->l.domain.dim;
  const double *m = s->inverse[i], h = s->l.place[i][3];
  double trace = 0;
  for (int32_t k = 0; k < s->l.pairs.count[i]; k++) {
    const int64_t e = wend_pairs_entry(&s->l.pairs, i, k);
    const double x = s->arm[0][e], y = s->arm[1][e], z = s->arm[2][e];
    const double q = sqrt(x * x + y * y + z * z) / h;
    double w;
    s->source.smoothing->shape(1, &q, &w);
    w *= s->source.smoothing->norm[dim - 2] / pow(h, dim);
    trace += w * (m[0] * x * x + m[3] * y * y + m[5] * z * z +
                  2 * (m[1] * x * y + m[2] * x * z + m[4] * y * z));
  }
  const double off = fabs(m[1]) + fabs(m[2]) + fabs(m[4]);
  return fabs(trace - dim) < 1e-3 && off > 0;
}

static const double none[3][3] = {{0}};
static const double curved[3][3] = {{1, -2, 0.5}, {-2, 3, 1}, {0.5, 1, -1}};

/* Direction i of a spiral on the sphere, in the plane for 2-D. */
static void direction(int dim, int32_t i, double b[3]) {
  const double z = dim == 3 ? cos(1.7 * i) : 0, rest = sqrt(1 - z * z);
  b[0] = rest * cos(2.4 * i);
  b[1] = rest * sin(2.4 * i);
  b[2] = z;
}

START_TEST(linear_fields_are_exact) {
  for (int dim = 2; dim <= 3; dim++) {
    set s;
    set_create(&s, dim, 300, dim == 2 ? 0.3 : 0.6, false, 5);
    const double g[3] = {0.7, -1.3, dim == 3 ? 0.4 : 0};
    for (int32_t i = 0; i < s.l.n; i++) {
      double b[3], size;
      wend_slope fit;
      direction(dim, i, b);
      wend_slope_fit(&s.l.pairs, &s.source, s.arm, i, b, &fit);
      const double exact = b[0] * g[0] + b[1] * g[1] + b[2] * g[2];
      if (!regular(&s, i)) continue;
      const double found = slope_of(&s, &fit, i, g, none, &size);
      /* arms are floats (6e-8) and the fit inverts a matrix of condition up to 1e5 */
      if (!(fabs(found - exact) <= 1e-5 * (size + 1)))
        ck_abort_msg("dim %d row %d: %g for %g", dim, i, found, exact);
    }
    set_destroy(&s);
  }
}
END_TEST

/* Sum of d^2/w over the row: the noise that the blend bounds. */
static double noise_of(const set *s, const wend_slope *fit, int32_t i) {
  double noise = 0;
  for (int32_t m = 0; m < s->l.pairs.count[i]; m++) {
    const int64_t k = wend_pairs_entry(&s->l.pairs, i, m);
    const double r[3] = {s->arm[0][k], s->arm[1][k], s->arm[2][k]};
    const double d = wend_slope_weight(&s->source, fit, i, r), h = s->l.place[i][3];
    const double q = sqrt(r[0] * r[0] + r[1] * r[1] + r[2] * r[2]) / h;
    double w;
    s->source.smoothing->shape(1, &q, &w);
    w *= s->source.smoothing->norm[s->l.domain.dim - 2] / pow(h, s->l.domain.dim);
    if (w > 0) noise += d * d / w;
  }
  return noise;
}

START_TEST(noise_is_bounded_and_curvature_mostly_removed) {
  for (int dim = 2; dim <= 3; dim++) {
    set s;
    set_create(&s, dim, 400, dim == 2 ? 0.25 : 0.55, false, 9);
    double off_first = 0, off_blend = 0;
    const double g[3] = {0};
    for (int32_t i = 0; i < s.l.n; i++) {
      double b[3], size;
      wend_slope fit;
      direction(dim, i, b);
      wend_slope_fit(&s.l.pairs, &s.source, s.arm, i, b, &fit);
      const double *m = s.inverse[i];
      const double first[3] = {m[0] * b[0] + m[1] * b[1] + m[2] * b[2],
                               m[1] * b[0] + m[3] * b[1] + m[4] * b[2],
                               m[2] * b[0] + m[4] * b[1] + m[5] * b[2]};
      const double least = b[0] * first[0] + b[1] * first[1] + b[2] * first[2];
      /* 1.5 by construction; floats and ill-conditioned rows blur it */
      if (!(noise_of(&s, &fit, i) <= 1.51 * least)) ck_abort_msg("row %d is noisy", i);
      off_blend += fabs(slope_of(&s, &fit, i, g, curved, &size));
      wend_slope linear = {.terms = fit.terms};
      for (int a = 0; a < dim; a++) linear.factor[a] = s.l.place[i][3] * first[a];
      off_first += fabs(slope_of(&s, &linear, i, g, curved, &size));
    }
    printf("dim %d: error of a quadratic field's slope %.3f of the first-order one\n", dim,
           off_blend / off_first);
    /* random sets with few neighbours let the noise bound hold back part of the second order */
    ck_assert_double_lt(off_blend, 0.75 * off_first);
    set_destroy(&s);
  }
}
END_TEST

START_TEST(rows_on_a_line_or_plane_stay_finite) {
  for (int dim = 2; dim <= 3; dim++) {
    set s;
    set_create(&s, dim, 60, 0.8, true, 3);
    for (int32_t i = 0; i < s.l.n; i++) {
      const double b[3] = {1, 0, 0}, g[3] = {1, 0, 0};
      double size;
      wend_slope fit;
      wend_slope_fit(&s.l.pairs, &s.source, s.arm, i, b, &fit);
      for (int k = 0; k < fit.terms; k++) ck_assert(isfinite(fit.factor[k]));
      /* the isotropic fall-back keeps the sign of a slope in the plane of the particles */
      ck_assert_double_gt(slope_of(&s, &fit, i, g, none, &size), 0);
    }
    set_destroy(&s);
  }
}
END_TEST

START_TEST(no_direction_no_weights) {
  set s;
  set_create(&s, 2, 50, 0.5, false, 2);
  const double b[3] = {0};
  wend_slope fit;
  wend_slope_fit(&s.l.pairs, &s.source, s.arm, 0, b, &fit);
  for (int k = 0; k < fit.terms; k++) ck_assert(fit.factor[k] == 0);
  set_destroy(&s);
}
END_TEST

int main(void) {
  Suite *suite = suite_create("slope");
  TCase *cases = tcase_create("slope");
  tcase_add_test(cases, linear_fields_are_exact);
  tcase_add_test(cases, noise_is_bounded_and_curvature_mostly_removed);
  tcase_add_test(cases, rows_on_a_line_or_plane_stay_finite);
  tcase_add_test(cases, no_direction_no_weights);
  suite_add_tcase(suite, cases);
  SRunner *runner = srunner_create(suite);
  srunner_set_fork_status(runner, CK_NOFORK);
  srunner_run_all(runner, CK_NORMAL);
  const int failed = srunner_ntests_failed(runner);
  srunner_free(runner);
  return failed != 0;
}
