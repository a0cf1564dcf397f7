/* SPDX-License-Identifier: LGPL-3.0-or-later
 * control.c: length of super-steps by error estimate, stability and bounds. */
#include "control.h"
#include <math.h>

/* Change of length from one step to the next, and how far below the tolerance it aims. */
static const double shrink_most = 0.3, grow_most = 2, aim = 0.8;

/* A donor whose receiver has nothing pays as much heat as energy, which the explicit step does
 * not foresee: forward-Euler steps may be cut by up to this. */
static const double euler_halvings = 8;

/* Growth after a step that the bounds had shortened: gentle, since each failure costs an
 * attempt. */
static const double grow_after_bounds = 1.189207115002721;

/* Order of the local error of a second-order scheme. */
static const double local_order = 3;

const char *wend_cause_text(wend_cause cause) {
  static const char *const text[WEND_CAUSES] = {"start",  "accuracy", "stages",
                                                "bounds", "output",   "fixed"};
  return text[cause];
}

/* A step that would leave less than this share of itself takes it too: times are rounded. */
static const double sliver = 1e-12;

/* Down to a power of 2^(1/4): small noise in the estimate does not change the step. */
static double round_down(double factor) { return exp2(floor(4 * log2(factor)) / 4); }

static int fit_stages(const wend_settings *settings, const wend_supertime *family,
                      double explicit_step, double step) {
  const double ratio = step / (settings->margin * explicit_step) * (1 - 2 * sliver);
  return ratio <= 1 ? 1 : wend_supertime_fit(family, ratio);
}

/* Accuracy never asks for less than the shortest super-step: below it the error is that of the
 * jumps between particles, which no step removes, and forward Euler costs as much. */
static double shortest(const wend_settings *settings, const wend_supertime *family,
                       double explicit_step) {
  return settings->margin * explicit_step * family->reach(family->least);
}

static double longest(const wend_settings *settings, const wend_supertime *family,
                      double explicit_step) {
  return settings->margin * explicit_step * family->reach(settings->stages);
}

wend_control wend_control_begin(const wend_settings *settings, double explicit_step) {
  return (wend_control){.wanted = settings->first_step > 0 ? settings->first_step
                                                           : settings->margin * explicit_step,
                        .cause = WEND_CAUSE_START};
}

/* The remaining time, or half of it where one step would leave a sliver. */
static double not_beyond(double step, double remaining) {
  if (step >= remaining * (1 - sliver)) return remaining;
  return 2 * step > remaining ? remaining / 2 : step;
}

wend_plan wend_control_plan(const wend_control *control, const wend_settings *settings,
                            const wend_supertime *family, double explicit_step,
                            double remaining) {
  wend_plan plan = {.step = control->wanted, .cause = control->cause};
  if (settings->fixed_step > 0) {
    plan.step = settings->fixed_step;
    plan.cause = WEND_CAUSE_FIXED;
  }
  const double most = longest(settings, family, explicit_step);
  if (plan.step > most) {
    plan.step = most;
    plan.cause = WEND_CAUSE_STAGES;
  }
  const double step = not_beyond(plan.step, remaining);
  if (step < plan.step) plan.cause = WEND_CAUSE_OUTPUT;
  plan.step = step;
  plan.stages = fit_stages(settings, family, explicit_step, plan.step);
  return plan;
}

bool wend_control_shorten(wend_control *control, const wend_settings *settings,
                          const wend_supertime *family, double explicit_step, wend_plan *plan) {
  const double euler = settings->margin * explicit_step;
  control->redone_bounds++;
  if (plan->step <= euler / euler_halvings) return false;
  plan->step = plan->step > euler ? fmax(plan->step / 2, euler) : plan->step / 2;
  plan->stages = fit_stages(settings, family, explicit_step, plan->step);
  plan->cause = WEND_CAUSE_BOUNDS;
  return true;
}

/* Sets the next length after an accepted step. */
static void set_wanted(wend_control *control, const wend_plan *plan, double factor,
                       double floor) {
  double wanted = plan->step * factor;
  wend_cause cause = WEND_CAUSE_ACCURACY;
  if (plan->cause == WEND_CAUSE_BOUNDS) {
    if (factor >= grow_after_bounds) cause = WEND_CAUSE_BOUNDS;
    wanted = plan->step * fmin(factor, grow_after_bounds);
  } else if (plan->cause == WEND_CAUSE_OUTPUT || plan->cause == WEND_CAUSE_STAGES) {
    wanted = fmax(fmin(control->wanted, plan->step * grow_most), wanted);
  }
  control->wanted = cause == WEND_CAUSE_BOUNDS ? wanted : fmax(wanted, floor);
  control->cause = cause;
}

bool wend_control_judge(wend_control *control, const wend_settings *settings,
                        const wend_supertime *family, double explicit_step, double error,
                        wend_plan *plan) {
  const double floor = shortest(settings, family, explicit_step);
  const bool checked = plan->step > floor && settings->fixed_step <= 0;
  const double ratio = error > 0 ? settings->tolerance / error : INFINITY;
  double factor = fmin(grow_most, fmax(shrink_most, aim * pow(ratio, 1 / local_order)));
  factor = round_down(factor);
  if (checked && ratio < 1) {
    control->redone_error++;
    plan->step = fmax(plan->step * fmin(factor, 0.5), floor);
    plan->stages = fit_stages(settings, family, explicit_step, plan->step);
    plan->cause = WEND_CAUSE_ACCURACY;
    return false;
  }
  control->steps[plan->cause]++;
  set_wanted(control, plan, factor, floor);
  return true;
}
