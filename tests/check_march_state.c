/* SPDX-License-Identifier: GPL-3.0-or-later
 * check_march_state.c: a march that is saved and restored goes on with the same bits. */
#include "experiment.h"
#include "lattice.h"
#include "spread.h"

#include <check.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

static wend_team team;

static double hill(const double x[3], const void *problem) {
  const double width = *(const double *)problem;
  const double r2 = (x[0] - 0.4) * (x[0] - 0.4) + (x[1] - 0.5) * (x[1] - 0.5);
  return 1e-3 + exp(-r2 / (2 * width * width));
}

/* An oblique field in a box that CRs may leave: both unknowns are in use. */
static void begin(wend_experiment *x) {
  const double lo[3] = {0}, hi[3] = {1, 1, 1}, width = 0.1;
  const wend_lattice lattice = {{20, 20, 1}, 0.3, 3};
  const uint64_t mask = UINT64_C(1) << WEND_BX | UINT64_C(1) << WEND_BY |
                        UINT64_C(1) << WEND_KPAR | UINT64_C(1) << WEND_KPERP |
                        UINT64_C(1) << WEND_ENERGY;
  *x = (wend_experiment){.settings = wend_settings_default()};
  x->domain = wend_scene_domain(2, lo, hi, false);
  x->domain.open[0] = x->domain.open[1] = true;
  ck_assert(wend_lattice_fill(&team, &x->domain, &lattice, mask, &x->particles) == WEND_OK);
  for (int32_t i = 0; i < x->particles.n; i++) {
    x->particles.column[WEND_BX][i] = 2;
    x->particles.column[WEND_BY][i] = 1;
    x->particles.column[WEND_KPAR][i] = 0.01;
    x->particles.column[WEND_KPERP][i] = 0.0001;
  }
  const wend_status status = wend_experiment_begin(&team, x, hill, &width);
  ck_assert_msg(status == WEND_OK, "%s", team.text);
}

static void steps(wend_experiment *x, int n) {
  for (int k = 0; k < n; k++) ck_assert(wend_march_step(&team, &x->march, 0.5) == WEND_OK);
}

static bool same_state(const wend_march *a, const wend_march *b) {
  wend_march_state one, two;
  wend_march_save(a, &one);
  wend_march_save(b, &two);
  return memcmp(&one, &two, sizeof one) == 0;
}

START_TEST(restored_march_goes_on_with_the_same_bits) {
  wend_experiment whole, again;
  wend_march_state state;
  bool same = false;
  begin(&whole);
  steps(&whole, 9);
  wend_march_save(&whole.march, &state);
  begin(&again);
  const size_t bytes = (size_t)whole.particles.n * sizeof(double);
  if (bytes > 0) memcpy(again.march.energy, whole.march.energy, bytes);
  ck_assert(wend_march_restore(&team, &again.march, &state, &same) == WEND_OK);
  ck_assert(same);
  ck_assert(spread_everywhere(same_state(&whole.march, &again.march)));
  const size_t all = bytes * (size_t)whole.march.unknowns;
  ck_assert(spread_everywhere(bytes == 0 ||
                              memcmp(whole.march.rate_0, again.march.rate_0, all) == 0));
  steps(&whole, 12);
  steps(&again, 12);
  ck_assert(spread_everywhere(same_state(&whole.march, &again.march)));
  ck_assert(spread_everywhere(bytes == 0 ||
                              memcmp(whole.march.energy, again.march.energy, bytes) == 0));
  /* steps were made, of more than one kind, and energy left: the states had something to say */
  ck_assert_int_eq(whole.march.steps, 21);
  ck_assert(whole.march.stages > 21);
  ck_assert(wend_ledger_balance(&whole.march.ledger, WEND_ACCOUNT_ESCAPED) > 0);
  wend_experiment_end(&whole);
  wend_experiment_end(&again);
}
END_TEST

START_TEST(another_explicit_step_is_noticed) {
  wend_experiment x;
  wend_march_state state;
  bool same = true;
  begin(&x);
  wend_march_save(&x.march, &state);
  state.number[WEND_MARCH_NUMBERS - 1] = nextafter(state.number[WEND_MARCH_NUMBERS - 1], 1);
  ck_assert(wend_march_restore(&team, &x.march, &state, &same) == WEND_OK);
  ck_assert(!same);
  wend_experiment_end(&x);
}
END_TEST

START_TEST(nonsense_is_refused) {
  wend_experiment x;
  wend_march_state good, bad;
  bool same;
  begin(&x);
  wend_march_save(&x.march, &good);
  bad = good;
  bad.number[1] = NAN;
  ck_assert(wend_march_restore(&team, &x.march, &bad, &same) == WEND_ERR_ARGUMENT);
  bad = good;
  bad.count[4] = WEND_CAUSES;
  ck_assert(wend_march_restore(&team, &x.march, &bad, &same) == WEND_ERR_ARGUMENT);
  bad = good;
  bad.count[0] = -1;
  ck_assert(wend_march_restore(&team, &x.march, &bad, &same) == WEND_ERR_ARGUMENT);
  ck_assert(wend_march_restore(&team, &x.march, &good, &same) == WEND_OK);
  wend_experiment_end(&x);
}
END_TEST

int main(int count, char **arguments) {
  MPI_Init(&count, &arguments);
  wend_team_init(&team, MPI_COMM_WORLD);
  Suite *suite = suite_create("march_state");
  TCase *tc = tcase_create("march_state");
  tcase_set_timeout(tc, 120);
  tcase_add_test(tc, restored_march_goes_on_with_the_same_bits);
  tcase_add_test(tc, another_explicit_step_is_noticed);
  tcase_add_test(tc, nonsense_is_refused);
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
