/* SPDX-License-Identifier: GPL-3.0-or-later
 * check_control.c: lengths of super-steps: stability, tolerance, bounds, and times that are hit
 * exactly. */
#include "control.h"

#include "cloud.h"

#include <check.h>
#include <math.h>
#include <string.h>

static const double explicit_step = 0.01;

static wend_settings settings_of(void) {
  wend_settings s = wend_settings_default();
  s.margin = 0.95;
  s.stages = 11;
  s.tolerance = 1e-5;
  return s;
}

static const wend_supertime *rkg2(void) { return wend_supertime_find("rkg2"); }

static wend_plan plan_of(const wend_control *c, const wend_settings *s, double remaining) {
  return wend_control_plan(c, s, rkg2(), explicit_step, remaining);
}

/* No plan is longer than its stages are stable for, with the margin; and one pair of stages
 * less would not do. 2e-12: the last step before a time may be so much longer. */
static void plan_is_sound(const wend_plan *p, const wend_settings *s, double remaining) {
  const double unit = s->margin * explicit_step;
  ck_assert(p->step > 0 && p->step <= remaining);
  ck_assert(p->stages == 1 || (p->stages % 2 == 1 && p->stages >= 3));
  ck_assert_int_le(p->stages, s->stages);
  const double reach = p->stages == 1 ? 1 : rkg2()->reach(p->stages);
  ck_assert_double_le(p->step, unit * reach * (1 + 3e-12));
  if (p->stages == 3) ck_assert_double_gt(p->step, unit * (1 - 1e-12));
  if (p->stages > 3)
    ck_assert_double_gt(p->step, unit * rkg2()->reach(p->stages - 2) * (1 - 1e-12));
}

START_TEST(plans_are_stable_and_fit) {
  const wend_settings s = settings_of();
  uint64_t seed = 1;
  for (int k = 0; k < 20000; k++) {
    wend_control c = wend_control_begin(&s, explicit_step);
    c.wanted = explicit_step * pow(10, 6 * cloud_random(&seed) - 3);
    c.cause = WEND_CAUSE_ACCURACY;
    const double remaining = explicit_step * pow(10, 6 * cloud_random(&seed) - 3);
    const wend_plan p = plan_of(&c, &s, remaining);
    plan_is_sound(&p, &s, remaining);
    const double most = s.margin * explicit_step * rkg2()->reach(s.stages);
    const double free = fmin(c.wanted, most);
    /* The time left cuts a step to all of it, or halves it where a sliver would stay. */
    if (free >= remaining)
      ck_assert(p.step == remaining);
    else if (2 * free > remaining && free < remaining * (1 - 1e-11))
      ck_assert(p.step == remaining / 2);
    else if (2 * free <= remaining)
      ck_assert(p.step == free);
    if (p.step < free)
      ck_assert_int_eq(p.cause, WEND_CAUSE_OUTPUT);
    else
      ck_assert_int_eq(p.cause, c.wanted > most ? WEND_CAUSE_STAGES : WEND_CAUSE_ACCURACY);
  }
}
END_TEST

START_TEST(starts_are_explicit_or_as_set) {
  wend_settings s = settings_of();
  wend_control c = wend_control_begin(&s, explicit_step);
  wend_plan p = plan_of(&c, &s, 1e9);
  ck_assert_int_eq(p.stages, 1);
  ck_assert(p.step == s.margin * explicit_step);
  ck_assert_int_eq(p.cause, WEND_CAUSE_START);
  s.first_step = 0.05;
  c = wend_control_begin(&s, explicit_step);
  p = plan_of(&c, &s, 1e9);
  ck_assert(p.step == 0.05);
  plan_is_sound(&p, &s, 1e9);
}
END_TEST

START_TEST(fixed_steps_stay) {
  wend_settings s = settings_of();
  s.fixed_step = 0.04;
  wend_control c = wend_control_begin(&s, explicit_step);
  for (int k = 0; k < 5; k++) {
    wend_plan p = plan_of(&c, &s, 1e9);
    ck_assert(p.step == 0.04 && p.cause == WEND_CAUSE_FIXED);
    ck_assert(wend_control_judge(&c, &s, rkg2(), explicit_step, 1e3 * s.tolerance, &p));
  }
  ck_assert_int_eq(c.steps[WEND_CAUSE_FIXED], 5);
  s.fixed_step = 1e3; /* even a fixed step is cut to what is stable */
  const wend_plan p = plan_of(&c, &s, 1e9);
  plan_is_sound(&p, &s, 1e9);
  ck_assert_int_eq(p.cause, WEND_CAUSE_STAGES);
}
END_TEST

