/* SPDX-License-Identifier: GPL-3.0-or-later
 * check_stage.c: the arithmetic of stages on random vectors, whole super-steps on the test
 * equation against stability polynomials, and the error estimate against the exponential. */
#include "stage.h"

#include "cloud.h"

#include <check.h>
#include <float.h>
#include <gsl/gsl_sf_gegenbauer.h>
#include <gsl/gsl_sf_legendre.h>
#include <math.h>

enum { N = 37 };

static void draw(double *x, uint64_t seed) {
  for (int i = 0; i < N; i++) x[i] = 2 * cloud_random(&seed) - 1;
}

/* A few roundings of terms that add up to less than 10. */
START_TEST(stages_follow_the_recurrence) {
  double latest[N], rate[N], rate_0[N], older[N], next[N], sum[N];
  const wend_stage stage = {.mu = 1.7, .nu = -0.8, .mt = 0.3, .ga = -0.2};
  draw(latest, 1);
  draw(rate, 2);
  draw(rate_0, 3);
  draw(older, 4);
  for (int i = 0; i < N; i++) next[i] = older[i];
  wend_stage_next(N, &stage, 0.9, latest, rate, rate_0, next);
  for (int i = 0; i < N; i++) {
    const double expected =
        1.7 * latest[i] - 0.8 * older[i] + 0.27 * rate[i] - 0.18 * rate_0[i];
    ck_assert_double_eq_tol(next[i], expected, 20 * DBL_EPSILON);
  }
  wend_stage_first(N, 0.3, rate, next);
  wend_stage_add(N, latest, rate, sum);
  for (int i = 0; i < N; i++) {
    ck_assert(next[i] == 0.3 * rate[i]);
    ck_assert(sum[i] == latest[i] + rate[i]);
  }
}
END_TEST

START_TEST(nothing_is_no_work) {
  const wend_stage stage = {.mu = 1};
  double untouched = 5;
  wend_stage_first(0, 1, NULL, &untouched);
  wend_stage_next(0, &stage, 1, NULL, NULL, NULL, &untouched);
  wend_stage_add(0, NULL, NULL, &untouched);
  wend_stage_error(0, 1, NULL, NULL, NULL, &untouched);
  ck_assert(untouched == 5);
}
END_TEST

/* ---- whole super-steps on y' = z y, y(0) = 1: increments end at R(z) - 1 ---- */

static double super_step(const wend_supertime *family, int s, double z) {
  wend_stage stage[WEND_STAGES_MOST + 1];
  const double rate_0 = z;
  double a = 0, b = 0, *older = &a, *latest = &b;
  family->stages(s, stage);
  wend_stage_first(1, stage[1].mt, &rate_0, latest);
  for (int j = 2; j <= s; j++) {
    const double rate = z * (1 + *latest);
    wend_stage_next(1, &stage[j], 1, latest, &rate, &rate_0, older);
    double *const swap = latest;
    latest = older;
    older = swap;
  }
  return *latest;
}

/* R(z) = a + b P(1 + w z) from GSL's polynomials, with R(0) = R'(0) = R''(0) = 1: b w^2 P''(1)
 * = b w P'(1) = 1, w = P'(1)/P''(1). P' and P'' at 1 from the differential equations: Legendre
 * s(s+1)/2, (s-1)s(s+1)(s+2)/8; Gegenbauer's C' = 3 C(5/2), C'' = 15 C(7/2). */
static double polynomial(bool legendre, int s, double z) {
  const double d1 = legendre ? s * (s + 1) / 2.0 : 3 * gsl_sf_gegenpoly_n(s - 1, 2.5, 1);
  const double d2 = legendre ? (s - 1.0) * s * (s + 1.0) * (s + 2.0) / 8
                             : 15 * gsl_sf_gegenpoly_n(s - 2, 3.5, 1);
  const double at_1 = legendre ? 1 : gsl_sf_gegenpoly_n(s, 1.5, 1);
  const double w = d1 / d2, b = 1 / (d1 * w), x = 1 + w * z;
  /* GSL's Legendre polynomials end at |x| = 1, where the stable range ends too. */
  const double p = legendre ? gsl_sf_legendre_Pl(s, x) : gsl_sf_gegenpoly_n(s, 1.5, x);
  return 1 - b * at_1 + b * p;
}

