/* SPDX-License-Identifier: GPL-3.0-or-later
 * check_scenes.c: what built-in problems stand on: lattices, random numbers, norms, verdicts,
 * and the ring's exact solution against its Fourier series. */
#include "experiment.h"
#include "lattice.h"
#include "random.h"
#include "ring.h"
#include "scene.h"
#include "spread.h"

#include <check.h>
#include <gsl/gsl_cdf.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

static wend_team team;

/* ---- lattices ---- */

static const struct {
  int dim;
  bool periodic;
  wend_lattice lattice;
} sets[] = {
    {2, true, {{13, 7, 1}, 0.2, 1}}, {2, false, {{7, 13, 1}, 1.0, 2}},
    {3, true, {{5, 6, 7}, 1.0, 3}},  {3, false, {{7, 5, 3}, 0.5, 4}},
    {3, true, {{4, 4, 4}, 0, 5}},    {2, true, {{1, 1, 1}, 0.4, 6}},
};
enum { SETS = sizeof sets / sizeof sets[0] };

static const double lo[3] = {-1, 0.5, 2}, hi[3] = {1, 1.5, 2.25};

static wend_particles fill(wend_team *on, int k, wend_domain *domain) {
  wend_particles p;
  *domain = wend_scene_domain(sets[k].dim, lo, hi, sets[k].periodic);
  const wend_status status =
      wend_lattice_fill(on, domain, &sets[k].lattice, UINT64_C(1) << WEND_ENERGY, &p);
  ck_assert(spread_everywhere(status == WEND_OK));
  return p;
}

/* Rank r holds a share of ids in order; one rank alone holds all of them. */
START_TEST(lattices_do_not_depend_on_ranks) {
  wend_domain domain;
  wend_team self;
  wend_team_init(&self, MPI_COMM_SELF);
  wend_particles all = fill(&self, _i, &domain), mine = fill(&team, _i, &domain);
  int64_t count = mine.n;
  bool same = true;
  for (int32_t i = 0; i < mine.n; i++) {
    const int64_t k = (int64_t)mine.id[i] - 1;
    same = same && k >= 0 && k < all.n && all.id[k] == mine.id[i];
    for (int a = 0; a < 3 && same; a++)
      same = mine.column[WEND_X + a][i] == all.column[WEND_X + a][k];
  }
  wend_team_count(&team, 1, &count);
  ck_assert(spread_everywhere(same && count == all.n));
  ck_assert_int_le(mine.n, all.n / team.size + 1);
  wend_particles_reset(&all);
  wend_particles_reset(&mine);
  wend_team_reset(&self);
}
END_TEST

/* A place outside comes back around a periodic border, or as its mirror image. */
static double settled(const wend_domain *domain, int axis, double x) {
  const double low = domain->lo[axis], high = domain->hi[axis], width = high - low;
  if (domain->period[axis] > 0) return x < low ? x + width : x >= high ? x - width : x;
  return x < low ? low + (low - x) : x >= high ? high - (x - high) : x;
}

/* A cell's centre, pushed by the number of its own that every axis has: 4e-15 for rounding of
 * places of order 2. */
START_TEST(particles_stand_near_their_cells) {
  wend_domain domain;
  wend_particles p = fill(&team, _i, &domain);
  const wend_lattice *lattice = &sets[_i].lattice;
  bool good = p.column[WEND_ENERGY] != NULL || p.n == 0;
  for (int32_t i = 0; i < p.n; i++) {
    int64_t rest = (int64_t)p.id[i] - 1;
    for (int a = 0; a < 3; a++) {
      const double x = p.column[WEND_X + a][i];
      const double spacing = (domain.hi[a] - domain.lo[a]) / lattice->side[a];
      const double u = wend_random(lattice->seed, p.id[i], (uint64_t)a);
      const double cell = (double)(rest % lattice->side[a]);
      const double pushed =
          domain.lo[a] + (cell + 0.5 + lattice->jitter * (2 * u - 1)) * spacing;
      rest /= lattice->side[a];
      good = good && (a < domain.dim ? x >= domain.lo[a] && x < domain.hi[a] : x == 0);
      good = good && (a >= domain.dim || fabs(x - settled(&domain, a, pushed)) < 4e-15);
    }
  }
  ck_assert(spread_everywhere(good));
  wend_particles_reset(&p);
}
END_TEST

START_TEST(sets_are_joined) {
  wend_domain domain;
  wend_particles p = fill(&team, 0, &domain), more = fill(&team, 5, &domain);
  const int32_t n = p.n, m = more.n;
  for (int32_t i = 0; i < m; i++) {
    more.id[i] += 1000;
    more.column[WEND_ENERGY][i] = 7;
  }
  ck_assert(spread_everywhere(wend_lattice_join(&team, &p, &more) == WEND_OK));
  bool good = p.n == n + m;
  for (int32_t i = 0; i < m && good; i++)
    good = p.id[n + i] == more.id[i] && p.column[WEND_ENERGY][n + i] == 7 &&
           p.column[WEND_X][n + i] == more.column[WEND_X][i];
  for (int32_t i = 0; i < n && good; i++) good = p.id[i] < 1000;
  ck_assert(spread_everywhere(good));
  wend_particles_reset(&p);
  wend_particles_reset(&more);
}
END_TEST