/* A time hit in n steps: the last step is the time left, to the bit, and none is a sliver. */
START_TEST(times_are_hit_without_slivers) {
  const wend_settings s = settings_of();
  uint64_t seed = 3;
  for (int k = 0; k < 200; k++) {
    const double until = explicit_step * (1 + 300 * cloud_random(&seed));
    wend_control c = wend_control_begin(&s, explicit_step);
    double time = 0, before = 0;
    for (int n = 0; time < until && n < 1000; n++) {
      wend_plan p = plan_of(&c, &s, until - time);
      wend_control_judge(&c, &s, rkg2(), explicit_step, 0, &p);
      ck_assert(n == 0 || p.step > 0.24 * before);
      time = p.step >= until - time ? until : time + p.step;
      before = p.step;
    }
    ck_assert(time == until);
  }
}
END_TEST

/* Times that add up with rounding: 1000 times a third, and not one step more. */
START_TEST(rounding_leaves_no_sliver) {
  wend_settings s = settings_of();
  for (int n = 1; n <= 1000; n += 37) {
    const double step = explicit_step * (2 + 1.0 / 3), until = n * step;
    s.fixed_step = step;
    const wend_control c = wend_control_begin(&s, explicit_step);
    double time = 0;
    int steps = 0;
    for (; time < until; steps++) {
      const wend_plan p = plan_of(&c, &s, until - time);
      time = p.step >= until - time ? until : time + p.step;
    }
    ck_assert_int_eq(steps, n);
  }
  s.fixed_step = 0;
  /* Not even where the stages allowed are just enough. */
  const double longest = s.margin * explicit_step * rkg2()->reach(s.stages);
  const wend_control c = {.wanted = longest, .cause = WEND_CAUSE_ACCURACY};
  const wend_plan p = plan_of(&c, &s, longest * (1 + 1e-13));
  ck_assert(p.step == longest * (1 + 1e-13));
  ck_assert_int_eq(p.stages, s.stages);
}
END_TEST

/* ---- bounds ---- */

/* Down to one forward-Euler step, then to an eighth of it: heat may need that. */
START_TEST(broken_bounds_halve_down_to_euler) {
  const wend_settings s = settings_of();
  const double euler = s.margin * explicit_step;
  wend_control c = wend_control_begin(&s, explicit_step);
  c.wanted = 1e9;
  wend_plan p = plan_of(&c, &s, 1e9);
  int halvings = 0;
  for (double before = p.step;; before = p.step) {
    if (!wend_control_shorten(&c, &s, rkg2(), explicit_step, &p)) break;
    halvings++;
    plan_is_sound(&p, &s, before);
    ck_assert(p.step == (before > euler ? fmax(before / 2, euler) : before / 2));
    ck_assert_int_eq(p.cause, WEND_CAUSE_BOUNDS);
    ck_assert_int_lt(halvings, 20);
  }
  ck_assert_int_eq(p.stages, 1);
  ck_assert(p.step == euler / 8);
  ck_assert_int_eq(c.redone_bounds, halvings + 1);
  /* Accepted: the next one grows gently, and remembers why it is short. */
  ck_assert(wend_control_judge(&c, &s, rkg2(), explicit_step, 0, &p));
  const wend_plan next = plan_of(&c, &s, 1e9);
  ck_assert(next.step > p.step && next.step <= p.step * pow(2, 0.25) * (1 + 1e-15));
  ck_assert_int_eq(next.cause, WEND_CAUSE_BOUNDS);
  ck_assert_int_eq(c.steps[WEND_CAUSE_BOUNDS], 1);
}
END_TEST

/* ---- error ---- */

/* The growth is a power of 2^(1/4) within [0.3, 2], rounded down, and aims below the tolerance
 * by the cube root, the order of a local error. */
START_TEST(errors_set_the_next_length) {
  const wend_settings s = settings_of();
  double last = 2;
  for (int k = 0; k < 60; k++) {
    const double error = s.tolerance * pow(10, -3 + k * 0.05);
    wend_control c = wend_control_begin(&s, explicit_step);
    c.wanted = 10 * explicit_step;
    c.cause = WEND_CAUSE_ACCURACY;
    wend_plan p = plan_of(&c, &s, 1e9);
    ck_assert(error < s.tolerance);
    ck_assert(wend_control_judge(&c, &s, rkg2(), explicit_step, error, &p));
    const double growth = c.wanted / p.step, power = 4 * log2(growth);
    ck_assert_double_eq_tol(power, round(power), 1e-9);
    ck_assert(growth <= last && growth >= 0.297 && growth <= 2);
    const double ideal = fmin(2, 0.8 * cbrt(s.tolerance / error));
    ck_assert(growth <= ideal * (1 + 1e-12) && growth * 1.19 > ideal);
    last = growth;
  }
  ck_assert_double_lt(last, 1);
}
END_TEST

