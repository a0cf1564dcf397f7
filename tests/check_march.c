/* SPDX-License-Identifier: GPL-3.0-or-later
 * check_march.c: super-steps against GSL's integrator on the same semi-discrete equations;
 * bounds, books, constants, exact times, and the same bits on any ranks. */
#include "gas.h"
#include "march.h"
#include "total.h"

#include <check.h>
#include <gsl/gsl_errno.h>
#include <gsl/gsl_odeiv2.h>
#include <gsl/gsl_sf_gegenbauer.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static wend_team team;

/* 144 particles each. */
static const gas_plan closed = {2, 3, false, 12, 0.2, false, false};
static const gas_plan across = {2, 3, false, 12, 0.2, true, false};
static const gas_plan open_gas = {2, 1, true, 12, 0.2, true, false};
static const gas_plan open_flow = {2, 1, true, 12, 0.2, false, false};

/* ---- a march from a state ---- */

typedef struct run {
  gas g;
  wend_march march;
} run;

/* In the caller's storage: transport and march point into it. */
static void run_begin(run *r, wend_team *on, const gas_plan *plan, spread_way way,
                      const wend_settings *settings, gas_state state) {
  memset(r, 0, sizeof *r);
  ck_assert(gas_build(on, plan, way, settings, &r->g) == WEND_OK);
  gas_energise(&r->g, state);
}

static wend_status run_to(wend_team *on, run *r, double until) {
  wend_status status = WEND_OK;
  if (r->march.family == NULL)
    status = wend_march_init(on, &r->g.settings, &r->g.transport,
                             r->g.particles.column[WEND_ENERGY], 0, &r->march);
  while (status == WEND_OK && r->march.time < until)
    status = wend_march_step(on, &r->march, until);
  return status;
}

static void run_end(run *r) {
  wend_march_reset(&r->march);
  gas_reset(&r->g);
}

/* ---- GSL's answer: energies by id, and what escaped ---- */

typedef struct answer {
  int32_t n;
  double *energy, escaped;
} answer;

typedef struct system_of {
  wend_team *on;
  gas *g;
} system_of;

static int right_hand_side(double t, const double y[], double dydt[], void *parameters) {
  const system_of *s = parameters;
  (void)t;
  /* Where nothing is open the library writes no escape. */
  memset(dydt + s->g->all, 0, (size_t)s->g->all * sizeof *dydt);
  const wend_status status =
      wend_transport_rate(s->on, &s->g->transport, y, dydt, dydt + s->g->all);
  return status == WEND_OK ? GSL_SUCCESS : GSL_FAILURE;
}

/* Fehlberg 4(5), to 1e-8 of the largest energy a step, on the first rank alone: kinks of the
 * limiter make higher orders dearer, and Prince-Dormand 8 and Cash-Karp give the same digits.
 */
static bool integrate(gas *g, wend_team *self, double until, answer *a) {
  const size_t n = (size_t)g->all;
  double *y = calloc(2 * n, sizeof *y), largest = 0, t = 0;
  system_of s = {self, g};
  gsl_odeiv2_system system = {right_hand_side, NULL, 2 * n, &s};
  for (size_t i = 0; i < n; i++) {
    y[i] = g->particles.column[WEND_ENERGY][i];
    largest = fmax(largest, y[i]);
  }
  gsl_odeiv2_driver *driver = gsl_odeiv2_driver_alloc_y_new(
      &system, gsl_odeiv2_step_rkf45, g->transport.explicit_step, 1e-8 * largest, 0);
  const bool good = gsl_odeiv2_driver_apply(driver, &t, until, y) == GSL_SUCCESS;
  gsl_odeiv2_driver_free(driver);
  for (size_t i = 0; i < n; i++) {
    a->energy[g->particles.id[i] - 1] = y[i];
    a->escaped += y[n + i];
  }
  free(y);
  return good;
}

static answer answer_of(const gas_plan *plan, const wend_settings *settings, gas_state state,
                        double until) {
  answer a = {.n = plan->side * plan->side};
  a.energy = calloc((size_t)a.n, sizeof *a.energy);
  bool good = true;
  if (team.rank == 0) {
    wend_team self = gas_alone();
    run r;
    run_begin(&r, &self, plan, GAS_CUT, settings, state);
    good = integrate(&r.g, &self, until, &a);
    run_end(&r);
    wend_team_reset(&self);
  }
  ck_assert(spread_everywhere(good));
  MPI_Bcast(a.energy, a.n, MPI_DOUBLE, 0, team.comm);
  MPI_Bcast(&a.escaped, 1, MPI_DOUBLE, 0, team.comm);
  return a;
}

