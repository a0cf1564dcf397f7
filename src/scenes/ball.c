/* SPDX-License-Identifier: GPL-3.0-or-later
 * ball.c: a ball of gas with an absorbing surface, isotropic diffusion.
 *
 * A uniform e in a ball of radius R that is held at 0 on its surface leaves as (Crank 1975, The
 * mathematics of diffusion, equation 6.20, recalled)
 *
 *   E(t)/E(0) = (6/pi^2) sum_n exp(-n^2 pi^2 kappa t/R^2) / n^2.
 *
 * The rate -d ln E/dt is compared over the time in which the exact energy falls from 0.5 to 0.1
 * of its start. */
#include "experiment.h"
#include "lattice.h"
#include "scene.h"
#include <gsl/gsl_errno.h>
#include <gsl/gsl_roots.h>
#include <math.h>

static const double radius = 1, kappa = 0.01;

static double remaining(double t) {
  double sum = 0;
  for (int n = 1; n <= 200; n++)
    sum += exp(-n * n * M_PI * M_PI * kappa * t / (radius * radius)) / (n * n);
  return 6 / (M_PI * M_PI) * sum;
}

static double beyond(double t, void *level) { return remaining(t) - *(double *)level; }

/* Time at which the exact energy has fallen to `level` of its start. */
static double time_of(double level) {
  gsl_root_fsolver *solver = gsl_root_fsolver_alloc(gsl_root_fsolver_brent);
  gsl_function f = {beyond, &level};
  double root = NAN;
  if (solver != NULL && gsl_root_fsolver_set(solver, &f, 1e-6, 1e3) == GSL_SUCCESS)
    for (int k = 0; k < 100; k++) {
      gsl_root_fsolver_iterate(solver);
      root = gsl_root_fsolver_root(solver);
    }
  if (solver != NULL) gsl_root_fsolver_free(solver);
  return root;
}

static double uniform(const double x[3], const void *problem) {
  (void)x;
  (void)problem;
  return 1;
}

/* Keeps the particles inside the ball. */
static void carve(wend_particles *p) {
  int32_t kept = 0;
  for (int32_t i = 0; i < p->n; i++) {
    double r2 = 0;
    for (int a = 0; a < 3; a++) r2 += p->column[WEND_X + a][i] * p->column[WEND_X + a][i];
    if (r2 >= radius * radius) continue;
    p->id[kept] = p->id[i];
    for (int c = 0; c < WEND_COLUMNS; c++)
      if (p->column[c] != NULL) p->column[c][kept] = p->column[c][i];
    kept++;
  }
  p->n = kept;
}

typedef struct ball_figures {
  double rate;    /* measured over exact */
  double closure; /* of the books, relative */
  double escaped; /* escaped account over what is missing */
  int64_t surface, steps, stages;
} ball_figures;

static wend_status run(wend_team *team, int side, double jitter, int seed, ball_figures *f) {
  const double lo[3] = {-1.25, -1.25, -1.25}, hi[3] = {1.25, 1.25, 1.25};
  const int across = 5 * side / 4;
  const uint64_t mask =
      UINT64_C(1) << WEND_ENERGY | UINT64_C(1) << WEND_KPAR | UINT64_C(1) << WEND_KPERP;
  const wend_lattice lattice = {{across, across, across}, jitter, (uint64_t)seed};
  const double early = time_of(0.5), late = time_of(0.1);
  wend_status status = WEND_OK;
  wend_experiment x = {.domain = wend_scene_domain(3, lo, hi, false),
                       .settings = wend_settings_default()};
  for (int a = 0; a < 3; a++) x.domain.open[a] = true;
  WEND_TRY(wend_lattice_fill(team, &x.domain, &lattice, mask, &x.particles));
  carve(&x.particles);
  for (int32_t i = 0; i < x.particles.n; i++)
    x.particles.column[WEND_KPAR][i] = x.particles.column[WEND_KPERP][i] = kappa;
  WEND_TRY(wend_experiment_begin(team, &x, uniform, NULL));
  WEND_TRY(wend_experiment_run(team, &x, early));
  const double before = wend_ledger_now(&x.march.ledger);
  WEND_TRY(wend_experiment_run(team, &x, late));
  const double after = wend_ledger_now(&x.march.ledger);
  const double initial = wend_ledger_balance(&x.march.ledger, WEND_ACCOUNT_INITIAL);
  f->rate = log(before / after) / log(remaining(early) / remaining(late));
  f->closure = wend_ledger_relative(&x.march.ledger);
  f->escaped = wend_ledger_balance(&x.march.ledger, WEND_ACCOUNT_ESCAPED) / (initial - after);
  f->surface = x.geometry.report.surface;
  f->steps = x.march.steps;
  f->stages = x.march.stages;
done:
  wend_experiment_end(&x);
  return status;
}

wend_status wend_ball_prove(wend_team *team, const wend_scene_options *options) {
  static const int sides[] = {32, 64};
  static const double bars[] = {0.06, 0.03};
  const double jitter = options->jitter >= 0 ? options->jitter : 0.2;
  const int seed = options->seed_first > 0 ? options->seed_first : 1;
  const bool own = options->side > 0 || options->jitter >= 0;
  wend_verdict verdict = {0, 0};
  double off[2];
  wend_scene_say(
      team, "ball: rate of loss over the exact one, absorbing surface\n"
            " a diameter    rate     books closed to  escaped/missing  surface steps stages\n");
  for (int k = 0; k < 2; k++) {
    ball_figures f;
    const int side = options->side > 0 ? options->side : sides[k];
    const wend_status status = run(team, side, jitter, seed, &f);
    if (status != WEND_OK) return status;
    off[k] = fabs(f.rate - 1);
    wend_scene_say(team, "%11d  %8.4f  %8.1e         %.15f %7lld %5lld %6lld\n", side, f.rate,
                   f.closure, f.escaped, (long long)f.surface, (long long)f.steps,
                   (long long)f.stages);
    if (own) return WEND_OK;
    wend_verdict_most(team, &verdict, off[k], bars[k], "%d a diameter: |rate - 1|", side);
    wend_verdict_most(team, &verdict, f.closure, 1e-14, "%d a diameter: books", side);
    wend_verdict_most(team, &verdict, fabs(f.escaped - 1), 1e-13,
                      "%d a diameter: |escaped/missing - 1|", side);
  }
  wend_verdict_most(team, &verdict, off[1] / off[0], 0.8, "error at 64 over error at 32");
  return wend_verdict_close(team, &verdict, "ball");
}
