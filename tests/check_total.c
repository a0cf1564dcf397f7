/* SPDX-License-Identifier: GPL-3.0-or-later
 * check_total.c: totals over ranks against integer arithmetic, whoever holds which term. */
#include "total.h"

#include "cloud.h"
#include "spread.h"

#include <check.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

enum { TERMS = 4000, COLUMNS = 5 };

static wend_team team;

/* Terms that are integers of up to 40 bits and either sign, times 2^-70: exact in double, and
 * so is their sum in 64-bit integers. */
static double draw(uint64_t *seed, int64_t *exact) {
  const int64_t whole = (int64_t)((2 * cloud_random(seed) - 1) * 0x1p40);
  *exact += whole;
  return ldexp((double)whole, -70);
}

/* This rank's terms of one column, dealt out one of the ways. */
static int64_t deal(spread_way way, uint64_t seed, double *mine, double *total) {
  const spread none = {.n = 0};
  int64_t n = 0, exact = 0;
  for (int32_t i = 0; i < TERMS; i++) {
    const double term = draw(&seed, &exact);
    if (spread_rank(&none, way, i, team.size) == team.rank) mine[n++] = term;
  }
  *total = ldexp((double)exact, -70);
  return n;
}

static const spread_way ways[] = {SPREAD_TURNS, SPREAD_RANDOM, SPREAD_HOLE, SPREAD_FIRST,
                                  SPREAD_LAST};
enum { WAYS = sizeof ways / sizeof *ways };

/* Sums stay below 2^53 units of 2^-70: no rounding at all. */
START_TEST(totals_are_exact) {
  double *mine = malloc(TERMS * sizeof *mine), expected;
  const int64_t n = deal(ways[_i], 1, mine, &expected);
  const double found = wend_total_of(&team, n, mine);
  ck_assert(spread_everywhere(found == expected));
  free(mine);
}
END_TEST

START_TEST(several_sums_travel_together) {
  wend_sum sum[COLUMNS];
  double *mine = malloc(TERMS * sizeof *mine), expected[COLUMNS];
  for (int c = 0; c < COLUMNS; c++) {
    wend_sum_reset(&sum[c]);
    wend_sum_add(&sum[c], deal(ways[_i], 10 + (uint64_t)c, mine, &expected[c]), mine, 1);
  }
  wend_total(&team, COLUMNS, sum);
  bool good = true;
  for (int c = 0; c < COLUMNS; c++) good = good && wend_sum_value(&sum[c]) == expected[c];
  ck_assert(spread_everywhere(good));
  free(mine);
}
END_TEST

/* Not the value alone: the limbs are those of one rank that adds all terms. */
START_TEST(limbs_do_not_depend_on_ranks) {
  double *mine = malloc(TERMS * sizeof *mine), unused;
  wend_sum shared, alone;
  wend_sum_reset(&shared);
  wend_sum_reset(&alone);
  wend_sum_add(&shared, deal(ways[_i], 30, mine, &unused), mine, 1);
  wend_total(&team, 1, &shared);
  const int ranks = team.size, rank = team.rank;
  team.size = 1;
  team.rank = 0;
  wend_sum_add(&alone, deal(SPREAD_FIRST, 30, mine, &unused), mine, 1);
  team.size = ranks;
  team.rank = rank;
  ck_assert(spread_everywhere(memcmp(&shared, &alone, sizeof shared) == 0));
  free(mine);
}
END_TEST

/* What plain sums lose: 1e300 on the first rank, -1e300 on the last, 1e-300 on each. */
START_TEST(nothing_is_too_small) {
  const double term[3] = {team.rank == 0 ? 1e300 : 0, 1e-300,
                          team.rank == team.size - 1 ? -1e300 : 0};
  const double total = wend_total_of(&team, 3, term);
  ck_assert(spread_everywhere(fabs(total - team.size * 1e-300) <= 1e-315));
}
END_TEST

START_TEST(nan_and_infinities_reach_all) {
  const double odd[3] = {NAN, INFINITY, -INFINITY};
  for (int k = 0; k < 3; k++) {
    const double term = team.rank == team.size - 1 ? odd[k] : 1;
    ck_assert(spread_everywhere(isnan(wend_total_of(&team, 1, &term))));
  }
}
END_TEST

START_TEST(no_terms_are_zero) {
  ck_assert(spread_everywhere(wend_total_of(&team, 0, NULL) == 0));
}
END_TEST

int main(int count, char **arguments) {
  MPI_Init(&count, &arguments);
  wend_team_init(&team, MPI_COMM_WORLD);
  Suite *suite = suite_create("total");
  TCase *tc = tcase_create("total");
  tcase_add_loop_test(tc, totals_are_exact, 0, WAYS);
  tcase_add_loop_test(tc, several_sums_travel_together, 0, WAYS);
  tcase_add_loop_test(tc, limbs_do_not_depend_on_ranks, 0, WAYS);
  tcase_add_test(tc, nothing_is_too_small);
  tcase_add_test(tc, nan_and_infinities_reach_all);
  tcase_add_test(tc, no_terms_are_zero);
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