/* sum |E - E_GSL| / sum E_GSL. */
static double distance(const run *r, const answer *a) {
  uint64_t *bits = gas_gather(&team, &r->g, 1, r->g.particles.column[WEND_ENERGY]);
  double sum = 0, all = 0;
  for (int32_t i = 0; i < a->n; i++) {
    double e;
    memcpy(&e, &bits[i], sizeof e);
    sum += fabs(e - a->energy[i]);
    all += a->energy[i];
  }
  free(bits);
  return sum / all;
}

/* The forward-Euler limit of a plan. */
static double explicit_step_of(const gas_plan *plan, const wend_settings *settings) {
  run r;
  run_begin(&r, &team, plan, GAS_CUT, settings, GAS_SMOOTH);
  const double step = r.g.transport.explicit_step;
  run_end(&r);
  return step;
}

/* Without a limiter also without sharpening, which fades where fluxes jump: a linear operator.
 */
static wend_settings settings_of(bool limited) {
  wend_settings s = wend_settings_default();
  s.limited = s.sharpen = limited;
  s.closure = 1e-2;
  return s;
}

/* ---- accuracy ---- */

static wend_settings streaming(wend_settings s, bool on) {
  s.streaming_supports = on ? 5 : 0;
  return s;
}

/* The constant of the local error, 1/6 less the third coefficient of R = a + b P(1 + w z),
 * where b w P' = b w^2 P'' = 1 at 1; derivatives of Gegenbauer's polynomials of index l (1/2
 * are Legendre's) are 2 l times those of index l + 1 and degree s - 1. */
static double error_constant(double l, int s) {
  const double d1 = 2 * l * gsl_sf_gegenpoly_n(s - 1, l + 1, 1);
  const double d2 = 4 * l * (l + 1) * gsl_sf_gegenpoly_n(s - 2, l + 2, 1);
  const double d3 = 8 * l * (l + 1) * (l + 2) * gsl_sf_gegenpoly_n(s - 3, l + 3, 1);
  return (1 - d1 * d3 / (d2 * d2)) / 6;
}

/* The linear operator, fixed super-steps of 8, 4 and 2 explicit ones: halving them divides the
 * error by 4, times what the constant changes with the number of stages: 7, 5 and 3. */
START_TEST(super_steps_are_of_second_order) {
  wend_settings s = settings_of(false);
  const double index = _i % 2 == 0 ? 1.5 : 0.5;
  s.supertime = _i % 2 == 0 ? "rkg2" : "rkl2";
  const gas_plan *plan = _i / 2 == 0 ? &closed : &across;
  const double unit = explicit_step_of(plan, &s), until = 64 * unit;
  answer a = answer_of(plan, &s, GAS_SMOOTH, until);
  double error[3], reduced[3];
  for (int k = 0; k < 3; k++) {
    run r;
    s.fixed_step = unit * (8 >> k);
    run_begin(&r, &team, plan, GAS_CUT, &s, GAS_SMOOTH);
    ck_assert(spread_everywhere(run_to(&team, &r, until) == WEND_OK));
    ck_assert_int_eq(r.march.steps, 8 << k);
    ck_assert_int_eq(r.march.last.stages, 7 - 2 * k);
    error[k] = distance(&r, &a);
    reduced[k] = error[k] / error_constant(index, r.march.last.stages);
    run_end(&r);
  }
  const double order[2] = {log2(reduced[0] / reduced[1]), log2(reduced[1] / reduced[2])};
  if (team.rank == 0)
    printf("%s: errors %.1e %.1e %.1e in 8, 16, 32 super-steps: orders %.2f %.2f\n",
           s.supertime, error[0], error[1], error[2], order[0], order[1]);
  ck_assert_double_eq_tol(order[0], 2, 0.35);
  ck_assert_double_eq_tol(order[1], 2, 0.15);
  ck_assert_double_lt(error[2], 1e-4);
  free(a.energy);
}
END_TEST

