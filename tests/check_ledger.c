/* SPDX-License-Identifier: GPL-3.0-or-later
 * check_ledger.c: every account moves the closure with its sign, wrong bookings are noticed to
 * the last bit, and the books do not depend on the ranks. */
#include "ledger.h"

#include "cloud.h"
#include "spread.h"

#include <check.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

enum { ENERGIES = 1000 };

static wend_team team;

/* This rank's share of energies over 20 decades, the same set on any number of ranks; the
 * middle rank has none. */
static int64_t energies(double *mine, double factor) {
  const spread none = {.n = 0};
  uint64_t seed = 1;
  int64_t n = 0;
  for (int32_t i = 0; i < ENERGIES; i++) {
    const double e = factor * pow(10, 20 * cloud_random(&seed) - 10);
    if (spread_rank(&none, SPREAD_HOLE, i, team.size) == team.rank) mine[n++] = e;
  }
  return n;
}

static wend_ledger opened(void) {
  wend_ledger ledger;
  double e[ENERGIES];
  const int64_t n = energies(e, 1);
  wend_ledger_open(&team, &ledger, n, e);
  return ledger;
}

START_TEST(books_open_closed) {
  const wend_ledger l = opened();
  ck_assert(spread_everywhere(wend_ledger_closure(&l) == 0 && wend_ledger_relative(&l) == 0));
  ck_assert(wend_ledger_balance(&l, WEND_ACCOUNT_INITIAL) == wend_ledger_now(&l));
  for (int a = 1; a < WEND_ACCOUNTS; a++)
    ck_assert(wend_ledger_balance(&l, (wend_account)a) == 0);
}
END_TEST

/* initial + entered - left - now, account by account: 0.75 booked on one rank only. */
START_TEST(every_account_moves_the_closure_with_its_sign) {
  const wend_account a = (wend_account)_i;
  const int sign = wend_account_table[a].sign;
  const double term = 0.75;
  wend_ledger l = opened();
  const double before = wend_ledger_balance(&l, a);
  wend_ledger_book(&team, &l, a, team.rank == team.size - 1, &term);
  ck_assert(spread_everywhere(wend_ledger_closure(&l) == sign * 0.75));
  ck_assert(a == WEND_ACCOUNT_INITIAL || wend_ledger_balance(&l, a) - before == 0.75);
  ck_assert_double_gt(wend_ledger_relative(&l), 0);
  wend_ledger_book(&team, &l, a, team.rank == 0, &(double){-0.75});
  ck_assert(spread_everywhere(wend_ledger_closure(&l) == 0));
}
END_TEST

/* Which accounts hold what entered, as design says; the rest holds what left. */
START_TEST(signs_tell_what_entered) {
  static const wend_account entered[] = {WEND_ACCOUNT_INITIAL, WEND_ACCOUNT_INJECTED,
                                         WEND_ACCOUNT_HELD, WEND_ACCOUNT_HOST,
                                         WEND_ACCOUNT_CLIPPED};
  int sum = 0;
  for (size_t k = 0; k < sizeof entered / sizeof *entered; k++)
    ck_assert_int_eq(wend_account_table[entered[k]].sign, 1);
  for (int a = 0; a < WEND_ACCOUNTS; a++) {
    sum += wend_account_table[a].sign;
    ck_assert(abs(wend_account_table[a].sign) == 1);
    ck_assert(strlen(wend_account_table[a].name) > 0 &&
              strlen(wend_account_table[a].meaning) > 0);
    for (int b = 0; b < a; b++)
      ck_assert_str_ne(wend_account_table[a].name, wend_account_table[b].name);
  }
  ck_assert_int_eq(sum, 5 - (WEND_ACCOUNTS - 5));
}
END_TEST

/* Energies that halve while each half is booked as escaped: closed to the bit. */
START_TEST(true_bookings_close) {
  wend_ledger l = opened();
  double e[ENERGIES];
  const int64_t n = energies(e, 0.5);
  wend_ledger_book(&team, &l, WEND_ACCOUNT_ESCAPED, n, e);
  wend_ledger_count(&team, &l, n, e);
  ck_assert(spread_everywhere(wend_ledger_closure(&l) == 0));
  ck_assert(wend_ledger_balance(&l, WEND_ACCOUNT_ESCAPED) == wend_ledger_now(&l));
}
END_TEST

