/* SPDX-License-Identifier: GPL-3.0-or-later
 * check_smoothing.c: smoothing kernels against integrals, tabulated values and numerical
 * slopes. */
#include "smoothing.h"

#include <check.h>
#include <gsl/gsl_deriv.h>
#include <gsl/gsl_integration.h>
#include <gsl/gsl_math.h>
#include <math.h>
#include <stdlib.h>

static double shape_at(const wend_smoothing *kernel, double q) {
  double s;
  kernel->shape(1, &q, &s);
  return s;
}

static double slope_at(const wend_smoothing *kernel, double q) {
  double ds;
  kernel->slope(1, &q, &ds);
  return ds;
}

static double in_plane(double q, void *kernel) { return 2 * M_PI * q * shape_at(kernel, q); }
static double in_space(double q, void *kernel) {
  return 4 * M_PI * q * q * shape_at(kernel, q);
}
static double plain(double q, void *kernel) { return shape_at(kernel, q); }

START_TEST(kernels_integrate_to_one) {
  double (*const integrand[2])(double, void *) = {in_plane, in_space};
  const wend_smoothing *kernel = wend_smoothing_at(_i);
  for (int dim = 2; dim <= 3; dim++) {
    gsl_function f = {integrand[dim - 2], (void *)kernel};
    double sum = 0;
    /* Two halves, so that the spline's break at 1/2 is at an end; 21 points integrate each
     * polynomial (degree <= 10) exactly up to round-off. */
    for (int half = 0; half < 2; half++) {
      double part, error;
      size_t calls;
      gsl_integration_qng(&f, 0.5 * half, 0.5 * (half + 1), 1e-14, 1e-14, &part, &error,
                          &calls);
      sum += part;
    }
    ck_assert_double_eq_tol(kernel->norm[dim - 2] * sum, 1.0, 1e-12);
  }
}
END_TEST

/* f(q) = norm s in 3-D at q = 0, 1/4, 1/2, 3/4, from the published polynomials in exact
 * arithmetic, printed to ten decimals: hence 1e-10. */
START_TEST(shapes_match_the_published_polynomials) {
  static const struct {
    const char *name;
    double f[4];
  } row[3] = {{"cubic-spline", {2.5464790895, 1.8302818456, .6366197724, .0795774715}},
              {"wendland-c2", {3.3422538049, 2.1150199859, .6266725884, .0522227157}},
              {"wendland-c4", {4.9238560519, 2.8298498260, .5321354848, .0145004916}}};
  const wend_smoothing *kernel = wend_smoothing_find(row[_i].name);
  ck_assert_ptr_nonnull(kernel);
  for (int k = 0; k < 4; k++)
    ck_assert_double_eq_tol(kernel->norm[1] * shape_at(kernel, 0.25 * k), row[_i].f[k], 1e-10);
}
END_TEST

START_TEST(slopes_are_derivatives_of_shapes) {
  const wend_smoothing *kernel = wend_smoothing_at(_i);
  gsl_function f = {plain, (void *)kernel};
  ck_assert_double_eq(slope_at(kernel, 0.0), 0.0);
  for (int k = 1; k < 100; k++) {
    const double q = 0.01 * k;
    double numerical, error;
    gsl_deriv_central(&f, q, 1e-4, &numerical, &error);
    /* The five-point formula errs by h^4 |s^(5)|/30 < 1e-16 * 1e5 where s is smooth; at the
     * spline's break, where the third derivative jumps by 24, by about h^2 * 24/6 = 4e-8. */
    const double tolerance = k == 50 ? 1e-7 : 1e-9;
    ck_assert_double_eq_tol(slope_at(kernel, q), numerical, tolerance);
  }
}
END_TEST

START_TEST(support_ends_exactly_at_one) {
  const wend_smoothing *kernel = wend_smoothing_at(_i);
  const double outside[5] = {1.0, nextafter(1.0, 2.0), 1.5, 2.0, 1e100};
  double s[5], ds[5];
  kernel->shape(5, outside, s);
  kernel->slope(5, outside, ds);
  for (int k = 0; k < 5; k++) {
    ck_assert(s[k] == 0.0);
    ck_assert(ds[k] == 0.0);
  }
  ck_assert(shape_at(kernel, 1.0 - 0x1p-20) > 0.0);
  ck_assert(slope_at(kernel, 1.0 - 0x1p-20) < 0.0);
  ck_assert(isnan(shape_at(kernel, (double)NAN)));
}
END_TEST

/* A batch gives the same bits as one value at a time, whatever its length. */
START_TEST(batches_do_not_change_bits) {
  enum { N = 37 };
  const wend_smoothing *kernel = wend_smoothing_at(_i);
  double q[N], s[N], ds[N];
  for (int k = 0; k < N; k++) q[k] = 1.2 * k / N;
  kernel->shape(N, q, s);
  kernel->slope(N, q, ds);
  for (int k = 0; k < N; k++) {
    ck_assert(s[k] == shape_at(kernel, q[k]));
    ck_assert(ds[k] == slope_at(kernel, q[k]));
  }
}
END_TEST

START_TEST(table_is_searched_by_name) {
  int n = 0;
  for (; wend_smoothing_at(n) != NULL; n++)
    ck_assert_ptr_eq(wend_smoothing_find(wend_smoothing_at(n)->name), wend_smoothing_at(n));
  ck_assert_int_eq(n, 3);
  ck_assert_ptr_null(wend_smoothing_at(-1));
  ck_assert_ptr_null(wend_smoothing_find("wendland"));
  ck_assert_str_eq(wend_smoothing_at(0)->name, "wendland-c2"); /* the default comes first */
}
END_TEST

int main(void) {
  Suite *suite = suite_create("smoothing");
  TCase *tc = tcase_create("kernels");
  tcase_add_loop_test(tc, kernels_integrate_to_one, 0, 3);
  tcase_add_loop_test(tc, shapes_match_the_published_polynomials, 0, 3);
  tcase_add_loop_test(tc, slopes_are_derivatives_of_shapes, 0, 3);
  tcase_add_loop_test(tc, support_ends_exactly_at_one, 0, 3);
  tcase_add_loop_test(tc, batches_do_not_change_bits, 0, 3);
  tcase_add_test(tc, table_is_searched_by_name);
  suite_add_tcase(suite, tc);
  SRunner *runner = srunner_create(suite);
  srunner_set_fork_status(runner, CK_NOFORK);
  srunner_run_all(runner, CK_NORMAL);
  const int failed = srunner_ntests_failed(runner);
  srunner_free(runner);
  return failed != 0;
}
