/* SPDX-License-Identifier: GPL-3.0-or-later
 * check_geometry.c: supports, volumes, gradients and faces to the same bits on any ranks, the
 * figures of the report against the faces themselves, and errors that name the particle. */
#include "gas.h"

#include <check.h>
#include <inttypes.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static wend_team team;

static const gas_plan plans[] = {
    {2, 3, false, 20, 0.2, false, false}, {2, 3, false, 20, 1.0, false, false},
    {2, 1, true, 16, 0.5, false, false},  {2, 0, false, 16, 0.2, false, false},
    {3, 7, false, 10, 0.2, false, false}, {3, 4, true, 9, 1.0, false, false},
};
enum { PLANS = sizeof plans / sizeof plans[0] };

static const spread_way ways[] = {GAS_CUT, SPREAD_RANDOM, SPREAD_HOLE, SPREAD_LAST};
enum { WAYS = sizeof ways / sizeof ways[0] };

static wend_status build(wend_team *on, const gas_plan *plan, spread_way way, gas *g) {
  const wend_status status = gas_fill(on, plan, way, g);
  if (status != WEND_OK) return status;
  return wend_geometry_init(on, &g->domain, &g->settings, &g->particles, &g->geometry);
}

/* ---- everything about a particle in a few numbers ---- */

static uint64_t mix(uint64_t hash, uint64_t word) {
  hash = (hash ^ word) * UINT64_C(0x9e3779b97f4a7c15);
  return hash ^ hash >> 29;
}

static uint64_t mix_float(uint64_t hash, float x) {
  uint32_t bits;
  memcpy(&bits, &x, sizeof bits);
  return mix(hash, bits);
}

/* The row's neighbours by id, areas, arms and weights, in list order. */
static uint64_t row_hash(const wend_geometry *g, const uint64_t *id, int32_t i) {
  const wend_pairs *p = &g->near.pairs;
  uint64_t hash = (uint64_t)p->count[i];
  for (int32_t m = 0; m < p->count[i]; m++) {
    const int64_t k = wend_pairs_entry(p, i, m);
    hash = mix(hash, id[p->index[k]]);
    for (int d = 0; d < 3; d++) {
      hash = mix_float(hash, g->faces.area[d][k]);
      hash = mix_float(hash, g->faces.arm[d][k]);
    }
    hash = mix_float(hash, g->faces.weight[k]);
  }
  return hash;
}

enum { SUPPORT, VOLUME, SURFACE, INVERSE, PAIRS = INVERSE + 6, NUMBERS };

static uint64_t *numbers_of(wend_team *on, gas *g) {
  const wend_geometry *geometry = &g->geometry;
  const int32_t owned = geometry->near.owned;
  uint64_t *id = calloc((size_t)geometry->near.local + 1, sizeof *id);
  double(*value)[NUMBERS] = calloc((size_t)owned + 1, sizeof *value);
  for (int32_t i = 0; i < owned; i++) id[i] = g->particles.id[i];
  wend_halo_exchange(on, &g->geometry.near.halo, id, 1, 1, sizeof *id);
  for (int32_t i = 0; i < owned; i++) {
    value[i][SUPPORT] = geometry->near.place[i][3];
    value[i][VOLUME] = geometry->volume[i];
    value[i][SURFACE] = geometry->surface[i];
    memcpy(&value[i][INVERSE], geometry->inverse[i], sizeof *geometry->inverse);
    const uint64_t hash = row_hash(geometry, id, i);
    memcpy(&value[i][PAIRS], &hash, sizeof hash);
  }
  uint64_t *bits = gas_gather(on, g, NUMBERS, value[0]);
  free(id);
  free(value);
  return bits;
}

/* All but the wall-clock times. */
static bool same_report(wend_geometry_report a, wend_geometry_report b) {
  return a.particles == b.particles && a.pairs == b.pairs && a.fallbacks == b.fallbacks &&
         a.surface == b.surface && a.sweeps == b.sweeps && a.closure_raw == b.closure_raw &&
         a.closure == b.closure && a.span_mean == b.span_mean && a.span_rms == b.span_rms &&
         a.span_raw == b.span_raw && a.support_least == b.support_least &&
         a.support_most == b.support_most;
}