/* One unit in the last place of the smallest of them, 1e-10 beside a total of 1e10. */
START_TEST(the_last_bit_is_noticed) {
  wend_ledger l = opened();
  double e[ENERGIES], smallest = INFINITY;
  int64_t n = energies(e, 0.5), least = -1;
  for (int64_t i = 0; i < n; i++)
    if (e[i] < smallest) smallest = e[least = i];
  double all = smallest;
  wend_team_min(&team, 1, &all);
  wend_ledger_count(&team, &l, n, e);
  if (least >= 0 && smallest == all) e[least] = nextafter(smallest, INFINITY);
  wend_ledger_book(&team, &l, WEND_ACCOUNT_ESCAPED, n, e);
  const double wrong = nextafter(all, INFINITY) - all;
  ck_assert(spread_everywhere(wend_ledger_closure(&l) == -wrong));
  ck_assert_double_gt(wend_ledger_now(&l), 1e18 * all);
}
END_TEST

/* A wrong account of the other sign is off by twice the amount. */
START_TEST(wrong_accounts_are_noticed) {
  wend_ledger l = opened();
  double e[ENERGIES];
  int64_t n = energies(e, 0.5);
  wend_ledger_book(&team, &l, WEND_ACCOUNT_INJECTED, n, e);
  wend_ledger_count(&team, &l, n, e);
  const double now = wend_ledger_now(&l);
  ck_assert(spread_everywhere(wend_ledger_closure(&l) == 2 * now));
  /* initial 2 now, injected now */
  ck_assert_double_eq_tol(wend_ledger_relative(&l), 2.0 / 3, 1e-15);
}
END_TEST

/* The same accounts computed by one rank alone, limb by limb. */
START_TEST(books_do_not_depend_on_ranks) {
  wend_ledger l = opened(), alone;
  double e[ENERGIES];
  int64_t n = energies(e, 0.3);
  wend_ledger_book(&team, &l, WEND_ACCOUNT_COULOMB, n, e);
  wend_ledger_count(&team, &l, n, e);
  const wend_team world = team;
  ck_assert(wend_team_init(&team, MPI_COMM_SELF) == WEND_OK);
  alone = opened();
  n = energies(e, 0.3);
  wend_ledger_book(&team, &alone, WEND_ACCOUNT_COULOMB, n, e);
  wend_ledger_count(&team, &alone, n, e);
  wend_team_reset(&team);
  team = world;
  ck_assert(spread_everywhere(memcmp(&l, &alone, sizeof l) == 0));
}
END_TEST

START_TEST(empty_books_are_closed) {
  wend_ledger l;
  wend_ledger_open(&team, &l, 0, NULL);
  ck_assert(wend_ledger_closure(&l) == 0 && wend_ledger_relative(&l) == 0);
  ck_assert(wend_ledger_now(&l) == 0);
  const double term = 2;
  wend_ledger_book(&team, &l, WEND_ACCOUNT_ESCAPED, team.rank == 0, &term);
  ck_assert(wend_ledger_closure(&l) == -2 && wend_ledger_relative(&l) == 2);
}
END_TEST

START_TEST(nan_is_noticed) {
  wend_ledger l = opened();
  const double term = team.rank == 0 ? NAN : 1;
  wend_ledger_book(&team, &l, WEND_ACCOUNT_HOST, 1, &term);
  ck_assert(
      spread_everywhere(isnan(wend_ledger_closure(&l)) && isnan(wend_ledger_relative(&l))));
}
END_TEST

int main(int count, char **arguments) {
  MPI_Init(&count, &arguments);
  wend_team_init(&team, MPI_COMM_WORLD);
  Suite *suite = suite_create("ledger");
  TCase *tc = tcase_create("books");
  tcase_add_test(tc, books_open_closed);
  tcase_add_loop_test(tc, every_account_moves_the_closure_with_its_sign, 0, WEND_ACCOUNTS);
  tcase_add_test(tc, signs_tell_what_entered);
  tcase_add_test(tc, true_bookings_close);
  tcase_add_test(tc, the_last_bit_is_noticed);
  tcase_add_test(tc, wrong_accounts_are_noticed);
  tcase_add_test(tc, books_do_not_depend_on_ranks);
  tcase_add_test(tc, empty_books_are_closed);
  tcase_add_test(tc, nan_is_noticed);
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
