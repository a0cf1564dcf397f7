/* SPDX-License-Identifier: GPL-3.0-or-later
 * check_transport.c: the rate of change to the same bits on any ranks, its total, its bounds
 * and its physics; fields of any size, no field, and errors that name the particle. */
#include "gas.h"
#include "total.h"

#include <check.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

static wend_team team;

static const gas_plan plans[] = {
    {2, 3, false, 20, 0.2, false, false}, {2, 3, false, 18, 1.0, true, false},
    {2, 1, true, 16, 0.5, false, false},  {2, 0, true, 16, 0.2, true, false},
    {2, 0, false, 16, 0.3, false, false}, {2, 3, false, 16, 0.3, false, true},
    {3, 7, false, 9, 0.2, false, false},  {3, 4, true, 8, 1.0, true, false},
    {3, 0, true, 8, 0.2, false, false},
};
enum { PLANS = sizeof plans / sizeof plans[0] };

static const spread_way ways[] = {GAS_CUT, SPREAD_RANDOM, SPREAD_HOLE, SPREAD_LAST};
enum { WAYS = sizeof ways / sizeof ways[0] };

/* Rate and escape [owned] of a state; to be freed. */
typedef struct flow {
  double *rate, *escaped;
} flow;

static flow flow_of(wend_team *on, gas *g, gas_state state) {
  const size_t n = (size_t)g->particles.n + 1;
  flow f = {calloc(n, sizeof *f.rate), calloc(n, sizeof *f.escaped)};
  gas_energise(g, state);
  const wend_status status = wend_transport_rate(
      on, &g->transport, g->particles.column[WEND_ENERGY], f.rate, f.escaped);
  ck_assert(status == WEND_OK);
  return f;
}

static void flow_free(flow *f) {
  free(f->rate);
  free(f->escaped);
}

static wend_settings settings_of(bool limited) {
  wend_settings s = wend_settings_default();
  s.limited = limited;
  s.sweeps = 12;
  return s;
}

/* Linear exchange, limited exchange, and that with streaming, which needs kappa_perp = 0. */
enum { LINEAR, LIMITED, STREAMING, MODES };

static bool possible(const gas_plan *plan, int mode) {
  return mode != STREAMING || (!plan->across && !plan->unmagnetised);
}

static wend_settings settings_for(int mode) {
  wend_settings s = settings_of(mode != LINEAR);
  s.streaming_supports = mode == STREAMING ? 5 : 0;
  return s;
}

/* ---- the same bits ---- */

static bool same_column(wend_team *self, const gas *alone, const double *expected,
                        const gas *shared, const double *found) {
  uint64_t *a = gas_gather(self, alone, 1, expected), *b = gas_gather(&team, shared, 1, found);
  const bool same = memcmp(a, b, (size_t)alone->all * sizeof *a) == 0;
  free(a);
  free(b);
  return same;
}

static void same_flows(wend_team *self, gas *alone, gas *shared) {
  for (int state = 0; state < GAS_STATES; state++) {
    flow expected = flow_of(self, alone, (gas_state)state);
    flow found = flow_of(&team, shared, (gas_state)state);
    const double share = wend_transport_limited_share(self, &alone->transport);
    ck_assert(
        spread_everywhere(same_column(self, alone, expected.rate, shared, found.rate) &&
                          same_column(self, alone, expected.escaped, shared, found.escaped)));
    if (alone->transport.streams)
      ck_assert(spread_everywhere(
          same_column(self, alone, alone->transport.heat, shared, shared->transport.heat)));
    ck_assert(
        spread_everywhere(wend_transport_limited_share(&team, &shared->transport) == share));
    flow_free(&expected);
    flow_free(&found);
  }
}