/* The shortest super-step is taken whatever the estimate says: a shorter one costs as much. */
START_TEST(large_errors_are_redone) {
  const wend_settings s = settings_of();
  wend_control c = wend_control_begin(&s, explicit_step);
  c.wanted = 20 * explicit_step;
  wend_plan p = plan_of(&c, &s, 1e9);
  const double floor = s.margin * explicit_step * rkg2()->reach(3);
  int redone = 0;
  for (double before = p.step;; before = p.step) {
    if (wend_control_judge(&c, &s, rkg2(), explicit_step, 100 * s.tolerance, &p)) break;
    redone++;
    ck_assert(p.step <= before / 2 || p.step == floor);
    plan_is_sound(&p, &s, before);
    ck_assert_int_lt(redone, 20);
  }
  ck_assert(p.step == floor && c.wanted == floor);
  ck_assert_int_gt(redone, 1);
  ck_assert_int_eq(c.redone_error, redone);
}
END_TEST

/* A model error C step^3: lengths settle where the error is the tolerance, within the aim and
 * the rounding; 0.8 / 2^(1/4) to 1 of the ideal length. */
START_TEST(lengths_settle_at_the_tolerance) {
  const wend_settings s = settings_of();
  const double ideal = 10 * explicit_step;
  wend_control c = wend_control_begin(&s, explicit_step);
  for (int k = 0; k < 40; k++) {
    wend_plan p = plan_of(&c, &s, 1e9);
    while (!wend_control_judge(&c, &s, rkg2(), explicit_step,
                               s.tolerance * pow(p.step / ideal, 3), &p)) {
    }
    if (k < 20) continue;
    ck_assert_double_gt(p.step, 0.8 / pow(2, 0.25) * ideal * (1 - 1e-9));
    ck_assert_double_lt(p.step, ideal);
  }
  ck_assert_int_eq(c.redone_error, 0);
}
END_TEST

/* An output time that cuts a step does not shorten those after it. */
START_TEST(output_times_do_not_slow_down) {
  const wend_settings s = settings_of();
  wend_control c = wend_control_begin(&s, explicit_step);
  c.wanted = 10 * explicit_step;
  c.cause = WEND_CAUSE_ACCURACY;
  wend_plan p = plan_of(&c, &s, 6 * explicit_step);
  ck_assert_int_eq(p.cause, WEND_CAUSE_OUTPUT);
  ck_assert(wend_control_judge(&c, &s, rkg2(), explicit_step, s.tolerance / 10, &p));
  ck_assert_int_eq(c.steps[WEND_CAUSE_OUTPUT], 1);
  ck_assert(plan_of(&c, &s, 1e9).step >= 10 * explicit_step);
}
END_TEST

START_TEST(causes_have_names) {
  for (int a = 0; a < WEND_CAUSES; a++) {
    ck_assert(strlen(wend_cause_text((wend_cause)a)) > 0);
    for (int b = 0; b < a; b++)
      ck_assert_str_ne(wend_cause_text((wend_cause)a), wend_cause_text((wend_cause)b));
  }
}
END_TEST

int main(void) {
  Suite *suite = suite_create("control");
  TCase *tc = tcase_create("plans");
  tcase_add_test(tc, plans_are_stable_and_fit);
  tcase_add_test(tc, starts_are_explicit_or_as_set);
  tcase_add_test(tc, fixed_steps_stay);
  tcase_add_test(tc, times_are_hit_without_slivers);
  tcase_add_test(tc, rounding_leaves_no_sliver);
  tcase_add_test(tc, output_times_do_not_slow_down);
  tcase_add_test(tc, causes_have_names);
  suite_add_tcase(suite, tc);
  tc = tcase_create("judgement");
  tcase_add_test(tc, broken_bounds_halve_down_to_euler);
  tcase_add_test(tc, errors_set_the_next_length);
  tcase_add_test(tc, large_errors_are_redone);
  tcase_add_test(tc, lengths_settle_at_the_tolerance);
  suite_add_tcase(suite, tc);
  SRunner *runner = srunner_create(suite);
  srunner_set_fork_status(runner, CK_NOFORK);
  srunner_run_all(runner, CK_NORMAL);
  const int failed = srunner_ntests_failed(runner);
  srunner_free(runner);
  return failed != 0;
}