static const struct {
  const gas_plan *plan;
  bool limited;
  gas_state state;
  bool streams;
} cases[] = {
    {&closed, false, GAS_SMOOTH, false},  {&closed, true, GAS_SMOOTH, false},
    {&across, true, GAS_SMOOTH, false},   {&closed, true, GAS_JUMPS, false},
    {&open_gas, true, GAS_SMOOTH, false}, {&open_gas, true, GAS_JUMPS, false},
    {&across, true, GAS_DECADES, false},  {&closed, true, GAS_SMOOTH, true},
    {&open_flow, true, GAS_JUMPS, true},
};
enum { CASES = sizeof cases / sizeof cases[0] };

/* Euler steps of a half and a quarter of the explicit one: with the limiter, too, the error
 * goes down with them. */
START_TEST(euler_steps_are_of_first_order) {
  wend_settings s = streaming(settings_of(cases[_i].limited), cases[_i].streams);
  const double unit = explicit_step_of(cases[_i].plan, &s), until = 16 * unit;
  answer a = answer_of(cases[_i].plan, &s, cases[_i].state, until);
  double error[2];
  for (int k = 0; k < 2; k++) {
    run r;
    s.fixed_step = unit * 0.5 / (1 << k);
    run_begin(&r, &team, cases[_i].plan, GAS_CUT, &s, cases[_i].state);
    ck_assert(spread_everywhere(run_to(&team, &r, until) == WEND_OK));
    ck_assert_int_eq(r.march.stages, 32 << k);
    error[k] = distance(&r, &a);
    run_end(&r);
  }
  if (team.rank == 0)
    printf("case %d: errors %.1e %.1e in 32, 64 Euler steps\n", _i, error[0], error[1]);
  ck_assert_double_eq_tol(log2(error[0] / error[1]), 1, 0.2);
  free(a.energy);
}
END_TEST

/* Super-steps of case k with these settings to a time; returns their number. */
static int64_t measure(int k, const wend_settings *s, double until, const answer *a,
                       double *error) {
  run r;
  run_begin(&r, &team, cases[k].plan, GAS_CUT, s, cases[k].state);
  ck_assert(spread_everywhere(run_to(&team, &r, until) == WEND_OK));
  const int64_t steps = r.march.steps;
  *error = distance(&r, a);
  run_end(&r);
  return steps;
}

/* Each super-step adds about the tolerance at most. Accuracy asks for none shorter than the
 * shortest super-step, 2.2 explicit ones: what fixed steps of that length leave stays, within a
 * fifth, and is about what Euler leaves at the explicit step. */
START_TEST(errors_fall_with_the_tolerance) {
  wend_settings s = streaming(settings_of(cases[_i].limited), cases[_i].streams);
  const double unit = explicit_step_of(cases[_i].plan, &s), until = 40 * unit;
  answer a = answer_of(cases[_i].plan, &s, cases[_i].state, until);
  double error[3], rest, euler;
  int64_t steps[3];
  s.fixed_step = s.margin * wend_supertime_find(s.supertime)->reach(3) * unit;
  measure(_i, &s, until, &a, &rest);
  s.fixed_step = s.margin * unit;
  measure(_i, &s, until, &a, &euler);
  ck_assert_double_lt(rest, 1.5 * euler);
  s.fixed_step = 0;
  for (int k = 0; k < 3; k++) {
    s.tolerance = 1e-2 * pow(0.01, k);
    steps[k] = measure(_i, &s, until, &a, &error[k]);
    ck_assert_double_le(error[k], (double)steps[k] * s.tolerance + 1.2 * rest);
  }
  if (team.rank == 0)
    printf("case %d: errors %.1e %.1e %.1e in %d, %d, %d super-steps; %.1e in the shortest\n",
           _i, error[0], error[1], error[2], (int)steps[0], (int)steps[1], (int)steps[2], rest);
  ck_assert_double_lt(error[1], fmax(error[0] / 2, 1.2 * rest));
  ck_assert(steps[0] < steps[1] && steps[1] <= steps[2]);
  free(a.energy);
}
END_TEST

/* ---- bounds and books ---- */

/* Whatever the length of steps: nothing beyond the range at the start, to 1e-13 of the largest.
 */