START_TEST(bits_do_not_depend_on_ranks) {
  wend_team self = gas_alone();
  for (int mode = 0; mode < MODES; mode++) {
    if (!possible(&plans[_i], mode)) continue;
    const wend_settings settings = settings_for(mode);
    gas alone = {.all = 0};
    ck_assert(gas_build(&self, &plans[_i], GAS_CUT, &settings, &alone) == WEND_OK);
    for (int k = 0; k < WAYS; k++) {
      gas shared = {.all = 0};
      ck_assert(spread_everywhere(gas_build(&team, &plans[_i], ways[k], &settings, &shared) ==
                                  WEND_OK));
      ck_assert(
          spread_everywhere(shared.transport.explicit_step == alone.transport.explicit_step));
      ck_assert(shared.transport.along == (!plans[_i].across && !plans[_i].unmagnetised));
      same_flows(&self, &alone, &shared);
      gas_reset(&shared);
    }
    gas_reset(&alone);
  }
  wend_team_reset(&self);
}
END_TEST

/* ---- totals and bounds ---- */

/* What leaves and what heats is booked, the rest only moves: rounding of the rows' sums, 1e-15
 * of what moves. */
static void keeps_total(gas *g, const gas_plan *plan, gas_state state) {
  flow f = flow_of(&team, g, state);
  const int32_t n = g->particles.n;
  const double *heat = g->transport.heat;
  const double gone = wend_total_of(&team, n, f.escaped);
  const double warmed = g->transport.streams ? wend_total_of(&team, n, heat) : 0;
  for (int32_t i = 0; i < n; i++) f.rate[i] += f.escaped[i] + (heat != NULL ? heat[i] : 0);
  const double total = wend_total_of(&team, n, f.rate);
  for (int32_t i = 0; i < n; i++) f.rate[i] = fabs(f.rate[i]);
  const double moved = wend_total_of(&team, n, f.rate);
  ck_assert(spread_everywhere(fabs(total) <= 1e-15 * moved + 1e-16 * (gone + warmed)));
  ck_assert(spread_everywhere(plan->open == (gone > 0)));
  ck_assert(spread_everywhere(warmed >= 0));
  /* e = E / V is the same everywhere but for its rounding. */
  gas_energise(g, GAS_CONSTANT);
  const double still = wend_total_of(&team, n, g->particles.column[WEND_ENERGY]) * 1e-15 /
                       g->transport.explicit_step;
  ck_assert(spread_everywhere((state == GAS_CONSTANT) == (moved <= still)));
  if (g->transport.streams)
    ck_assert(spread_everywhere((state == GAS_CONSTANT) == (warmed <= still)));
  flow_free(&f);
}

START_TEST(totals_are_kept) {
  for (int mode = LIMITED; mode < MODES; mode++) {
    if (!possible(&plans[_i], mode)) continue;
    const wend_settings settings = settings_for(mode);
    gas g = {.all = 0};
    ck_assert(gas_build(&team, &plans[_i], GAS_CUT, &settings, &g) == WEND_OK);
    for (int state = 0; state < GAS_STATES; state++)
      keeps_total(&g, &plans[_i], (gas_state)state);
    gas_reset(&g);
  }
}
END_TEST

/* Forward Euler at the explicit step: no energy below 0, none above the largest; 1e-13 of it
 * for sums of 100 terms. Escape and heat may lower the least value. */
static void keeps_bounds(gas *g, bool lowered, gas_state state) {
  double range[4] = {-INFINITY, -INFINITY, -INFINITY, -INFINITY};
  flow f = flow_of(&team, g, state);
  for (int32_t i = 0; i < g->particles.n; i++) {
    const double e = g->particles.column[WEND_ENERGY][i] / g->geometry.volume[i];
    const double next = e + g->transport.explicit_step * f.rate[i] / g->geometry.volume[i];
    range[0] = fmax(range[0], -e);
    range[1] = fmax(range[1], e);
    range[2] = fmax(range[2], -next);
    range[3] = fmax(range[3], next);
  }
  wend_team_max(&team, 4, range);
  const double give = 1e-13 * range[1];
  ck_assert(range[3] <= range[1] + give);
  ck_assert(range[2] <= (lowered ? 0 : range[0]) + give);
  flow_free(&f);
}

START_TEST(explicit_steps_keep_bounds) {
  for (int mode = LIMITED; mode < MODES; mode++) {
    if (!possible(&plans[_i], mode)) continue;
    const wend_settings settings = settings_for(mode);
    gas g = {.all = 0};
    ck_assert(gas_build(&team, &plans[_i], GAS_CUT, &settings, &g) == WEND_OK);
    for (int state = 0; state < GAS_STATES; state++)
      keeps_bounds(&g, plans[_i].open || mode == STREAMING, (gas_state)state);
    gas_reset(&g);
  }
}
END_TEST

