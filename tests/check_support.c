/* SPDX-License-Identifier: GPL-3.0-or-later
 * check_support.c: the root of N(H) = target against GSL's solver, and its independence of the
 * trial.
 *
 * Tolerance 2e-12: the contract's 1e-12 and the reference's own bracket, 1e-14, plus the
 * round-off of N over its slope. */
#include "cloud.h"
#include "count_root.h"
#include "support.h"

#include <check.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

#define TOLERANCE 2e-12
#define MANY 4000

/* Distances of n uniform places in a ball of radius 1 around a particle (itself first or amid).
 */
static void distances_fill(int dim, int32_t n, double *r, uint64_t seed) {
  for (int32_t j = 0; j < n; j++) r[j] = pow(cloud_random(&seed), 1.0 / dim);
  r[n / 3] = 0.0;
}

/* Solves from a copy: the list is spoiled. */
static double solve(const wend_smoothing *kernel, double target, double trial, int32_t n,
                    const double *r) {
  static double copy[MANY];
  memcpy(copy, r, sizeof *r * (size_t)n);
  return wend_support_solve(kernel, target < 30.0 ? 2 : 3, target, trial, n, copy);
}

START_TEST(test_levels) {
  ck_assert(wend_support_level(1.0) == 1.0);
  ck_assert(wend_support_level(0x1p-1000) == 0x1p-1000);
  ck_assert(wend_support_level(nextafter(8.0, 9.0)) == 8.0 * 0x1.306fe0a31b715p0);
  uint64_t seed = 4;
  for (int k = 0; k < 10000; k++) {
    const double h = exp(400.0 * (cloud_random(&seed) - 0.5));
    const double level = wend_support_level(h);
    require(level >= h && wend_support_level(level) == level, "%g", h);
    /* The level below is smaller than h; 1e-15 for the rounded constants. */
    require(level * pow(2.0, -0.25) < h * (1.0 + 1e-15), "%g", h);
    const double quarters = 4.0 * log2(level);
    require(fabs(quarters - round(quarters)) < 1e-11, "%g", h);
    require(wend_support_level(nextafter(level, INFINITY)) > level, "%g", h);
  }
}
END_TEST

/* All kernels, both dimensions, few and many distances beside the ones that matter. */
START_TEST(test_root) {
  static double r[MANY];
  const wend_smoothing *kernel;
  for (int k = 0; (kernel = wend_smoothing_at(k)); k++)
    for (int dim = 2; dim <= 3; dim++)
      for (int32_t n = 60; n <= MANY; n *= 4) {
        const double target = dim == 3 ? 48.0 : 20.0;
        distances_fill(dim, n, r, (uint64_t)(n + _i));
        const double h = solve(kernel, target, 2.0, n, r);
        const double expected = count_root(kernel->name, dim, target, n, r, 0.02, 2.0);
        require(fabs(h / expected - 1.0) < TOLERANCE, "%s %d-D n %d: %.16g not %.16g",
                kernel->name, dim, n, h, expected);
      }
}
END_TEST

/* Larger trials bring more distances, anywhere in the list; the root must keep its bits. */
START_TEST(test_trial_independence) {
  static double r[MANY], part[MANY];
  const wend_smoothing *kernel;
  distances_fill(3, MANY, r, (uint64_t)_i);
  for (int k = 0; (kernel = wend_smoothing_at(k)); k++) {
    const double h = solve(kernel, 48.0, 8.0, MANY, r);
    const double smallest = wend_support_level(h);
    for (double trial = smallest; trial < 9.0; trial = wend_support_level(trial * 1.01)) {
      int32_t n = 0;
      for (int32_t j = 0; j < MANY; j++)
        if (r[j] < trial) part[n++] = r[j];
      const double again = solve(kernel, 48.0, trial, n, part);
      require(again == h, "%s trial %g: %.17g not %.17g", kernel->name, trial, again, h);
    }
    const double below = wend_support_level(smallest * 0.8);
    ck_assert(below < h);
    ck_assert(solve(kernel, 48.0, below, MANY, r) == 0.0);
  }
}
END_TEST

START_TEST(test_too_few) {
  const wend_smoothing *kernel = wend_smoothing_find("wendland-c2");
  const double r[8] = {0.0, 0.1, 0.2, 0.3, 0.4, 0.5, 0.6, 0.7};
  ck_assert(solve(kernel, 48.0, 0x1p40, 0, r) == 0.0);
  ck_assert(solve(kernel, 48.0, 0x1p40, 1, r) == 0.0);
  ck_assert(solve(kernel, 48.0, 0x1p40, 3, r) == 0.0);
  ck_assert(solve(kernel, 48.0, 0x1p40, 8, r) > 0.0);
}
END_TEST

/* Coincident particles alone exceed the target at any radius: the support then ends at the
 * first level beyond the nearest distinct particle, and is not found before that one is seen.
 */
START_TEST(test_coincident) {
  const wend_smoothing *kernel = wend_smoothing_find("wendland-c2");
  const double r[8] = {0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.3, 0.9};
  const double level = wend_support_level(0.3);
  ck_assert(solve(kernel, 48.0, 16.0, 8, r) == level);
  ck_assert(solve(kernel, 48.0, level, 7, r) == level);
  ck_assert(solve(kernel, 48.0, 0.25, 6, r) == 0.0);
  ck_assert(solve(kernel, 48.0, 16.0, 6, r) == 0.0);
  const double on_level[7] = {0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.5};
  ck_assert(solve(kernel, 48.0, 4.0, 7, on_level) > 0.5);
}
END_TEST

/* A power of two in the unit of length is exact, at the ends of the range too. */
START_TEST(test_scaling) {
  const wend_smoothing *kernel = wend_smoothing_find("wendland-c4");
  double r[200];
  distances_fill(3, 200, r, 9);
  const double h = solve(kernel, 48.0, 2.0, 200, r);
  for (int exponent = -800; exponent <= 800; exponent += 100) {
    double scaled[200];
    for (int j = 0; j < 200; j++) scaled[j] = ldexp(r[j], exponent);
    ck_assert(solve(kernel, 48.0, ldexp(2.0, exponent), 200, scaled) == ldexp(h, exponent));
  }
}
END_TEST

int main(void) {
  Suite *suite = suite_create("support");
  TCase *cases = tcase_create("support");
  tcase_set_timeout(cases, 0);
  tcase_add_test(cases, test_levels);
  tcase_add_loop_test(cases, test_root, 0, 20);
  tcase_add_loop_test(cases, test_trial_independence, 0, 20);
  tcase_add_test(cases, test_too_few);
  tcase_add_test(cases, test_coincident);
  tcase_add_test(cases, test_scaling);
  suite_add_tcase(suite, cases);
  SRunner *runner = srunner_create(suite);
  srunner_set_fork_status(runner, CK_NOFORK);
  srunner_run_all(runner, CK_NORMAL);
  const int failed = srunner_ntests_failed(runner);
  srunner_free(runner);
  return failed != 0;
}
