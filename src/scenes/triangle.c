/* SPDX-License-Identifier: GPL-3.0-or-later
 * triangle.c: streaming down a triangle, e(x, 0) = 2 - |x| on a periodic [-1, 1], v_A = 1, b
 * along x.
 *
 * The full equation with the work term. Off the plateaus e = 2 + t - |x|. The top becomes a
 * plateau of half-width x_m and height e_p; with S = 2 + t and u = x_m/S,
 *
 *   (1 - u)^3 (1 + 3u/4)^4 = (2/S)^7,   e_p = S (1 - u),
 *
 * and the bottom, at |x| = 1, fills to the half-width x_n: x_n' = (4/3)(1 + t + x_n)/x_n - 1,
 * level 1 + t + x_n. (Both derived from energy conservation of a flat region fed by the
 * saturated flux at its edges.) Regularisation leaves the top high by an amount that falls as
 * 1/ell. The two plateaus meet soon after t = 0.05. */
#include "experiment.h"
#include "lattice.h"
#include "scene.h"
#include "total.h"
#include <gsl/gsl_errno.h>
#include <gsl/gsl_odeiv2.h>
#include <gsl/gsl_roots.h>
#include <math.h>

typedef struct plateaus {
  double t, top, half_top, bottom, half_bottom;
} plateaus;

static double top_equation(double u, void *s) {
  const double ratio = 2 / *(double *)s;
  return pow(1 - u, 3) * pow(1 + 0.75 * u, 4) - pow(ratio, 7);
}

static double half_top(double t) {
  double s = 2 + t, low = 0, high = 0.9;
  gsl_function f = {top_equation, &s};
  gsl_root_fsolver *solver = gsl_root_fsolver_alloc(gsl_root_fsolver_brent);
  if (solver == NULL || gsl_root_fsolver_set(solver, &f, low, high) != GSL_SUCCESS) return NAN;
  for (int k = 0; k < 60; k++) gsl_root_fsolver_iterate(solver);
  const double u = gsl_root_fsolver_root(solver);
  gsl_root_fsolver_free(solver);
  return s * u;
}

/* y = x_n^2, so that the start at 0 is regular: y' = 2 x_n x_n'. */
static int bottom_equation(double t, const double y[], double dydt[], void *none) {
  const double x = sqrt(fmax(0, y[0]));
  (void)none;
  dydt[0] = 8.0 / 3 * (1 + t + x) - 2 * x;
  return GSL_SUCCESS;
}

static double half_bottom(double t) {
  gsl_odeiv2_system system = {bottom_equation, NULL, 1, NULL};
  gsl_odeiv2_driver *driver =
      gsl_odeiv2_driver_alloc_y_new(&system, gsl_odeiv2_step_rk8pd, 1e-6, 1e-10, 1e-10);
  double from = 0, y[1] = {0};
  const int status = gsl_odeiv2_driver_apply(driver, &from, t, y);
  gsl_odeiv2_driver_free(driver);
  return status == GSL_SUCCESS ? sqrt(y[0]) : NAN;
}

static plateaus plateaus_at(double t) {
  plateaus p = {.t = t, .half_top = half_top(t), .half_bottom = half_bottom(t)};
  p.top = 2 + t - p.half_top;
  p.bottom = 1 + t + p.half_bottom;
  return p;
}

static double start(const double x[3], const void *problem) {
  (void)problem;
  return 2 - fabs(x[0]);
}

static double exact(const double x[3], const void *problem) {
  const plateaus *p = problem;
  return fmin(p->top, fmax(p->bottom, 2 + p->t - fabs(x[0])));
}

typedef struct triangle_case {
  int side;
  double ell, time,
      fixed_stages; /* fixed_stages: super-steps of so many explicit steps; 0: controlled */
} triangle_case;

typedef struct triangle_figures {
  double height; /* of the top over the exact one, less 1 */
  double width;  /* half-width over the exact one, less 1 */
  double l1, closure, heat;
  int64_t steps, stages;
} triangle_figures;

/* Mean of e over the inner half of the plateau, and of e + |x| over the wing. */
static void measure(wend_team *team, const wend_experiment *x, const plateaus *p,
                    triangle_figures *f) {
  wend_sum sum[4];
  for (int k = 0; k < 4; k++) wend_sum_reset(&sum[k]);
  const double wing[2] = {p->half_top + 0.1, 0.9 - p->half_bottom};
  for (int32_t i = 0; i < x->particles.n; i++) {
    const double r = fabs(x->particles.column[WEND_X][i]), v = x->geometry.volume[i];
    const double e = x->particles.column[WEND_ENERGY][i];
    const bool top = r<p->half_top / 2, side = r> wing[0] && r < wing[1];
    const double term[4] = {top ? e : 0, top ? v : 0, side ? e + r * v : 0, side ? v : 0};
    for (int k = 0; k < 4; k++) wend_sum_add(&sum[k], 1, &term[k], 1);
  }
  wend_total(team, 4, sum);
  const double height = wend_sum_value(&sum[0]) / wend_sum_value(&sum[1]);
  const double apex = wend_sum_value(&sum[2]) / wend_sum_value(&sum[3]);
  f->height = height / p->top - 1;
  f->width = (apex - height) / p->half_top - 1;
}