START_TEST(bits_do_not_depend_on_ranks) {
  wend_team self = gas_alone();
  gas alone = {.all = 0};
  ck_assert(spread_everywhere(build(&self, &plans[_i], GAS_CUT, &alone) == WEND_OK));
  uint64_t *expected = numbers_of(&self, &alone);
  for (int k = 0; k < WAYS; k++) {
    gas shared = {.all = 0};
    ck_assert(spread_everywhere(build(&team, &plans[_i], ways[k], &shared) == WEND_OK));
    uint64_t *found = numbers_of(&team, &shared);
    const size_t size = (size_t)alone.all * NUMBERS * sizeof *found;
    ck_assert(spread_everywhere(memcmp(found, expected, size) == 0));
    ck_assert(spread_everywhere(same_report(shared.geometry.report, alone.geometry.report)));
    free(found);
    gas_reset(&shared);
  }
  free(expected);
  gas_reset(&alone);
  wend_team_reset(&self);
}
END_TEST

/* ---- the report ---- */

/* Closure and span by their definitions from the finished faces, particles off the surface. */
static void by_definition(const wend_geometry *g, double *closure, double *mean, double *rms) {
  const wend_pairs *p = &g->near.pairs;
  double miss = 0, extent = 0, sum = 0, squares = 0, count = 0;
  for (int32_t i = 0; i < p->rows; i++) {
    double a[3] = {0}, size = 0, span = 0;
    if (g->surface[i]) continue;
    for (int32_t m = 0; m < p->count[i]; m++) {
      const int64_t k = wend_pairs_entry(p, i, m);
      double a2 = 0;
      for (int d = 0; d < 3; d++) {
        a[d] += g->faces.area[d][k];
        a2 += (double)g->faces.area[d][k] * g->faces.area[d][k];
        span += (double)g->faces.area[d][k] * g->faces.arm[d][k];
      }
      size += sqrt(a2);
    }
    const double share = span / (2 * g->domain.dim * g->volume[i]);
    miss += a[0] * a[0] + a[1] * a[1] + a[2] * a[2];
    extent += size * size;
    sum += share;
    squares += (share - 1) * (share - 1);
    count++;
  }
  *closure = sqrt(miss / extent);
  *mean = sum / count;
  *rms = sqrt(squares / count);
}

/* Faces were rounded to float after the figures were taken: 1e-6. The default asks for a
 * closure of 5e-4 within 32 sweeps, which all but nearly random particles reach. */
START_TEST(reports_tell_the_truth) {
  gas g = {.all = 0};
  wend_team self = gas_alone();
  ck_assert(build(&self, &plans[_i], GAS_CUT, &g) == WEND_OK);
  const wend_geometry_report *r = &g.geometry.report;
  double closure, mean, rms, least = INFINITY, most = 0;
  int64_t surface = 0, entries = 0;
  by_definition(&g.geometry, &closure, &mean, &rms);
  for (int32_t i = 0; i < g.geometry.near.owned; i++) {
    surface += g.geometry.surface[i];
    entries += g.geometry.near.count[i];
    least = fmin(least, g.geometry.near.place[i][3]);
    most = fmax(most, g.geometry.near.place[i][3]);
  }
  ck_assert_double_eq_tol(r->closure, closure, 1e-6);
  ck_assert_double_eq_tol(r->span_mean, mean, 1e-6);
  ck_assert_double_eq_tol(r->span_rms, rms, 1e-6);
  ck_assert(r->support_least == least && r->support_most == most);
  ck_assert(r->surface == surface && 2 * r->pairs == entries && r->particles == g.all);
  ck_assert_int_eq(r->fallbacks, 0);
  const bool easy =
      plans[_i].jitter < 1 && (plans[_i].periodic == 3 || plans[_i].periodic == 7);
  ck_assert(r->closure <= g.settings.closure || (!easy && r->sweeps == g.settings.sweeps));
  ck_assert_double_gt(r->closure_raw, 20 * r->closure);
  if (team.rank == 0)
    printf("%d-D, jitter %.1f: closure %.2e -> %.2e, span %.4f -> %.5f +- %.1e, %d sweeps\n",
           plans[_i].dim, plans[_i].jitter, r->closure_raw, r->closure, r->span_raw,
           r->span_mean, r->span_rms, r->sweeps);
  gas_reset(&g);
  wend_team_reset(&self);
}
END_TEST