/* ---- physics ---- */

/* Replaces the field and the coefficients by uniform ones, and builds. */
static void uniform(gas *g, const gas_plan *plan, const double b[3], double par, double perp,
                    const wend_settings *settings) {
  memset(g, 0, sizeof *g);
  ck_assert(gas_fill(&team, plan, GAS_CUT, g) == WEND_OK);
  for (int32_t i = 0; i < g->particles.n; i++) {
    for (int a = 0; a < 3; a++) g->particles.column[WEND_BX + a][i] = b[a];
    g->particles.column[WEND_KPAR][i] = par;
    g->particles.column[WEND_KPERP][i] = perp;
  }
  g->settings = *settings;
  const bool built = wend_geometry_init(&team, &g->domain, &g->settings, &g->particles,
                                        &g->geometry) == WEND_OK &&
                     wend_transport_init(&team, &g->settings, &g->particles, &g->geometry,
                                         &g->transport) == WEND_OK;
  ck_assert(spread_everywhere(built));
}

/* Decay rate of cos(pi x) over the exact one, pi^2 [kappa_par b_x^2 + kappa_perp (1 - b_x^2)].
 */
static double decay(gas *g, double exact) {
  const wend_particles *p = &g->particles;
  double *term = calloc((size_t)p->n + 1, sizeof *term);
  double *rate = calloc((size_t)p->n + 1, sizeof *rate);
  double *escaped = calloc((size_t)p->n + 1, sizeof *escaped);
  for (int32_t i = 0; i < p->n; i++)
    p->column[WEND_ENERGY][i] = g->geometry.volume[i] * (2 + cos(M_PI * p->column[WEND_X][i]));
  wend_transport_rate(&team, &g->transport, p->column[WEND_ENERGY], rate, escaped);
  for (int32_t i = 0; i < p->n; i++) term[i] = rate[i] * cos(M_PI * p->column[WEND_X][i]);
  const double ours = wend_total_of(&team, p->n, term);
  for (int32_t i = 0; i < p->n; i++)
    term[i] = g->geometry.volume[i] * pow(cos(M_PI * p->column[WEND_X][i]), 2);
  const double mode = wend_total_of(&team, p->n, term);
  free(term);
  free(rate);
  free(escaped);
  return -ours / mode / (M_PI * M_PI * exact);
}

/* Plain fluxes are of second order in the support: 2% at 32 a wavelength, and a quarter of the
 * error at 64. Sharpened ones reach 1% and 0.3%: 0.25% are promised for the mean of many sets.
 */
START_TEST(modes_decay_as_they_should) {
  static const struct {
    double b[3], par, perp, exact;
  } cases[] = {
      {{3, 4, 0}, 0.5, 0, 0.5 * 0.36},
      {{3, 4, 0}, 0.5, 0.2, 0.5 * 0.36 + 0.2 * 0.64},
      {{0, 2, 0}, 0.5, 0.2, 0.2},
      {{0, 0, 0}, 0.5, 0.2, 0.3}, /* (kappa_par + 2 kappa_perp) / 3 */
      {{0, 0, 0}, 0.9, 0, 0.3},
  };
  double off[2][2];
  for (int sharp = 0; sharp < 2; sharp++)
    for (int k = 0; k < 2; k++) {
      const gas_plan plan = {2, 3, false, 32 << k, 0.2, false, false};
      wend_settings s = wend_settings_default();
      s.limited = false;
      s.sharpen = sharp;
      gas g;
      uniform(&g, &plan, cases[_i].b, cases[_i].par, cases[_i].perp, &s);
      off[sharp][k] = fabs(decay(&g, cases[_i].exact) - 1);
      gas_reset(&g);
    }
  ck_assert(spread_everywhere(off[0][0] < 0.02 && off[0][1] < 0.35 * off[0][0]));
  ck_assert(spread_everywhere(off[1][0] < 0.01 && off[1][1] < 0.003));
}
END_TEST

