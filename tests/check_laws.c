/* SPDX-License-Identifier: GPL-3.0-or-later
 * check_laws.c: coefficients from constants, records and power laws. */
#include "laws.h"

#include <check.h>
#include <gsl/gsl_math.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

static wend_team team;

enum { N = 5 };

static wend_setup setup_of(wend_law par, wend_law perp) {
  return (wend_setup){
      .path = "a.yaml", .particles = "gas.h5", .kappa_par = par, .kappa_perp = perp};
}

static wend_particles particles_with(int n, const wend_column *column) {
  wend_particles p;
  uint64_t mask = 0;
  for (int k = 0; k < n; k++) mask |= UINT64_C(1) << column[k];
  ck_assert(wend_particles_init(&team, &p, N, mask) == WEND_OK);
  for (int i = 0; i < N; i++) {
    p.id[i] = 100 + (uint64_t)i;
    for (int k = 0; k < n; k++) p.column[column[k]][i] = 1 + i + 0.25 * k;
  }
  return p;
}

static const wend_law none = {.kind = WEND_LAW_CONSTANT};

START_TEST(constants_fill_and_go) {
  const wend_setup s = setup_of((wend_law){.kind = WEND_LAW_CONSTANT, .value = 3}, none);
  wend_particles p = particles_with(1, (wend_column[]){WEND_KPAR});
  ck_assert(wend_laws_apply(&team, &s, &p) == WEND_OK);
  for (int i = 0; i < N; i++) {
    ck_assert_double_eq(p.column[WEND_KPAR][i], 3);
    ck_assert_double_eq(p.column[WEND_KPERP][i], 0);
  }
  wend_laws_drop_constant(&s, &p);
  ck_assert(p.column[WEND_KPAR] == NULL && p.column[WEND_KPERP] == NULL);
  wend_particles_reset(&p);
}
END_TEST

START_TEST(records_stay_as_they_are) {
  const wend_setup s = setup_of(none, (wend_law){.kind = WEND_LAW_RECORD});
  wend_particles p = particles_with(2, (wend_column[]){WEND_X, WEND_KPERP});
  ck_assert(wend_laws_apply(&team, &s, &p) == WEND_OK);
  for (int i = 0; i < N; i++) ck_assert_double_eq(p.column[WEND_KPERP][i], 1.25 + i);
  wend_laws_drop_constant(&s, &p);
  ck_assert(p.column[WEND_KPAR] == NULL && p.column[WEND_KPERP] != NULL);
  wend_particles_reset(&p);
}
END_TEST

/* rho = 1 + i, B = (1.25 + i, 1.5 + i, 1.75 + i); tolerance: a few roundings */
START_TEST(power_laws) {
  const wend_law law = {.kind = WEND_LAW_POWER,
                        .value = 7,
                        .density = 2,
                        .field = 3,
                        .density_index = -0.5,
                        .field_index = -2};
  const wend_setup s = setup_of(law, none);
  wend_particles p =
      particles_with(4, (wend_column[]){WEND_DENSITY, WEND_BX, WEND_BY, WEND_BZ});
  ck_assert(wend_laws_apply(&team, &s, &p) == WEND_OK);
  for (int i = 0; i < N; i++) {
    const double b = gsl_hypot3(1.25 + i, 1.5 + i, 1.75 + i);
    const double k = 7 / sqrt((1 + i) / 2.) / gsl_pow_2(b / 3);
    ck_assert_double_eq_tol(p.column[WEND_KPAR][i] / k, 1, 1e-15 * 8);
  }
  wend_particles_reset(&p);
}
END_TEST

START_TEST(missing_records_are_named) {
  static const struct {
    wend_law law;
    const char *word;
  } row[] = {
      {{.kind = WEND_LAW_RECORD}, "perpendicularDiffusivity"},
      {{.kind = WEND_LAW_POWER, .value = 1, .density = 1, .density_index = 1}, "massDensity"},
      {{.kind = WEND_LAW_POWER, .value = 1, .field = 1, .field_index = 1}, "magneticField"}};
  for (size_t k = 0; k < sizeof row / sizeof row[0]; k++) {
    const wend_setup s = setup_of(none, row[k].law);
    wend_particles p = particles_with(1, (wend_column[]){WEND_X});
    ck_assert(wend_laws_apply(&team, &s, &p) == WEND_ERR_FILE);
    ck_assert_ptr_nonnull(strstr(team.text, row[k].word));
    ck_assert_ptr_nonnull(strstr(team.text, "diffusion.perpendicular"));
    ck_assert_ptr_nonnull(strstr(team.text, "gas.h5"));
    wend_particles_reset(&p);
  }
}
END_TEST

/* |B| = 0: nothing with a positive index, an error that names the particle with a negative one
 */
START_TEST(zero_field) {
  wend_law law = {.kind = WEND_LAW_POWER, .value = 2, .field = 1, .field_index = 0.5};
  wend_setup s = setup_of(law, none);
  wend_particles p = particles_with(2, (wend_column[]){WEND_BX, WEND_BY});
  p.column[WEND_BX][3] = p.column[WEND_BY][3] = 0;
  ck_assert(wend_laws_apply(&team, &s, &p) == WEND_OK);
  ck_assert_double_eq(p.column[WEND_KPAR][3], 0);
  s.kappa_par.field_index = -1;
  ck_assert(wend_laws_apply(&team, &s, &p) == WEND_ERR_PARTICLES);
  ck_assert_ptr_nonnull(strstr(team.text, "particle id 103"));
  ck_assert_ptr_nonnull(strstr(team.text, "diffusion.parallel"));
  wend_particles_reset(&p);
}
END_TEST

int main(int count, char **arguments) {
  MPI_Init(&count, &arguments);
  wend_team_init(&team, MPI_COMM_WORLD);
  Suite *suite = suite_create("laws");
  TCase *tc = tcase_create("laws");
  tcase_add_test(tc, constants_fill_and_go);
  tcase_add_test(tc, records_stay_as_they_are);
  tcase_add_test(tc, power_laws);
  tcase_add_test(tc, missing_records_are_named);
  tcase_add_test(tc, zero_field);
  suite_add_tcase(suite, tc);
  SRunner *runner = srunner_create(suite);
  srunner_set_fork_status(runner, CK_NOFORK);
  srunner_run_all(runner, CK_NORMAL);
  const int failed = srunner_ntests_failed(runner);
  srunner_free(runner);
  wend_team_reset(&team);
  MPI_Finalize();
  return failed != 0;
}