START_TEST(settings_are_obeyed) {
  gas g = {.all = 0};
  const gas_plan *plan = &plans[0];
  ck_assert(gas_fill(&team, plan, GAS_CUT, &g) == WEND_OK);
  g.settings.close_faces = g.settings.fix_volumes = false;
  ck_assert(spread_everywhere(
      wend_geometry_init(&team, &g.domain, &g.settings, &g.particles, &g.geometry) == WEND_OK));
  ck_assert(g.geometry.report.sweeps == 0 && g.geometry.report.closure > 0.02);
  ck_assert(g.geometry.report.closure == g.geometry.report.closure_raw);
  wend_geometry_reset(&g.geometry);
  g.settings.close_faces = true;
  g.settings.sweeps = 10;
  g.settings.closure = 1e-9;
  ck_assert(spread_everywhere(
      wend_geometry_init(&team, &g.domain, &g.settings, &g.particles, &g.geometry) == WEND_OK));
  ck_assert_int_eq(g.geometry.report.sweeps, 10);
  /* Closing alone leaves the volume condition where it was, within its scatter. */
  ck_assert_double_lt(g.geometry.report.span_mean, 0.995);
  gas_reset(&g);
}
END_TEST

/* From all particles: 22 neighbours, counted with the weight 1 - q^4 over its integral in a
 * disc of radius 1, 2/3 of the disc; volumes with Wendland C2, whose peak is 7/pi. */
START_TEST(supports_hold_the_target) {
  gas g = {.all = 0};
  wend_team self = gas_alone();
  ck_assert(build(&self, &plans[1], GAS_CUT, &g) == WEND_OK);
  const double(*place)[4] = (const double(*)[4])g.geometry.near.place;
  for (int32_t i = 0; i < g.all; i += 7) {
    double count = 0, density = 0;
    for (int32_t j = 0; j < g.all; j++) {
      const double dx = remainder(place[j][0] - place[i][0], 2);
      const double dy = remainder(place[j][1] - place[i][1], 2);
      const double h = place[i][3], q = hypot(dx, dy) / h;
      if (q >= 1) continue;
      count += 1.5 * (1 - pow(q, 4));
      density += 7 / (M_PI * h * h) * pow(1 - q, 4) * (1 + 4 * q);
    }
    ck_assert_double_eq_tol(count, 22, 1e-9);
    ck_assert_double_eq_tol(g.geometry.volume[i], 1 / density, 1e-12);
  }
  gas_reset(&g);
  wend_team_reset(&self);
}
END_TEST

START_TEST(given_supports_and_volumes_are_used) {
  gas g = {.all = 0};
  ck_assert(gas_fill(&team, &plans[4], GAS_CUT, &g) == WEND_OK);
  wend_particles_add(&team, &g.particles, WEND_SUPPORT);
  wend_particles_add(&team, &g.particles, WEND_VOLUME);
  for (int32_t i = 0; i < g.particles.n; i++) {
    g.particles.column[WEND_SUPPORT][i] = 0.4 + 1e-4 * (double)g.particles.id[i];
    g.particles.column[WEND_VOLUME][i] = 0.008 + 1e-9 * (double)g.particles.id[i];
  }
  ck_assert(spread_everywhere(
      wend_geometry_init(&team, &g.domain, &g.settings, &g.particles, &g.geometry) == WEND_OK));
  bool good = true;
  for (int32_t i = 0; i < g.particles.n; i++) {
    good = good && g.geometry.near.place[i][3] == g.particles.column[WEND_SUPPORT][i];
    good = good && g.geometry.volume[i] == g.particles.column[WEND_VOLUME][i];
  }
  ck_assert(spread_everywhere(good));
  gas_reset(&g);
}
END_TEST

/* ---- errors ---- */

