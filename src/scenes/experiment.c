/* SPDX-License-Identifier: GPL-3.0-or-later
 * experiment.c: one problem from particles to the end time. */
#include "experiment.h"
#include "cut.h"
#include "total.h"
#include <math.h>
#include <string.h>

static void place_of(const wend_experiment *x, int32_t i, double place[3]) {
  for (int a = 0; a < 3; a++) place[a] = x->particles.column[WEND_X + a][i];
}

wend_status wend_experiment_begin(wend_team *team, wend_experiment *experiment,
                                  wend_profile density, const void *problem) {
  wend_experiment *x = experiment;
  wend_status status = WEND_OK;
  WEND_TRY(wend_cut_particles(team, &x->domain, &x->particles, NULL));
  WEND_TRY(wend_geometry_init(team, &x->domain, &x->settings, &x->particles, &x->geometry));
  for (int32_t i = 0; i < x->particles.n; i++) {
    double place[3];
    place_of(x, i, place);
    x->particles.column[WEND_ENERGY][i] = density(place, problem) * x->geometry.volume[i];
  }
  WEND_TRY(wend_transport_init(team, &x->settings, &x->particles, &x->geometry, &x->transport));
  WEND_TRY(wend_march_init(team, &x->settings, &x->transport, x->particles.column[WEND_ENERGY],
                           0, &x->march));
done:
  return status;
}

wend_status wend_experiment_run(wend_team *team, wend_experiment *experiment, double until) {
  wend_status status = WEND_OK;
  while (status == WEND_OK && experiment->march.time < until)
    status = wend_march_step(team, &experiment->march, until);
  return status;
}

wend_norms wend_experiment_norms(wend_team *team, const wend_experiment *experiment,
                                 wend_profile exact, const void *problem) {
  const wend_experiment *x = experiment;
  enum { VOLUME, L1, L2, SUMS };
  wend_sum sum[SUMS];
  for (int k = 0; k < SUMS; k++) wend_sum_reset(&sum[k]);
  double most[3] = {0, -INFINITY, -INFINITY};
  for (int32_t i = 0; i < x->particles.n; i++) {
    double place[3];
    place_of(x, i, place);
    const double v = x->geometry.volume[i];
    const double e = x->particles.column[WEND_ENERGY][i] / v;
    const double off = fabs(e - exact(place, problem));
    const double term[SUMS] = {v, v * off, v * off * off};
    for (int k = 0; k < SUMS; k++) wend_sum_add(&sum[k], 1, &term[k], 1);
    most[0] = fmax(most[0], off);
    most[1] = fmax(most[1], -e);
    most[2] = fmax(most[2], e);
  }
  wend_total(team, SUMS, sum);
  wend_team_max(team, 3, most);
  const double volume = wend_sum_value(&sum[VOLUME]);
  return (wend_norms){.l1 = wend_sum_value(&sum[L1]) / volume,
                      .l2 = sqrt(wend_sum_value(&sum[L2]) / volume),
                      .linf = most[0],
                      .low = -most[1],
                      .high = most[2]};
}

void wend_experiment_end(wend_experiment *experiment) {
  wend_march_reset(&experiment->march);
  wend_transport_reset(&experiment->transport);
  wend_geometry_reset(&experiment->geometry);
  wend_particles_reset(&experiment->particles);
}