/* ---- random numbers ---- */

enum { DRAWS = 100000, BINS = 100 };

/* Probability of a larger chi-square than that of the counts, all cells alike. */
static double chance_of(const int *count) {
  double chi2 = 0;
  for (int b = 0; b < BINS; b++) {
    const double expected = (double)DRAWS / BINS;
    chi2 += (count[b] - expected) * (count[b] - expected) / expected;
  }
  return gsl_cdf_chisq_Q(chi2, BINS - 1);
}

/* Neither too uneven nor too even: all 24 figures of truly random numbers would pass but for a
 * chance of one in 10^4; ours are the same every time. */
static void is_even(const int *count) {
  const double chance = chance_of(count);
  ck_assert_double_gt(chance, 2e-6);
  ck_assert_double_lt(chance, 1 - 2e-6);
}

START_TEST(random_numbers_are_uniform) {
  static const uint64_t seeds[] = {0, 1, 2, 12345, UINT64_MAX};
  for (size_t s = 0; s < sizeof seeds / sizeof *seeds; s++)
    for (uint64_t channel = 0; channel < 4; channel++) {
      int count[BINS] = {0};
      double least = 1, most = 0;
      for (uint64_t item = 1; item <= DRAWS; item++) {
        const double u = wend_random(seeds[s], item, channel);
        least = fmin(least, u);
        most = fmax(most, u);
        if (u >= 0 && u < 1) count[(int)(u * BINS)]++;
      }
      ck_assert(least >= 0 && most < 1);
      is_even(count);
    }
}
END_TEST

/* Pairs fill the square: items next to each other, two channels, two seeds, lattice rows. */
START_TEST(random_numbers_are_independent) {
  int count[4][BINS] = {{0}};
  for (uint64_t item = 1; item <= DRAWS; item++) {
    const int first = (int)(10 * wend_random(1, item, 0));
    const double other[4] = {wend_random(1, item + 1, 0), wend_random(1, item, 1),
                             wend_random(2, item, 0), wend_random(1, item + 128, 0)};
    for (int k = 0; k < 4; k++) count[k][10 * first + (int)(10 * other[k])]++;
  }
  for (int k = 0; k < 4; k++) is_even(count[k]);
}
END_TEST

/* ---- the ring ---- */

/* A step of height 2 and half-width a = pi/12 on a circle of radius r, as a Fourier series: 10
 * + 2 [a/pi + (2/pi) sum_n sin(n a)/n cos(n psi) exp(-n^2 kappa t/r^2)]. */
static double by_series(double psi, double r, double t) {
  const double a = M_PI / 12;
  double sum = a / M_PI;
  for (int n = 1; n <= 4000 && n * n * 0.01 * t / (r * r) < 50; n++)
    sum += 2 / M_PI * sin(n * a) / n * cos(n * psi) * exp(-n * n * 0.01 * t / (r * r));
  return 10 + 2 * sum;
}

/* psi counts from theta = pi. */
static double by_library(double psi, double r, double t) {
  const double x[3] = {-r * cos(psi), r * sin(psi), 0};
  return wend_ring_exact(x, t);
}

/* Two independent forms: rounding of sums of order 1; the series needs exp(-n^2 kappa t/r^2) to
 * vanish at 4000, so t >= 1e-3. */
START_TEST(the_ring_equals_its_series) {
  static const double times[] = {1e-3, 0.1, 1, 10, 50, 200, 2000};
  for (size_t k = 0; k < sizeof times / sizeof *times; k++)
    for (double r = 0.51; r < 0.7; r += 0.045)
      for (double psi = -3.1; psi < M_PI; psi += 0.2)
        ck_assert_double_eq_tol(by_library(psi, r, times[k]), by_series(psi, r, times[k]),
                                1e-12);
}
END_TEST

/* Values at r = 0.6, t = 10 that an independent program computed from the formula, to the
 * digits it printed. */
START_TEST(the_ring_has_known_values) {
  ck_assert_double_eq_tol(by_library(0, 0.6, 10), 10.549184, 5e-7);
  ck_assert_double_eq_tol(by_library(M_PI / 4, 0.6, 10), 10.322347, 5e-7);
  ck_assert_double_eq_tol(by_library(M_PI / 2, 0.6, 10), 10.065109, 5e-7);
  ck_assert_double_eq_tol(by_library(M_PI, 0.6, 10), 10.000213, 5e-7);
  /* Steady state: a twelfth of the height of 2; at r = 0.7, t = 200 still 5.6e-3 away. */
  ck_assert_double_eq_tol(by_library(1, 0.6, 1e5), 10 + 1.0 / 6, 1e-12);
  double away = 0;
  for (double psi = 0; psi < M_PI; psi += 0.01)
    away = fmax(away, fabs(by_library(psi, 0.6999999, 200) - 10 - 1.0 / 6));
  ck_assert_double_eq_tol(away, 5.6e-3, 5e-5);
}
END_TEST

