/* SPDX-License-Identifier: LGPL-3.0-or-later
 * march.c: super-steps with error control, bounds and books.
 *
 * Unknowns are E, the energy escaped from each particle where a surface is open, and its heat
 * with streaming: one block each, advanced by the same stages and thrown away together when an
 * attempt fails. */
#include "march.h"
#include "local_bounds.h"
#include "stage.h"
#include "total.h"
#include <math.h>
#include <stdlib.h>
#include <string.h>

/* How far beyond the range a value may be, of the largest |e|: round-off of a long sum. */
static const double slack = 1e-13;

static int64_t block(const wend_march *m) { return m->transport->geometry->near.owned; }

/* Blocks of the unknowns beside E; NULL where there is none. */
static double *escaped_block(const wend_march *m, double *array) {
  return m->transport->escapes ? array + block(m) : NULL;
}

static double *heat_block(const wend_march *m, double *array) {
  if (!m->transport->streams) return NULL;
  return array + block(m) * (m->transport->escapes ? 2 : 1);
}

wend_status wend_march_rate(wend_team *team, wend_march *march, const double *energy,
                            double *rate) {
  wend_march *m = march;
  const wend_status status =
      wend_transport_rate(team, m->transport, energy, rate, escaped_block(m, rate));
  if (m->transport->streams && block(m) > 0)
    memcpy(heat_block(m, rate), m->transport->heat, (size_t)block(m) * sizeof *rate);
  return status;
}

/* Runs the stages of one attempt; the increments of all unknowns end in `latest`. */
static wend_status run_stages(wend_team *team, wend_march *m, const wend_plan *plan) {
  wend_stage stage[WEND_STAGES_MOST + 1];
  const wend_supertime *family = plan->stages == 1 ? wend_supertime_find("euler") : m->family;
  const int64_t n = block(m), all = n * m->unknowns;
  family->stages(plan->stages, stage);
  memset(m->older, 0, (size_t)all * sizeof *m->older);
  wend_stage_first(all, stage[1].mt * plan->step, m->rate_0, m->latest);
  for (int j = 2; j <= plan->stages; j++) {
    wend_stage_add(n, m->energy, m->latest, m->trial);
    const wend_status status = wend_march_rate(team, m, m->trial, m->rate);
    if (status != WEND_OK) return status;
    wend_stage_next(all, &stage[j], plan->step, m->latest, m->rate, m->rate_0, m->older);
    double *const swap = m->latest;
    m->latest = m->older;
    m->older = swap;
  }
  m->stages += plan->stages;
  wend_stage_add(n, m->energy, m->latest, m->trial);
  return WEND_OK;
}

/* Least and largest e over all particles. */
static void range(wend_team *team, const wend_march *m, const double *energy, double *low,
                  double *high) {
  double most[2] = {-INFINITY, -INFINITY};
  for (int64_t i = 0; i < block(m); i++) {
    const double e = energy[i] / m->transport->geometry->volume[i];
    most[0] = isnan(e) || most[0] < -e ? -e : most[0];
    most[1] = isnan(e) || most[1] < e ? e : most[1];
  }
  wend_team_max(team, 2, most);
  *low = -most[0];
  *high = most[1];
}

static double round_off(const wend_march *m) {
  return slack * fmax(fabs(m->low), fabs(m->high));
}

/* Escape and heat lower the least value legally; then only e < 0 and the upper end count.
 * Without a limiter there are no bounds to keep but e >= 0. */
static bool within(const wend_march *m, double low, double high) {
  if (!m->settings.limited) return low >= 0 && isfinite(high);
  const double give = round_off(m);
  const double floor = m->unknowns > 1 ? 0 : m->low - give;
  return low >= 0 && low >= floor && high <= m->high + give;
}

/* Tests an attempt: the range of all values always, the range of each neighbourhood if asked
 * for. */
static wend_status test_bounds(wend_team *team, wend_march *m, const wend_plan *plan,
                               double *low, double *high, bool *held) {
  double excess = 0;
  range(team, m, m->trial, low, high);
  *held = within(m, *low, *high);
  if (!*held || !m->settings.local_bounds || m->unknowns > 1) return WEND_OK;
  const wend_status status = wend_local_bounds_excess(
      team, m->transport->geometry, plan->stages, m->energy, m->trial, &excess);
  *held = excess <= round_off(m);
  return status;
}

/* Estimated error over the total energy. */
static double error_of(wend_team *team, wend_march *m, double step) {
  const int64_t n = block(m);
  wend_stage_error(n, step, m->latest, m->rate_0, m->rate, m->older);
  const double total = wend_ledger_now(&m->ledger);
  const double error = wend_total_of(team, n, m->older);
  return total > 0 ? error / total : 0;
}