/* Rounding grows with the square of the stages: 21^2 roundings. */
START_TEST(super_steps_follow_stability_polynomials) {
  const wend_supertime *family = wend_supertime_find(_i == 0 ? "rkg2" : "rkl2");
  for (int s = 3; s <= 21; s += 2)
    for (int k = 0; k <= 40; k++) {
      const double z = -2 * family->reach(s) * k / 40.0 * (1 - 1e-15);
      const double expected = polynomial(_i == 1, s, z);
      ck_assert_double_eq_tol(1 + super_step(family, s, z), expected, 1e-13);
    }
}
END_TEST

/* ---- the error estimate ---- */

/* y' = z y: the local error of R is (R - exp) = (c - 1/6) z^3 for small z. The estimate [12
 * (y_0
 * - y_1) + 6 (F_0 + F_1)]/15 is exact for cubic solutions of other schemes: for exact y_1 it is
 * z^3/15 itself, since 12 (1 - e^z) + 6 z (1 + e^z) = z^3 + O(z^4). */
START_TEST(estimates_of_exact_solutions_are_a_fifteenth) {
  for (int k = 0; k < 6; k++) {
    const double z = -1e-3 * pow(2, k), y = expm1(z), rate_0 = z, rate_1 = z * (1 + y);
    double error;
    wend_stage_error(1, 1, &y, &rate_0, &rate_1, &error);
    ck_assert_double_eq_tol(error, fabs(z * z * z) / 15, fabs(z * z * z) * fabs(z));
  }
}
END_TEST

/* For the schemes themselves, with R = 1 + z + z^2/2 + c z^3, it is (1 - 4c)/5 z^3 where the
 * true error is (1/6 - c) z^3: of third order, and 1.2 to 3 times as large for c from 0 to 1/8.
 */
START_TEST(estimates_measure_the_error_of_super_steps) {
  const wend_supertime *family = wend_supertime_find(_i == 0 ? "rkg2" : "rkl2");
  for (int s = 5; s <= 21; s += 4) {
    double before = 0;
    for (int k = 0; k < 4; k++) {
      const double z = -0.02 * pow(2, k), y = super_step(family, s, z);
      const double rate_0 = z, rate_1 = z * (1 + y);
      double error;
      wend_stage_error(1, 1, &y, &rate_0, &rate_1, &error);
      const double exact = fabs(y - expm1(z));
      ck_assert_double_gt(error, exact);
      ck_assert_double_lt(error, exact * 3);
      if (k > 0) ck_assert_double_eq_tol(log2(error / before), 3, 0.15);
      before = error;
    }
  }
}
END_TEST

START_TEST(estimates_are_magnitudes) {
  double increment[N], rate_0[N], rate_1[N], error[N];
  draw(increment, 5);
  draw(rate_0, 6);
  draw(rate_1, 7);
  wend_stage_error(N, 0.7, increment, rate_0, rate_1, error);
  for (int i = 0; i < N; i++) {
    const double expected = (-12 * increment[i] + 6 * 0.7 * (rate_0[i] + rate_1[i])) / 15;
    ck_assert_double_eq_tol(error[i], fabs(expected), 20 * DBL_EPSILON);
  }
}
END_TEST

int main(void) {
  Suite *suite = suite_create("stage");
  TCase *tc = tcase_create("arithmetic");
  tcase_add_test(tc, stages_follow_the_recurrence);
  tcase_add_test(tc, nothing_is_no_work);
  tcase_add_loop_test(tc, super_steps_follow_stability_polynomials, 0, 2);
  suite_add_tcase(suite, tc);
  tc = tcase_create("error");
  tcase_add_test(tc, estimates_of_exact_solutions_are_a_fifteenth);
  tcase_add_loop_test(tc, estimates_measure_the_error_of_super_steps, 0, 2);
  tcase_add_test(tc, estimates_are_magnitudes);
  suite_add_tcase(suite, tc);
  SRunner *runner = srunner_create(suite);
  srunner_set_fork_status(runner, CK_NOFORK);
  srunner_run_all(runner, CK_NORMAL);
  const int failed = srunner_ntests_failed(runner);
  srunner_free(runner);
  return failed != 0;
}