/* The same status and text on all ranks, and nothing left behind. */
static void fails(gas *g, wend_status expected, const char *part) {
  const wend_status status =
      wend_geometry_init(&team, &g->domain, &g->settings, &g->particles, &g->geometry);
  ck_assert(spread_everywhere(status == expected));
  ck_assert(spread_same_text(team.text));
  ck_assert_msg(strstr(team.text, part) != NULL, "\"%s\" lacks \"%s\"", team.text, part);
  ck_assert(spread_everywhere(g->geometry.volume == NULL && g->geometry.near.place == NULL));
  gas_reset(g);
}

START_TEST(supports_too_large_name_the_particle) {
  static const double bad[] = {1.0, 0, -0.3, NAN, INFINITY};
  for (size_t k = 0; k < sizeof bad / sizeof *bad; k++) {
    gas g = {.all = 0};
    ck_assert(gas_fill(&team, &plans[4], GAS_CUT, &g) == WEND_OK);
    wend_particles_add(&team, &g.particles, WEND_SUPPORT);
    for (int32_t i = 0; i < g.particles.n; i++)
      g.particles.column[WEND_SUPPORT][i] = g.particles.id[i] == 537 ? bad[k] : 0.45;
    fails(&g, WEND_ERR_GEOMETRY, "particle 537");
  }
}
END_TEST

/* A disc of half a period holds pi/4 of the 16 in a square: fewer than 22. */
START_TEST(too_few_particles_are_an_error) {
  gas_plan plan = plans[0];
  plan.side = 4;
  gas g = {.all = 0};
  ck_assert(gas_fill(&team, &plan, GAS_CUT, &g) == WEND_OK);
  fails(&g, WEND_ERR_GEOMETRY, "particle ");
  /* In an open box, where supports may be as wide as one likes, each counts 1.5 at most. */
  plan.periodic = 0;
  plan.side = 3;
  ck_assert(gas_fill(&team, &plan, GAS_CUT, &g) == WEND_OK);
  fails(&g, WEND_ERR_GEOMETRY, "neighbours");
}
END_TEST

START_TEST(unknown_kernels_are_an_error) {
  gas g = {.all = 0};
  ck_assert(gas_fill(&team, &plans[0], GAS_CUT, &g) == WEND_OK);
  g.settings.smoothing = "boxcar";
  fails(&g, WEND_ERR_ARGUMENT, "\"boxcar\"");
}
END_TEST

START_TEST(failing_allocations_reach_all_ranks) {
  int failed = 0;
  for (int number = 0;; number++) {
    gas g = {.all = 0};
    ck_assert(gas_fill(&team, &plans[3], GAS_CUT, &g) == WEND_OK);
    team.allocate = spread_allocate;
    if (team.rank == team.size - 1) spread_break(number);
    const wend_status status =
        wend_geometry_init(&team, &g.domain, &g.settings, &g.particles, &g.geometry);
    spread_break(-1);
    team.allocate = calloc;
    ck_assert(spread_everywhere(status == WEND_OK ||
                                (g.geometry.volume == NULL && g.geometry.near.place == NULL)));
    gas_reset(&g);
    ck_assert(spread_everywhere(status == WEND_OK || status == WEND_ERR_MEMORY));
    if (spread_everywhere(status == WEND_OK)) break;
    ck_assert(spread_everywhere(status == WEND_ERR_MEMORY));
    failed++;
  }
  ck_assert_int_gt(failed, 20);
}
END_TEST

int main(int count, char **arguments) {
  MPI_Init(&count, &arguments);
  wend_team_init(&team, MPI_COMM_WORLD);
  Suite *suite = suite_create("geometry");
  TCase *tc = tcase_create("geometry");
  tcase_add_loop_test(tc, bits_do_not_depend_on_ranks, 0, PLANS);
  tcase_add_loop_test(tc, reports_tell_the_truth, 0, PLANS);
  tcase_add_test(tc, settings_are_obeyed);
  tcase_add_test(tc, supports_hold_the_target);
  tcase_add_test(tc, given_supports_and_volumes_are_used);
  suite_add_tcase(suite, tc);
  tc = tcase_create("errors");
  tcase_add_test(tc, supports_too_large_name_the_particle);
  tcase_add_test(tc, too_few_particles_are_an_error);
  tcase_add_test(tc, unknown_kernels_are_an_error);
  tcase_add_test(tc, failing_allocations_reach_all_ranks);
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
