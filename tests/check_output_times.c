/* SPDX-License-Identifier: GPL-3.0-or-later
 * check_output_times.c: which output comes next, and when. */
#include "output_times.h"

#include <check.h>
#include <math.h>
#include <stdlib.h>

/* All output times of a run as the march sees them: each is reached to the bit. */
static int list_times(const wend_setup *setup, double start, int room, double *time) {
  wend_output_cursor cursor = {0};
  int n = 0;
  wend_output_pass(setup, start, start, &cursor);
  for (double now = start; now < setup->end && n < room;) {
    now = wend_output_next(setup, start, &cursor);
    time[n++] = now;
    wend_output_pass(setup, start, now, &cursor);
  }
  return n;
}

static void expect(const wend_setup *setup, double start, int n, const double *time) {
  double found[64];
  ck_assert_int_eq(list_times(setup, start, 64, found), n);
  for (int k = 0; k < n; k++) ck_assert_double_eq(found[k], time[k]);
}

START_TEST(end_only) { expect(&(wend_setup){.end = 3}, 1, 1, (double[]){3}); }
END_TEST

START_TEST(rounds_from_the_start) {
  expect(&(wend_setup){.end = 3.5, .every = 1}, 0.25, 4, (double[]){1.25, 2.25, 3.25, 3.5});
  expect(&(wend_setup){.end = 2, .every = 5}, 0, 1, (double[]){2});
}
END_TEST

/* 3 x 0.1 and 0.3 are a rounding apart, and so are 10 x 0.1 and 1 in some sums: one output
 * each. */
START_TEST(times_a_rounding_apart_are_one) {
  double entries[] = {0.3, 0.55, 1};
  const wend_setup setup = {.end = 1, .every = 0.1, .times = entries, .n_times = 3};
  expect(&setup, 0, 11,
         (double[]){0.1, 0.2, 0.3, 0.4, 0.5, 0.55, 6 * 0.1, 7 * 0.1, 8 * 0.1, 9 * 0.1, 1});
}
END_TEST

START_TEST(entries_at_the_start_lie_behind) {
  double entries[] = {2, 2.5, 2.5, 4};
  expect(&(wend_setup){.end = 4, .times = entries, .n_times = 4}, 2, 2, (double[]){2.5, 4});
}
END_TEST

/* A run that stops between outputs and writes there goes on with the one that is due. */
START_TEST(passing_between_outputs_skips_none) {
  double entries[] = {1.7};
  const wend_setup setup = {.end = 10, .every = 1, .times = entries, .n_times = 1};
  wend_output_cursor cursor = {0};
  wend_output_pass(&setup, 0, 1.5, &cursor);
  ck_assert_double_eq(wend_output_next(&setup, 0, &cursor), 1.7);
  wend_output_pass(&setup, 0, 7.5, &cursor);
  ck_assert_double_eq(wend_output_next(&setup, 0, &cursor), 8);
  ck_assert_int_eq(cursor.rounds, 7);
  ck_assert_int_eq(cursor.files, 0);
}
END_TEST

int main(void) {
  Suite *suite = suite_create("output_times");
  TCase *tc = tcase_create("output_times");
  tcase_add_test(tc, end_only);
  tcase_add_test(tc, rounds_from_the_start);
  tcase_add_test(tc, times_a_rounding_apart_are_one);
  tcase_add_test(tc, entries_at_the_start_lie_behind);
  tcase_add_test(tc, passing_between_outputs_skips_none);
  suite_add_tcase(suite, tc);
  SRunner *runner = srunner_create(suite);
  srunner_set_fork_status(runner, CK_NOFORK);
  srunner_run_all(runner, CK_NORMAL);
  const int failed = srunner_ntests_failed(runner);
  srunner_free(runner);
  return failed != 0;
}
