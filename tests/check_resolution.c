/* SPDX-License-Identifier: GPL-3.0-or-later
 * check_resolution.c: the resolution report on linear fields, whose gradients are exact, so
 * that every particle's figures follow from its place and support. */
#include "experiment.h"
#include "lattice.h"
#include "resolution.h"
#include "spread.h"
#include "total.h"

#include <check.h>
#include <math.h>
#include <stdlib.h>

static wend_team team;

typedef struct ramp {
  double slope[3], level;
} ramp;

static double ramp_at(const double x[3], const void *problem) {
  const ramp *r = problem;
  return r->level + r->slope[0] * x[0] + r->slope[1] * x[1] + r->slope[2] * x[2];
}

static void begin(int dim, const double field[3], const ramp *problem, wend_experiment *x) {
  const double lo[3] = {0}, hi[3] = {1, 1, 1};
  const wend_lattice lattice = {
      {dim == 2 ? 24 : 9, dim == 2 ? 24 : 9, dim == 2 ? 1 : 9}, 0.2, 7};
  uint64_t mask =
      UINT64_C(1) << WEND_KPAR | UINT64_C(1) << WEND_KPERP | UINT64_C(1) << WEND_ENERGY;
  for (int a = 0; a < 3; a++) mask |= UINT64_C(1) << (WEND_BX + a);
  *x = (wend_experiment){.settings = wend_settings_default()};
  x->domain = wend_scene_domain(dim, lo, hi, false);
  ck_assert(wend_lattice_fill(&team, &x->domain, &lattice, mask, &x->particles) == WEND_OK);
  for (int32_t i = 0; i < x->particles.n; i++) {
    for (int a = 0; a < 3; a++) x->particles.column[WEND_BX + a][i] = field[a];
    x->particles.column[WEND_KPAR][i] = 0.5 + x->particles.column[WEND_X][i];
    x->particles.column[WEND_KPERP][i] = 0.01;
  }
  const wend_status status = wend_experiment_begin(&team, x, ramp_at, problem);
  ck_assert_msg(status == WEND_OK, "%s", team.text);
}

/* The report's means by formula, from the exact gradient. */
static wend_resolution expected(const wend_experiment *x, const double b[3],
                                const ramp *problem) {
  const int32_t n = x->particles.n;
  const bool magnetised = b[0] != 0 || b[1] != 0 || b[2] != 0;
  double *term[5], sum[5], along = 0, all2 = 0;
  for (int k = 0; k < 5; k++) term[k] = calloc((size_t)n + 1, sizeof(double));
  for (int a = 0; a < 3; a++) {
    along += b[a] * problem->slope[a];
    all2 += problem->slope[a] * problem->slope[a];
  }
  if (!magnetised) along = sqrt(all2);
  for (int32_t i = 0; i < n; i++) {
    const double energy = x->particles.column[WEND_ENERGY][i];
    const double e = energy / x->geometry.volume[i], h = x->geometry.near.place[i][3];
    const double par = 0.5 + x->particles.column[WEND_X][i];
    term[0][i] = energy;
    term[1][i] = h * fabs(along) > e ? energy : 0;
    term[2][i] = energy * (magnetised ? par : (par + 0.02) / 3);
    term[3][i] = energy * (magnetised ? 0.01 : (par + 0.02) / 3);
    term[4][i] = energy * par * fmin(1, h * h * (all2 - along * along) / (e * e));
  }
  for (int k = 0; k < 5; k++) sum[k] = wend_total_of(&team, n, term[k]);
  for (int k = 0; k < 5; k++) free(term[k]);
  return (wend_resolution){.unresolved = sum[1] / sum[0],
                           .kappa_par = sum[2] / sum[0],
                           .kappa_perp = sum[3] / sum[0],
                           .smearing = magnetised ? wend_resolution_smearing * sum[4] / sum[0] /
                                                        (x->domain.dim - 1)
                                                  : 0};
}

static void compare(int dim, const double b[3], const ramp *problem) {
  wend_experiment x;
  wend_resolution found;
  begin(dim, b, problem, &x);
  const wend_resolution formula = expected(&x, b, problem);
  ck_assert(wend_experiment_run(&team, &x, 0) == WEND_OK);
  ck_assert(wend_march_step(&team, &x.march, 1e-9) == WEND_OK);
  ck_assert(wend_resolution_measure(&team, &x.transport, x.particles.column[WEND_ENERGY],
                                    &found) == WEND_OK);
  /* the step moves 1e-9 of the energies; least squares lose some digits at the border */
  ck_assert_double_eq_tol(found.unresolved, formula.unresolved, 1e-7);
  ck_assert_double_eq_tol(found.kappa_par, formula.kappa_par, 1e-7);
  ck_assert_double_eq_tol(found.kappa_perp, formula.kappa_perp, 1e-7);
  ck_assert_double_eq_tol(found.smearing / wend_resolution_smearing,
                          formula.smearing / wend_resolution_smearing, 1e-6);
  ck_assert(found.unresolved > 1e-3 && found.unresolved < 0.5); /* both kinds are there */
  ck_assert(found.limited >= 0 && found.limited <= 1);
  wend_experiment_end(&x);
}

START_TEST(plane) { compare(2, (const double[3]){0.6, 0.8, 0}, &(ramp){{1, 0.3, 0}, 0.02}); }
END_TEST

START_TEST(space) {
  compare(3, (const double[3]){2. / 3, 1. / 3, 2. / 3}, &(ramp){{1, 0.2, 0.5}, 0.01});
}
END_TEST

START_TEST(no_field) { compare(2, (const double[3]){0}, &(ramp){{1, 0.3, 0}, 0.02}); }
END_TEST

START_TEST(nothing_to_resolve) {
  const double b[3] = {1, 0, 0};
  const ramp zero = {{0}, 0};
  wend_experiment x;
  wend_resolution found;
  begin(2, b, &zero, &x);
  ck_assert(wend_march_step(&team, &x.march, 1) == WEND_OK);
  ck_assert(wend_resolution_measure(&team, &x.transport, x.particles.column[WEND_ENERGY],
                                    &found) == WEND_OK);
  ck_assert(found.unresolved == 0 && found.smearing == 0 && found.kappa_par == 0);
  wend_experiment_end(&x);
}
END_TEST

int main(int count, char **arguments) {
  MPI_Init(&count, &arguments);
  wend_team_init(&team, MPI_COMM_WORLD);
  Suite *suite = suite_create("resolution");
  TCase *tc = tcase_create("resolution");
  tcase_set_timeout(tc, 120);
  tcase_add_test(tc, plane);
  tcase_add_test(tc, space);
  tcase_add_test(tc, no_field);
  tcase_add_test(tc, nothing_to_resolve);
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