/* A mode across the field must not move: 1e-4 of what it would along it. */
START_TEST(modes_across_stand_still) {
  const gas_plan plan = {2, 3, false, 32, 0.2, false, false};
  const wend_settings s = settings_of(false);
  gas g;
  uniform(&g, &plan, (double[3]){0, 1, 0}, 0.5, 0, &s);
  const double found = decay(&g, 0.5);
  ck_assert(spread_everywhere(fabs(found) < 1e-4));
  gas_reset(&g);
}
END_TEST

static double *rate_of(gas *g) {
  flow f = flow_of(&team, g, GAS_JUMPS);
  free(f.escaped);
  return f.rate;
}

static bool same_rates(gas *a, gas *b) {
  double *ra = rate_of(a), *rb = rate_of(b);
  bool same = a->particles.n == b->particles.n;
  for (int32_t i = 0; i < a->particles.n && same; i++) same = ra[i] == rb[i];
  free(ra);
  free(rb);
  return spread_everywhere(same);
}

/* Without a field only the isotropic mean counts, or nothing moves. */
START_TEST(no_field_is_isotropic_or_nothing) {
  const gas_plan plan = {3, 7, false, 8, 0.3, false, false};
  wend_settings s = settings_of(false);
  gas one, other;
  uniform(&one, &plan, (double[3]){0, 0, 0}, 0.75, 0.375, &s);
  uniform(&other, &plan, (double[3]){0, 0, 0}, 0.5, 0.5, &s);
  ck_assert(same_rates(&one, &other));
  gas_reset(&one);
  gas_reset(&other);
  s.isotropic_unmagnetised = false;
  uniform(&one, &plan, (double[3]){0, 0, 0}, 0.75, 0.375, &s);
  double *rate = rate_of(&one);
  bool still = one.transport.explicit_step == INFINITY;
  for (int32_t i = 0; i < one.particles.n; i++) still = still && rate[i] == 0;
  ck_assert(spread_everywhere(still));
  free(rate);
  gas_reset(&one);
}
END_TEST

/* Only the direction of B counts, from the smallest numbers to the largest; powers of two
 * change no bit. A single subnormal component still is a direction. */
START_TEST(any_strength_of_field_will_do) {
  const gas_plan plan = {3, 7, false, 8, 0.3, false, false};
  const wend_settings s = settings_of(false);
  gas unit, other;
  uniform(&unit, &plan, (double[3]){1, -2, 0.5}, 0.5, 0.1, &s);
  static const double factor[] = {0x1p-1000, 0x1p-500, 0x1p600, 0x1p1020};
  for (size_t k = 0; k < sizeof factor / sizeof *factor; k++) {
    const double f = factor[k];
    uniform(&other, &plan, (double[3]){f, -2 * f, 0.5 * f}, 0.5, 0.1, &s);
    ck_assert(same_rates(&unit, &other));
    gas_reset(&other);
  }
  gas_reset(&unit);
  uniform(&unit, &plan, (double[3]){0, 1, 0}, 0.5, 0, &s);
  uniform(&other, &plan, (double[3]){0, 0x1p-1074, 0}, 0.5, 0, &s);
  ck_assert(same_rates(&unit, &other));
  gas_reset(&unit);
  gas_reset(&other);
}
END_TEST

START_TEST(absent_columns_are_zero) {
  const wend_settings s = settings_of(false);
  gas with, without = {.all = 0};
  uniform(&with, &plans[0], (double[3]){1, 1, 0}, 0.5, 0, &s);
  ck_assert(gas_fill(&team, &plans[0], GAS_CUT, &without) == WEND_OK);
  without.settings = s;
  static const wend_column absent[] = {WEND_BZ, WEND_KPERP};
  for (int k = 0; k < 2; k++) {
    free(without.particles.column[absent[k]]);
    without.particles.column[absent[k]] = NULL;
  }
  for (int32_t i = 0; i < without.particles.n; i++) {
    without.particles.column[WEND_BX][i] = without.particles.column[WEND_BY][i] = 1;
    without.particles.column[WEND_KPAR][i] = 0.5;
  }
  ck_assert(wend_geometry_init(&team, &without.domain, &without.settings, &without.particles,
                               &without.geometry) == WEND_OK);
  ck_assert(wend_transport_init(&team, &without.settings, &without.particles, &without.geometry,
                                &without.transport) == WEND_OK);
  ck_assert(same_rates(&with, &without));
  gas_reset(&with);
  gas_reset(&without);
}
END_TEST

