/* SPDX-License-Identifier: GPL-3.0-or-later
 * check_reach.c: ranges grow by one layer of neighbours at a time; excess is measured, NaN
 * noticed. */
#include "reach.h"

#include "lists.h"

#include <check.h>
#include <math.h>
#include <stdlib.h>

/* On a line of lattice points whose supports reach one neighbour either side, k widenings reach
 * k points. */
START_TEST(one_layer_at_a_time) {
  enum { N = 40, LAYERS = 5 };
  lists l = lists_create(lists_box(2, 0), N);
  for (int i = 0; i < N; i++) {
    l.place[i][0] = -1 + (i + 0.5) * 2.0 / N;
    l.place[i][3] = 1.5 * 2.0 / N;
  }
  lists_find(&l, N, 2);
  double range[N][2], wide[N][2];
  for (int i = 0; i < N; i++) range[i][0] = range[i][1] = i;
  for (int k = 1; k <= LAYERS; k++) {
    wend_reach_widen(&l.pairs, l.all, (const double(*)[2])range, wide);
    for (int i = 0; i < N; i++) {
      ck_assert(wide[i][0] == fmax(0, i - k) && wide[i][1] == fmin(N - 1, i + k));
      range[i][0] = wide[i][0];
      range[i][1] = wide[i][1];
    }
  }
  lists_destroy(&l);
}
END_TEST

START_TEST(excess_is_the_farthest) {
  const double range[3][2] = {{0, 1}, {-1, 1}, {5, 5}};
  const double within[3] = {0, 1, 5}, beyond[3] = {1.25, -3, 5}, bad[3] = {0, NAN, 5};
  ck_assert(wend_reach_excess(3, within, range) == 0);
  ck_assert(wend_reach_excess(3, beyond, range) == 2);
  ck_assert(isnan(wend_reach_excess(3, bad, range)));
  ck_assert(wend_reach_excess(0, NULL, NULL) == 0);
}
END_TEST

int main(void) {
  Suite *suite = suite_create("reach");
  TCase *cases = tcase_create("reach");
  tcase_add_test(cases, one_layer_at_a_time);
  tcase_add_test(cases, excess_is_the_farthest);
  suite_add_tcase(suite, cases);
  SRunner *runner = srunner_create(suite);
  srunner_set_fork_status(runner, CK_NOFORK);
  srunner_run_all(runner, CK_NORMAL);
  const int failed = srunner_ntests_failed(runner);
  srunner_free(runner);
  return failed != 0;
}
