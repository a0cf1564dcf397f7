/* SPDX-License-Identifier: GPL-3.0-or-later
 * wave.c: a mode exp(ik.x) decays at kappa (k.b)^2, and does not move where k lies across the
 * field.
 *
 * Box [-1,1]^2 periodic, one wavelength a side, e = 1 + 0.5 cos(k.x), b at 0.5 rad to k; run
 * for one e-folding. */
#include "experiment.h"
#include "lattice.h"
#include "scene.h"
#include "total.h"
#include <math.h>

static const double kappa = 0.01, amplitude = 0.5, k_length = M_PI;

static double start(const double x[3], const void *problem) {
  (void)problem;
  return 1 + amplitude * cos(k_length * x[0]);
}

/* Projection of e on the mode, over that of the mode on itself. */
static double project(wend_team *team, const wend_experiment *x) {
  wend_sum sum[2];
  for (int k = 0; k < 2; k++) wend_sum_reset(&sum[k]);
  for (int32_t i = 0; i < x->particles.n; i++) {
    const double v = x->geometry.volume[i];
    const double mode = cos(k_length * x->particles.column[WEND_X][i]);
    const double e = x->particles.column[WEND_ENERGY][i] / v;
    const double term[2] = {v * (e - 1) * mode, v * mode * mode};
    for (int k = 0; k < 2; k++) wend_sum_add(&sum[k], 1, &term[k], 1);
  }
  wend_total(team, 2, sum);
  return wend_sum_value(&sum[0]) / wend_sum_value(&sum[1]);
}

/* Decay rate measured over one e-folding of the mode with the field at `angle` to k, or over as
 * long as at `reference` rad, in units of kappa k^2. */
static wend_status measure(wend_team *team, int side, double jitter, int seed, double angle,
                           double reference, double *rate) {
  const double lo[3] = {-1, -1, 0}, hi[3] = {1, 1, 0};
  const uint64_t mask = UINT64_C(1) << WEND_BX | UINT64_C(1) << WEND_BY |
                        UINT64_C(1) << WEND_ENERGY | UINT64_C(1) << WEND_KPAR;
  const wend_lattice lattice = {{side, side, 1}, jitter, (uint64_t)seed};
  wend_experiment x = {.domain = wend_scene_domain(2, lo, hi, true),
                       .settings = wend_settings_default()};
  wend_status status = WEND_OK;
  WEND_TRY(wend_lattice_fill(team, &x.domain, &lattice, mask, &x.particles));
  for (int32_t i = 0; i < x.particles.n; i++) {
    x.particles.column[WEND_BX][i] = cos(angle);
    x.particles.column[WEND_BY][i] = sin(angle);
    x.particles.column[WEND_KPAR][i] = kappa;
  }
  WEND_TRY(wend_experiment_begin(team, &x, start, NULL));
  const double before = project(team, &x);
  const double unit = kappa * k_length * k_length;
  const double until = 1 / (unit * cos(reference) * cos(reference));
  WEND_TRY(wend_experiment_run(team, &x, until));
  *rate = -log(project(team, &x) / before) / (until * unit);
done:
  wend_experiment_end(&x);
  return status;
}

/* The seed that is farthest off. */
typedef struct wave_figures {
  double along, across;
} wave_figures;

static wend_status measure_seeds(wend_team *team, int side, double jitter, int first, int last,
                                 wave_figures *worst) {
  const double angle = 0.5, exact = cos(angle) * cos(angle);
  *worst = (wave_figures){1, 0};
  for (int seed = first; seed <= last; seed++) {
    double along, across;
    wend_status status = measure(team, side, jitter, seed, angle, angle, &along);
    if (status == WEND_OK) status = measure(team, side, jitter, seed, M_PI / 2, angle, &across);
    if (status != WEND_OK) return status;
    along /= exact;
    across /= exact;
    wend_scene_say(team, "%13d  %4d  %9.5f  %9.2e\n", side, seed, along, across);
    if (fabs(along - 1) > fabs(worst->along - 1)) worst->along = along;
    worst->across = fmax(worst->across, fabs(across));
  }
  return WEND_OK;
}

wend_status wend_wave_prove(wend_team *team, const wend_scene_options *options) {
  static const int sides[] = {32, 64};
  static const double bars[] = {0.02, 0.003};
  const double jitter = options->jitter >= 0 ? options->jitter : 0.2;
  const int first = options->seed_first > 0 ? options->seed_first : 1;
  const int last = options->seed_first > 0 ? options->seed_last : 5;
  const bool own = options->side > 0 || options->jitter >= 0 || options->seed_first > 0;
  wend_verdict verdict = {0, 0};
  wend_scene_say(team, "wave: decay rate over kappa (k.b)^2, and what moves across over it\n"
                       " a wavelength  seed   along      across\n");
  for (int k = 0; k < (own ? 1 : 2); k++) {
    wave_figures worst;
    const int side = options->side > 0 ? options->side : sides[k];
    const wend_status status = measure_seeds(team, side, jitter, first, last, &worst);
    if (status != WEND_OK) return status;
    if (own) return WEND_OK;
    wend_verdict_most(team, &verdict, fabs(worst.along - 1), bars[k],
                      "%d a wavelength: |rate - 1|, worst seed", side);
    wend_verdict_most(team, &verdict, worst.across, 1e-3, "%d a wavelength: across, worst seed",
                      side);
  }
  return wend_verdict_close(team, &verdict, "wave");
}