static void accept(wend_team *team, wend_march *m, const wend_plan *plan, double until,
                   double remaining) {
  const int64_t n = block(m);
  memcpy(m->energy, m->trial, (size_t)n * sizeof *m->energy);
  if (m->transport->escapes)
    wend_ledger_book(team, &m->ledger, WEND_ACCOUNT_ESCAPED, n, escaped_block(m, m->latest));
  if (m->transport->streams)
    wend_ledger_book(team, &m->ledger, WEND_ACCOUNT_STREAMING_HEAT, n,
                     heat_block(m, m->latest));
  wend_ledger_count(team, &m->ledger, n, m->energy);
  double *const swap = m->rate_0;
  m->rate_0 = m->rate;
  m->rate = swap;
  m->time = plan->step >= remaining ? until : m->time + plan->step;
  m->steps++;
  m->last = *plan;
}

wend_status wend_march_step(wend_team *team, wend_march *march, double until) {
  wend_march *m = march;
  wend_status status = WEND_OK;
  const double explicit_step = m->transport->explicit_step;
  const double remaining = until - m->time;
  if (!m->rate_known) {
    status = wend_march_rate(team, m, m->energy, m->rate_0);
    if (status != WEND_OK) return status;
    m->rate_known = true;
  }
  wend_plan plan =
      wend_control_plan(&m->control, &m->settings, m->family, explicit_step, remaining);
  double low, high;
  for (;;) {
    bool held;
    status = run_stages(team, m, &plan);
    if (status == WEND_OK) status = test_bounds(team, m, &plan, &low, &high, &held);
    if (status != WEND_OK) return status;
    if (!held) {
      if (wend_control_shorten(&m->control, &m->settings, m->family, explicit_step, &plan))
        continue;
      wend_fail(
          team, WEND_ERR_STEP,
          "a forward-Euler step of %g at time %g leaves the range [%g, %g] of the CR energy "
          "density: it found %.17g to %.17g",
          plan.step, m->time, m->low, m->high, low, high);
      return wend_agree(team);
    }
    status = wend_march_rate(team, m, m->trial, m->rate);
    if (status != WEND_OK) return status;
    m->last_error = error_of(team, m, plan.step);
    if (wend_control_judge(&m->control, &m->settings, m->family, explicit_step, m->last_error,
                           &plan))
      break;
  }
  m->seen_low = fmin(m->seen_low, low);
  m->seen_high = fmax(m->seen_high, high);
  accept(team, m, &plan, until, remaining);
  return WEND_OK;
}

static wend_status allocate(wend_team *team, wend_march *m) {
  const int64_t n = block(m) * m->unknowns;
  double **const array[] = {&m->rate_0, &m->rate, &m->latest, &m->older, &m->trial};
  for (size_t k = 0; k < sizeof array / sizeof *array; k++)
    *array[k] = wend_allocate(team, n > 0 ? n : 1, sizeof(double));
  return wend_agree(team);
}

wend_status wend_march_init(wend_team *team, const wend_settings *settings,
                            wend_transport *transport, double *energy, double time,
                            wend_march *march) {
  wend_status status = WEND_OK;
  wend_march *m = march;
  *m = (wend_march){.settings = *settings,
                    .family = wend_supertime_find(settings->supertime),
                    .transport = transport,
                    .energy = energy,
                    .time = time,
                    .unknowns = 1 + transport->escapes + transport->streams};
  if (m->family == NULL)
    wend_fail(team, WEND_ERR_ARGUMENT, "no time-stepping scheme is called \"%s\"",
              settings->supertime);
  WEND_TRY(wend_agree(team));
  WEND_TRY(allocate(team, m));
  m->control = wend_control_begin(settings, transport->explicit_step);
  range(team, m, energy, &m->low, &m->high);
  m->seen_low = m->low;
  m->seen_high = m->high;
  if (!(m->low >= 0) || !(m->high < INFINITY))
    wend_fail(team, WEND_ERR_PARTICLES,
              "CR energy densities run from %g to %g: they must be finite and not negative",
              m->low, m->high);
  WEND_TRY(wend_agree(team));
  wend_ledger_open(team, &m->ledger, block(m), energy);
done:
  if (status != WEND_OK) wend_march_reset(m);
  return status;
}

void wend_march_reset(wend_march *march) {
  free(march->rate_0);
  free(march->rate);
  free(march->latest);
  free(march->older);
  free(march->trial);
  memset(march, 0, sizeof *march);
}