START_TEST(the_ring_starts_as_a_patch) {
  ck_assert(by_library(0, 0.6, 0) == 12 && by_library(0.26, 0.6, 0) == 12);
  ck_assert(by_library(0.27, 0.6, 0) == 10 && by_library(M_PI, 0.6, 0) == 10);
  ck_assert_double_eq_tol(by_library(0.2, 0.6, 1e-6), 12, 1e-12);
  ck_assert(by_library(0, 0.49, 10) == 10 && by_library(0, 0.71, 10) == 10);
}
END_TEST

/* ---- experiments ---- */

static double two(const double x[3], const void *problem) {
  (void)x;
  (void)problem;
  return 2;
}

/* 2 less the problem's amount where x < 0. */
static double less(const double x[3], const void *problem) {
  return x[0] < 0 ? 2 - *(const double *)problem : 2;
}

/* Off by 0.5 in half of the box: L1 0.25, L2 sqrt(0.125), Linf 0.5; half of the volume within
 * the scatter of volumes at jitter 0.2, 1%. */
START_TEST(norms_are_weighted_by_volume) {
  const double low[3] = {-1, -1, 0}, high[3] = {1, 1, 0}, off = 0.5;
  const wend_lattice lattice = {{20, 20, 1}, 0.2, 9};
  wend_experiment x = {.domain = wend_scene_domain(2, low, high, true),
                       .settings = wend_settings_default()};
  ck_assert(wend_lattice_fill(&team, &x.domain, &lattice, UINT64_C(1) << WEND_ENERGY,
                              &x.particles) == WEND_OK);
  ck_assert(spread_everywhere(wend_experiment_begin(&team, &x, two, NULL) == WEND_OK));
  const wend_norms n = wend_experiment_norms(&team, &x, less, &off);
  ck_assert_double_eq_tol(n.l1, 0.25, 0.0025);
  ck_assert_double_eq_tol(n.l2 * n.l2, 0.5 * n.l1, 1e-14);
  ck_assert_double_eq_tol(n.linf, 0.5, 1e-15);
  ck_assert_double_eq_tol(n.low, 2, 1e-15);
  ck_assert_double_eq_tol(n.high, 2, 1e-15);
  ck_assert(spread_everywhere(wend_experiment_run(&team, &x, 3) == WEND_OK));
  ck_assert(x.march.time == 3);
  wend_experiment_end(&x);
}
END_TEST

/* ---- the table and verdicts ---- */

START_TEST(scenes_are_found_by_name) {
  int k = 0;
  for (; wend_scene_at(k) != NULL; k++) {
    ck_assert(wend_scene_find(wend_scene_at(k)->name) == wend_scene_at(k));
    ck_assert(strlen(wend_scene_at(k)->help) > 0 && wend_scene_at(k)->prove != NULL);
  }
  ck_assert_int_ge(k, 4);
  ck_assert(wend_scene_at(-1) == NULL);
  ck_assert(wend_scene_find("") == NULL && wend_scene_find("rin") == NULL);
}
END_TEST

START_TEST(missed_bars_are_failures) {
  wend_verdict v = {0, 0};
  wend_verdict_most(&team, &v, 1, 1, "held: %d", 1);
  wend_verdict_least(&team, &v, 1, 1, "held: %d", 2);
  ck_assert(v.held == 2 && v.missed == 0);
  ck_assert(spread_everywhere(wend_verdict_close(&team, &v, "test") == WEND_OK));
  wend_verdict_most(&team, &v, nextafter(1, 2), 1, "missed on purpose");
  wend_verdict_least(&team, &v, nextafter(1, 0), 1, "missed on purpose");
  wend_verdict_most(&team, &v, NAN, 1, "missed on purpose");
  wend_verdict_least(&team, &v, NAN, 1, "missed on purpose");
  ck_assert(v.held == 2 && v.missed == 4);
  ck_assert(spread_everywhere(wend_verdict_close(&team, &v, "test") == WEND_ERR_PROOF));
  ck_assert(strstr(team.text, "4 of 6") != NULL);
}
END_TEST

int main(int count, char **arguments) {
  MPI_Init(&count, &arguments);
  wend_team_init(&team, MPI_COMM_WORLD);
  Suite *suite = suite_create("scenes");
  TCase *tc = tcase_create("particles");
  tcase_add_loop_test(tc, lattices_do_not_depend_on_ranks, 0, SETS);
  tcase_add_loop_test(tc, particles_stand_near_their_cells, 0, SETS);
  tcase_add_test(tc, sets_are_joined);
  tcase_add_test(tc, random_numbers_are_uniform);
  tcase_add_test(tc, random_numbers_are_independent);
  suite_add_tcase(suite, tc);
  tc = tcase_create("problems");
  tcase_add_test(tc, the_ring_equals_its_series);
  tcase_add_test(tc, the_ring_has_known_values);
  tcase_add_test(tc, the_ring_starts_as_a_patch);
  tcase_add_test(tc, norms_are_weighted_by_volume);
  tcase_add_test(tc, scenes_are_found_by_name);
  tcase_add_test(tc, missed_bars_are_failures);
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
