/* SPDX-License-Identifier: GPL-3.0-or-later
 * check_team.c: agreement on failures, and reductions that do not lose a NaN. */
#include "spread.h"
#include "team.h"

#include <check.h>
#include <math.h>
#include <stdio.h>
#include <string.h>

enum { MANY = 77 }; /* more values than one reduction carries */

static wend_team team;

START_TEST(lowest_failing_rank_is_heard) {
  ck_assert(spread_everywhere(wend_agree(&team) == WEND_OK));
  for (int from = 0; from < team.size; from++) {
    if (team.rank >= from)
      wend_fail(&team, team.rank == from ? WEND_ERR_STEP : WEND_ERR_FILE, "from %d", team.rank);
    wend_fail(&team, WEND_ERR_SETUP, "this one too, later"); /* the first of each rank counts */
    const wend_status status = wend_agree(&team);
    const wend_status expected = from == 0 ? WEND_ERR_STEP : WEND_ERR_SETUP;
    ck_assert(spread_everywhere(status == expected));
    ck_assert_str_eq(team.text, from == 0 ? "from 0" : "this one too, later");
    ck_assert(spread_everywhere(wend_agree(&team) == WEND_OK));
  }
  for (int only = 0; only < team.size; only++) {
    char text[32];
    snprintf(text, sizeof text, "from %d", only);
    if (team.rank == only) wend_fail(&team, WEND_ERR_GEOMETRY, "from %d", only);
    ck_assert(spread_everywhere(wend_agree(&team) == WEND_ERR_GEOMETRY));
    ck_assert(spread_everywhere(strcmp(team.text, text) == 0));
  }
}
END_TEST

START_TEST(long_texts_are_cut) {
  char text[3 * WEND_TEXT_LENGTH];
  memset(text, 'x', sizeof text - 1);
  text[sizeof text - 1] = 0;
  if (team.rank == team.size - 1) wend_fail(&team, WEND_ERR_FILE, "%s", text);
  ck_assert(spread_everywhere(wend_agree(&team) == WEND_ERR_FILE));
  ck_assert(spread_everywhere(strlen(team.text) == WEND_TEXT_LENGTH - 1));
}
END_TEST

START_TEST(extremes_over_ranks) {
  double most[MANY], least[MANY];
  for (int k = 0; k < MANY; k++) most[k] = least[k] = k * (team.rank + 1) - 5.0;
  wend_team_max(&team, MANY, most);
  wend_team_min(&team, MANY, least);
  bool good = true;
  for (int k = 0; k < MANY; k++)
    good = good && most[k] == k * team.size - 5.0 && least[k] == k - 5.0;
  ck_assert(spread_everywhere(good));
  double untouched = 3;
  wend_team_max(&team, 0, &untouched);
  ck_assert(untouched == 3);
}
END_TEST

START_TEST(special_values_over_ranks) {
  const bool last = team.rank == team.size - 1;
  double v[5] = {last ? NAN : 1, last ? INFINITY : 0, -INFINITY, 4, last ? 5e-324 : 0};
  double w[5];
  memcpy(w, v, sizeof w);
  wend_team_max(&team, 5, v);
  wend_team_min(&team, 5, w);
  const bool alone = team.size == 1;
  ck_assert(spread_everywhere(isnan(v[0]) && v[1] == INFINITY && v[2] == -INFINITY &&
                              v[3] == 4 && v[4] == 5e-324));
  ck_assert(spread_everywhere(isnan(w[0]) && w[1] == (alone ? INFINITY : 0) &&
                              w[2] == -INFINITY && w[3] == 4 && w[4] == (alone ? 5e-324 : 0)));
}
END_TEST

START_TEST(counts_over_ranks) {
  int64_t v[2] = {INT64_C(1) << 40, team.rank};
  wend_team_count(&team, 2, v);
  ck_assert(spread_everywhere(v[0] == team.size * (INT64_C(1) << 40)));
  ck_assert(spread_everywhere(v[1] == team.size * (team.size - 1) / 2));
}
END_TEST

START_TEST(memory_that_is_not_there) {
  ck_assert_ptr_null(wend_allocate(&team, 0, 8));
  ck_assert_ptr_null(wend_allocate(&team, -3, 8));
  ck_assert(spread_everywhere(wend_agree(&team) == WEND_OK));
  ck_assert_ptr_null(wend_allocate(&team, INT64_C(1) << 60, 8));
  ck_assert(spread_everywhere(wend_agree(&team) == WEND_ERR_MEMORY));
  ck_assert_ptr_nonnull(strstr(team.text, "more ranks"));
}
END_TEST

int main(int count, char **arguments) {
  MPI_Init(&count, &arguments);
  wend_team_init(&team, MPI_COMM_WORLD);
  Suite *suite = suite_create("team");
  TCase *tc = tcase_create("team");
  tcase_add_test(tc, lowest_failing_rank_is_heard);
  tcase_add_test(tc, long_texts_are_cut);
  tcase_add_test(tc, extremes_over_ranks);
  tcase_add_test(tc, special_values_over_ranks);
  tcase_add_test(tc, counts_over_ranks);
  tcase_add_test(tc, memory_that_is_not_there);
  suite_add_tcase(suite, tc);
  SRunner *runner = srunner_create(suite);
  srunner_set_fork_status(runner, CK_NOFORK);
  srunner_run_all(runner, team.rank == 0 ? CK_NORMAL : CK_SILENT);
  const int failed = srunner_ntests_failed(runner);
  srunner_free(runner);
  wend_team_reset(&team);
  MPI_Finalize();
  return failed != 0;
}