START_TEST(bounds_are_kept) {
  const gas_plan *plans[5] = {&closed, &across, &open_gas, &closed, &open_flow};
  const int which = _i / GAS_STATES;
  wend_settings s = streaming(settings_of(true), which >= 3);
  s.tolerance = 1;
  s.first_step = 1e9;
  run r;
  run_begin(&r, &team, plans[which], GAS_CUT, &s, (gas_state)(_i % GAS_STATES));
  const double until = 150 * r.g.transport.explicit_step;
  ck_assert(spread_everywhere(run_to(&team, &r, 1e-3 * until) == WEND_OK));
  const double low = r.march.low, high = r.march.high, give = 1e-13 * high;
  ck_assert(spread_everywhere(run_to(&team, &r, until) == WEND_OK));
  ck_assert(r.march.seen_high <= high + give);
  const bool lowered = plans[which]->open || which >= 3;
  ck_assert(r.march.seen_low >= (lowered ? 0 : fmax(0, low - give)));
  bool good = true;
  for (int32_t i = 0; i < r.g.particles.n; i++) {
    const double e = r.g.particles.column[WEND_ENERGY][i] / r.g.geometry.volume[i];
    good = good && e >= 0 && e <= high + give && e >= r.march.seen_low;
  }
  ck_assert(spread_everywhere(good));
  ck_assert_double_le(wend_ledger_relative(&r.march.ledger), 1e-15);
  run_end(&r);
}
END_TEST

/* What is missing went out or into heat, by 1e-16 a super-step of all energy; nothing leaves a
 * closed box; and as much leaves an open one as GSL says. */
START_TEST(books_close) {
  const gas_plan *plans[4] = {&closed, &open_gas, &closed, &open_flow};
  const bool streams = _i >= 2;
  const wend_settings s = streaming(settings_of(true), streams);
  const double until = 60 * explicit_step_of(plans[_i], &s);
  answer a = answer_of(plans[_i], &s, GAS_SMOOTH, until);
  run r;
  run_begin(&r, &team, plans[_i], GAS_CUT, &s, GAS_SMOOTH);
  ck_assert(spread_everywhere(run_to(&team, &r, until) == WEND_OK));
  const wend_ledger *l = &r.march.ledger;
  const double initial = wend_ledger_balance(l, WEND_ACCOUNT_INITIAL);
  const double escaped = wend_ledger_balance(l, WEND_ACCOUNT_ESCAPED);
  const double heat = wend_ledger_balance(l, WEND_ACCOUNT_STREAMING_HEAT);
  const double now = wend_total_of(&team, r.g.particles.n, r.g.particles.column[WEND_ENERGY]);
  ck_assert(wend_ledger_now(l) == now);
  ck_assert_double_le(fabs(initial - escaped - heat - now),
                      1e-16 * (double)r.march.steps * initial);
  ck_assert_double_eq_tol(escaped, a.escaped, 2e-4 * initial);
  ck_assert(plans[_i]->open ? escaped > 0.02 * initial : escaped == 0);
  ck_assert(streams ? heat > 1e-4 * initial : heat == 0);
  free(a.energy);
  run_end(&r);
}
END_TEST

/* e = 1 to the bit: E = V. */
START_TEST(constants_keep_their_bits) {
  wend_settings s = settings_of(_i % 2 == 0);
  run r;
  run_begin(&r, &team, _i / 2 == 0 ? &closed : &across, GAS_CUT, &s, GAS_CONSTANT);
  double *const energy = r.g.particles.column[WEND_ENERGY];
  const size_t size = (size_t)r.g.particles.n * sizeof *energy;
  if (size > 0) memcpy(energy, r.g.geometry.volume, size);
  ck_assert(spread_everywhere(run_to(&team, &r, 500 * r.g.transport.explicit_step) == WEND_OK));
  ck_assert(spread_everywhere(size == 0 || memcmp(energy, r.g.geometry.volume, size) == 0));
  ck_assert(r.march.seen_low == 1 && r.march.seen_high == 1);
  ck_assert(wend_ledger_closure(&r.march.ledger) == 0);
  run_end(&r);
}
END_TEST