static wend_status run(wend_team *team, const triangle_case *c, double jitter, int seed,
                       triangle_figures *f) {
  const double lo[3] = {-1, -1, 0}, hi[3] = {1, 1, 0};
  const uint64_t mask =
      UINT64_C(1) << WEND_BX | UINT64_C(1) << WEND_ENERGY | UINT64_C(1) << WEND_DENSITY;
  const wend_lattice lattice = {{c->side, c->side, 1}, jitter, (uint64_t)seed};
  const plateaus p = plateaus_at(c->time);
  wend_experiment x = {.domain = wend_scene_domain(2, lo, hi, true),
                       .settings = wend_settings_default()};
  wend_status status = WEND_OK;
  x.settings.streaming_length = c->ell;
  WEND_TRY(wend_lattice_fill(team, &x.domain, &lattice, mask, &x.particles));
  for (int32_t i = 0; i < x.particles.n; i++) {
    x.particles.column[WEND_BX][i] = 1;
    x.particles.column[WEND_DENSITY][i] = 1 / (4 * M_PI);
  }
  WEND_TRY(wend_experiment_begin(team, &x, start, NULL));
  if (c->fixed_stages > 0)
    x.march.settings.fixed_step = c->fixed_stages * x.transport.explicit_step;
  WEND_TRY(wend_experiment_run(team, &x, c->time));
  measure(team, &x, &p, f);
  f->l1 = wend_experiment_norms(team, &x, exact, &p).l1;
  f->closure = wend_ledger_relative(&x.march.ledger);
  f->heat = wend_ledger_balance(&x.march.ledger, WEND_ACCOUNT_STREAMING_HEAT);
  f->steps = x.march.steps;
  f->stages = x.march.stages;
done:
  wend_experiment_end(&x);
  return status;
}

static void print_row(const wend_team *team, const triangle_case *c,
                      const triangle_figures *f) {
  wend_scene_say(team, "%5d %6.0f %6.3f %8.4f%% %8.4f%% %9.2e %8.1e %6lld %7lld\n", c->side,
                 c->ell, c->time, 100 * f->height, 100 * f->width, f->l1, f->closure,
                 (long long)f->steps, (long long)f->stages);
}

wend_status wend_triangle_prove(wend_team *team, const wend_scene_options *options) {
  static const triangle_case cases[] = {
      {64, 5, 0.03, 0},  {64, 20, 0.03, 0},  {64, 80, 0.03, 0}, {64, 5, 0.01, 0},
      {64, 20, 0.01, 0}, {64, 80, 0.01, 0},  {32, 20, 0.03, 0}, {128, 20, 0.03, 0},
      {64, 20, 0.03, 6}, {64, 20, 0.03, 200}};
  enum { CASES = sizeof cases / sizeof cases[0] };
  const double jitter = options->jitter >= 0 ? options->jitter : 0.2;
  const int seed = options->seed_first > 0 ? options->seed_first : 1;
  triangle_figures f[CASES];
  wend_verdict verdict = {0, 0};
  wend_scene_say(team,
                 "triangle: height and half-width of the top plateau against the exact ones\n"
                 " side    ell   time    height     width       L1   closure  steps  stages\n");
  for (int k = 0; k < CASES; k++) {
    const wend_status status = run(team, &cases[k], jitter, seed, &f[k]);
    if (status != WEND_OK) return status;
    print_row(team, &cases[k], &f[k]);
  }
  if (options->jitter >= 0 || options->seed_first > 0) return WEND_OK;
  double scaled[2] = {INFINITY, 0};
  for (int k = 0; k < 3; k++) {
    scaled[0] = fmin(scaled[0], fabs(f[k].height) * cases[k].ell);
    scaled[1] = fmax(scaled[1], fabs(f[k].height) * cases[k].ell);
  }
  wend_verdict_most(team, &verdict, fabs(f[1].height), 0.005, "ell 20: height");
  wend_verdict_most(team, &verdict, fabs(f[2].height), 0.0012, "ell 80: height");
  wend_verdict_most(team, &verdict, scaled[1] / scaled[0], 1.2,
                    "error x ell: largest over smallest, ell 5, 20, 80");
  wend_verdict_most(team, &verdict, fabs(f[9].l1 / f[8].l1 - 1), 0.03,
                    "L1 with steps of 200 explicit ones over that of 6, less 1");
  for (int k = 0; k < 3; k++)
    wend_verdict_most(team, &verdict, f[k].closure, 1e-12, "ell %g: books", cases[k].ell);
  return wend_verdict_close(team, &verdict, "triangle");
}