/* ---- errors ---- */

START_TEST(bad_coefficients_name_the_particle) {
  static const struct {
    wend_column column;
    double value;
  } bad[] = {{WEND_KPAR, -1},        {WEND_KPAR, NAN}, {WEND_KPERP, -1e-300},
             {WEND_KPERP, INFINITY}, {WEND_BX, NAN},   {WEND_BY, INFINITY}};
  for (size_t k = 0; k < sizeof bad / sizeof *bad; k++) {
    gas g = {.all = 0};
    ck_assert(gas_fill(&team, &plans[1], GAS_CUT, &g) == WEND_OK);
    for (int32_t i = 0; i < g.particles.n; i++)
      if (g.particles.id[i] == 123) g.particles.column[bad[k].column][i] = bad[k].value;
    ck_assert(wend_geometry_init(&team, &g.domain, &g.settings, &g.particles, &g.geometry) ==
              WEND_OK);
    const wend_status status =
        wend_transport_init(&team, &g.settings, &g.particles, &g.geometry, &g.transport);
    ck_assert(spread_everywhere(status == WEND_ERR_PARTICLES));
    ck_assert(spread_same_text(team.text));
    ck_assert_msg(strstr(team.text, "particle 123:") != NULL, "%s", team.text);
    gas_reset(&g);
  }
}
END_TEST

/* While the operator is built a failure reaches all ranks; a rate allocates nothing. */
START_TEST(failing_allocations_reach_all_ranks) {
  const wend_settings settings = settings_of(true);
  const gas_plan *plan = &plans[_i == 0 ? 2 : 3];
  wend_status status = WEND_ERR_MEMORY;
  int number = 0;
  for (; status == WEND_ERR_MEMORY; number++) {
    gas g = {.settings = settings};
    ck_assert(gas_fill(&team, plan, SPREAD_RANDOM, &g) == WEND_OK);
    ck_assert(wend_geometry_init(&team, &g.domain, &g.settings, &g.particles, &g.geometry) ==
              WEND_OK);
    team.allocate = spread_allocate;
    if (team.rank == team.size - 1) spread_break(number);
    status = wend_transport_init(&team, &g.settings, &g.particles, &g.geometry, &g.transport);
    spread_break(-1);
    ck_assert(spread_everywhere(status == WEND_OK) ||
              spread_everywhere(status == WEND_ERR_MEMORY && g.transport.state == NULL));
    if (status == WEND_OK) {
      spread_break(0);
      flow f = flow_of(&team, &g, GAS_SMOOTH);
      spread_break(-1);
      flow_free(&f);
    }
    team.allocate = calloc;
    gas_reset(&g);
  }
  ck_assert_int_gt(number, 8);
}
END_TEST

int main(int count, char **arguments) {
  MPI_Init(&count, &arguments);
  wend_team_init(&team, MPI_COMM_WORLD);
  Suite *suite = suite_create("transport");
  TCase *tc = tcase_create("rate");
  tcase_add_loop_test(tc, bits_do_not_depend_on_ranks, 0, PLANS);
  tcase_add_loop_test(tc, totals_are_kept, 0, PLANS);
  tcase_add_loop_test(tc, explicit_steps_keep_bounds, 0, PLANS);
  suite_add_tcase(suite, tc);
  tc = tcase_create("physics");
  tcase_add_loop_test(tc, modes_decay_as_they_should, 0, 5);
  tcase_add_test(tc, modes_across_stand_still);
  tcase_add_test(tc, no_field_is_isotropic_or_nothing);
  tcase_add_test(tc, any_strength_of_field_will_do);
  tcase_add_test(tc, absent_columns_are_zero);
  suite_add_tcase(suite, tc);
  tc = tcase_create("errors");
  tcase_add_test(tc, bad_coefficients_name_the_particle);
  tcase_add_loop_test(tc, failing_allocations_reach_all_ranks, 0, 2);
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