START_TEST(times_are_hit_exactly) {
  const wend_settings s = settings_of(true);
  run r;
  run_begin(&r, &team, &closed, GAS_CUT, &s, GAS_SMOOTH);
  const double unit = r.g.transport.explicit_step;
  static const double times[] = {0.3, 0.30001, 1.7, 25, 25.1, 60.123456789};
  for (size_t k = 0; k < sizeof times / sizeof *times; k++) {
    ck_assert(spread_everywhere(run_to(&team, &r, times[k] * unit) == WEND_OK));
    ck_assert(r.march.time == times[k] * unit);
  }
  ck_assert_int_ge(r.march.control.steps[WEND_CAUSE_OUTPUT], 4);
  int64_t sum = 0;
  for (int c = 0; c < WEND_CAUSES; c++) sum += r.march.control.steps[c];
  ck_assert_int_eq(sum, r.march.steps);
  run_end(&r);
}
END_TEST

/* From before 0 to short after it in a single step: start + (end - start) is not the end. */
START_TEST(ends_are_not_rounded) {
  const wend_settings s = settings_of(true);
  run r;
  run_begin(&r, &team, &closed, GAS_CUT, &s, GAS_SMOOTH);
  const double unit = r.g.transport.explicit_step, start = -0.8 * unit;
  int rounded = 0;
  for (int k = 1; k <= 40; k++) {
    const double until = 1e-3 * unit * k / 81;
    ck_assert(wend_march_init(&team, &s, &r.g.transport, r.g.particles.column[WEND_ENERGY],
                              start, &r.march) == WEND_OK);
    ck_assert(wend_march_step(&team, &r.march, until) == WEND_OK);
    ck_assert(r.march.time == until && r.march.steps == 1);
    rounded += start + (until - start) != until;
    wend_march_reset(&r.march);
  }
  ck_assert_int_gt(rounded, 20);
  run_end(&r);
}
END_TEST

/* ---- the same bits ---- */

static bool same_march(const wend_march *a, const wend_march *b) {
  return a->time == b->time && a->steps == b->steps && a->stages == b->stages &&
         a->seen_low == b->seen_low && a->seen_high == b->seen_high &&
         a->last_error == b->last_error && a->control.wanted == b->control.wanted &&
         memcmp(&a->ledger, &b->ledger, sizeof a->ledger) == 0;
}

enum { BITS = 6 }; /* the last two with streaming */

START_TEST(bits_do_not_depend_on_ranks) {
  static const gas_plan space = {3, 3, true, 7, 0.5, false, false};
  const gas_plan *plans[BITS] = {&closed, &across, &open_gas, &space, &closed, &open_flow};
  static const spread_way ways[] = {GAS_CUT, SPREAD_RANDOM, SPREAD_HOLE};
  const wend_settings s = streaming(settings_of(true), _i / 2 >= 4);
  const gas_state state = _i % 2 == 0 ? GAS_JUMPS : GAS_DECADES;
  wend_team self = gas_alone();
  run alone;
  run_begin(&alone, &self, plans[_i / 2], GAS_CUT, &s, state);
  const double until = 40 * alone.g.transport.explicit_step;
  ck_assert(spread_everywhere(run_to(&self, &alone, until) == WEND_OK));
  uint64_t *expected = gas_gather(&self, &alone.g, 1, alone.g.particles.column[WEND_ENERGY]);
  for (int k = 0; k < 3; k++) {
    run shared;
    run_begin(&shared, &team, plans[_i / 2], ways[k], &s, state);
    ck_assert(spread_everywhere(run_to(&team, &shared, until) == WEND_OK));
    uint64_t *found = gas_gather(&team, &shared.g, 1, shared.g.particles.column[WEND_ENERGY]);
    const size_t size = (size_t)alone.g.all * sizeof *found;
    ck_assert(spread_everywhere(memcmp(found, expected, size) == 0));
    ck_assert(spread_everywhere(same_march(&shared.march, &alone.march)));
    free(found);
    run_end(&shared);
  }
  free(expected);
  run_end(&alone);
  wend_team_reset(&self);
}
END_TEST

/* ---- errors ---- */

START_TEST(bad_energies_are_an_error) {
  static const double bad[] = {-1e-300, NAN, INFINITY};
  const wend_settings s = settings_of(true);
  for (size_t k = 0; k < sizeof bad / sizeof *bad; k++) {
    run r;
    run_begin(&r, &team, &closed, GAS_CUT, &s, GAS_SMOOTH);
    for (int32_t i = 0; i < r.g.particles.n; i++)
      if (r.g.particles.id[i] == 77) r.g.particles.column[WEND_ENERGY][i] = bad[k];
    ck_assert(spread_everywhere(run_to(&team, &r, 1) == WEND_ERR_PARTICLES));
    ck_assert(spread_same_text(team.text));
    ck_assert(spread_everywhere(r.march.rate == NULL));
    run_end(&r);
  }
}
END_TEST

START_TEST(unknown_schemes_are_an_error) {
  wend_settings s = settings_of(true);
  s.supertime = "leapfrog";
  run r;
  run_begin(&r, &team, &closed, GAS_CUT, &s, GAS_SMOOTH);
  ck_assert(spread_everywhere(run_to(&team, &r, 1) == WEND_ERR_ARGUMENT));
  ck_assert(strstr(team.text, "\"leapfrog\"") != NULL);
  run_end(&r);
}
END_TEST

/* Without its limiter the high-order exchange drives energies next to 0 below it: the error
 * says so on all ranks, and the energies are those before the step. */
START_TEST(hopeless_steps_leave_energies_alone) {
  wend_settings s = settings_of(false);
  run r;
  run_begin(&r, &team, &closed, GAS_CUT, &s, GAS_DECADES);
  const size_t size = (size_t)r.g.particles.n * sizeof(double);
  double *before = malloc(size + 1);
  if (size > 0) memcpy(before, r.g.particles.column[WEND_ENERGY], size);
  ck_assert(spread_everywhere(run_to(&team, &r, 1e6) == WEND_ERR_STEP));
  ck_assert(spread_same_text(team.text));
  ck_assert_int_eq(r.march.steps, 0);
  ck_assert(spread_everywhere(size == 0 ||
                              memcmp(before, r.g.particles.column[WEND_ENERGY], size) == 0));
  free(before);
  run_end(&r);
}
END_TEST

START_TEST(failing_allocations_reach_all_ranks) {
  const wend_settings s = settings_of(true);
  wend_status status = WEND_ERR_MEMORY;
  int number = 0;
  for (; status == WEND_ERR_MEMORY; number++) {
    run r;
    run_begin(&r, &team, &open_gas, SPREAD_TURNS, &s, GAS_SMOOTH);
    team.allocate = spread_allocate;
    if (team.rank == team.size - 1) spread_break(number);
    status = wend_march_init(&team, &s, &r.g.transport, r.g.particles.column[WEND_ENERGY], 0,
                             &r.march);
    ck_assert(spread_everywhere(status == WEND_OK) ||
              spread_everywhere(status == WEND_ERR_MEMORY && r.march.trial == NULL));
    /* A step allocates nothing. */
    spread_break(0);
    if (status == WEND_OK)
      ck_assert(spread_everywhere(wend_march_step(&team, &r.march, 1) == WEND_OK));
    spread_break(-1);
    team.allocate = calloc;
    run_end(&r);
  }
  ck_assert_int_eq(number, 6);
}
END_TEST

int main(int count, char **arguments) {
  MPI_Init(&count, &arguments);
  wend_team_init(&team, MPI_COMM_WORLD);
  Suite *suite = suite_create("march");
  TCase *tc = tcase_create("accuracy");
  tcase_add_loop_test(tc, super_steps_are_of_second_order, 0, 4);
  tcase_add_loop_test(tc, euler_steps_are_of_first_order, 0, CASES);
  tcase_add_loop_test(tc, errors_fall_with_the_tolerance, 0, CASES);
  suite_add_tcase(suite, tc);
  tc = tcase_create("bounds");
  tcase_add_loop_test(tc, bounds_are_kept, 0, 5 * GAS_STATES);
  tcase_add_loop_test(tc, books_close, 0, 4);
  tcase_add_loop_test(tc, constants_keep_their_bits, 0, 4);
  tcase_add_test(tc, times_are_hit_exactly);
  tcase_add_test(tc, ends_are_not_rounded);
  tcase_add_loop_test(tc, bits_do_not_depend_on_ranks, 0, 2 * BITS);
  suite_add_tcase(suite, tc);
  tc = tcase_create("errors");
  tcase_add_test(tc, bad_energies_are_an_error);
  tcase_add_test(tc, unknown_schemes_are_an_error);
  tcase_add_test(tc, hopeless_steps_leave_energies_alone);
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
