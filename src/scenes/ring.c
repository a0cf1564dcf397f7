/* SPDX-License-Identifier: GPL-3.0-or-later
 * ring.c: a patch diffusing along circular field lines (Sharma & Hammett 2007, J. Comput. Phys.
 * 227, 123; the set-up from memory).
 *
 * Box [-1,1]^2, b circular about the origin, kappa_par = 0.01, kappa_perp = 0; 12 for 0.5 < r <
 * 0.7 within pi/12 of theta = pi, else 10. On every circle the heat equation has the exact
 * solution, psi from the patch's middle and D = sqrt(4 kappa t),
 *
 *   T = 10 + sum_q { erfc[(psi + 2 pi q - pi/12) r/D] - erfc[(psi + 2 pi q + pi/12) r/D] }.
 *
 * What the mesh methods beside ours reach at t = 200 was re-computed from their published
 * formulas by an independent short program (forward Euler, against the steady state). */
#include "ring.h"
#include "experiment.h"
#include "lattice.h"
#include "scene.h"
#include <gsl/gsl_math.h>
#include <gsl/gsl_sf_erf.h>
#include <math.h>

static const double kappa = 0.01, inner = 0.5, outer = 0.7, half_patch = M_PI / 12;
static const double base = 10, patch = 12;

static double angle(const double x[3]) { return atan2(x[1], -x[0]); }

static bool in_ring(const double x[3]) {
  const double r = hypot(x[0], x[1]);
  return r > inner && r < outer;
}

static double start(const double x[3], const void *problem) {
  (void)problem;
  return in_ring(x) && fabs(angle(x)) < half_patch ? patch : base;
}

double wend_ring_exact(const double x[3], double t) {
  if (t <= 0) return start(x, NULL);
  if (!in_ring(x)) return base;
  const double psi = angle(x), r = hypot(x[0], x[1]), d = sqrt(4 * kappa * t);
  const int turns = 2 + (int)(d / inner);
  double sum = 0;
  for (int q = -turns; q <= turns; q++)
    sum += gsl_sf_erfc((psi + 2 * M_PI * q - half_patch) * r / d) -
           gsl_sf_erfc((psi + 2 * M_PI * q + half_patch) * r / d);
  return base + (patch - base) / 2 * sum;
}

static double exact(const double x[3], const void *problem) {
  return wend_ring_exact(x, *(const double *)problem);
}

/* One row of the table of cases, with its bars (0: none). */
typedef struct ring_case {
  int side, layers; /* particles a side; layers of a 3-D slab, 1 in 2-D */
  int seeds;        /* seeds 1 to this */
  double jitter, time;
  bool full; /* long: only behind --full */
  double mean_bar, worst_bar;
  double symmetric, monotone; /* mesh figures at this resolution, 0 where there are none */
} ring_case;

static const ring_case cases[] = {
    {50, 1, 5, 0.2, 20, false, 0.0090, 0, 0, 0},
    {100, 1, 3, 0.2, 20, false, 0.0053, 0, 0, 0},
    {50, 1, 5, 0.2, 200, false, 0.0120, 0.0135, 0.01145, 0.03566},
    {100, 1, 3, 0.2, 200, false, 0.0060, 0, 0.00783, 0.02606},
    {200, 1, 1, 0.2, 200, true, 0.0036, 0, 0.00515, 0.01603},
    {50, 1, 5, 1.0, 200, false, 0.031, 0, 0.01145, 0.03566},
    {50, 8, 5, 0.2, 200, false, 0.0108, 0, 0.01145, 0.03566},
    {100, 8, 1, 0.2, 200, true, 0.0068, 0, 0.00783, 0.02606},
};

/* Figures of one case over its seeds. */
typedef struct ring_figures {
  double mean, worst, below, above, closure, seconds;
  int64_t steps, stages;
} ring_figures;

static wend_status begin(wend_team *team, const ring_case *c, int seed, wend_experiment *x) {
  const double depth = (double)c->layers / c->side;
  const double lo[3] = {-1, -1, -depth}, hi[3] = {1, 1, depth};
  const wend_lattice lattice = {{c->side, c->side, c->layers}, c->jitter, (uint64_t)seed};
  const uint64_t mask = UINT64_C(1) << WEND_BX | UINT64_C(1) << WEND_BY |
                        UINT64_C(1) << WEND_ENERGY | UINT64_C(1) << WEND_KPAR;
  *x = (wend_experiment){.domain = wend_scene_domain(c->layers > 1 ? 3 : 2, lo, hi, true),
                         .settings = wend_settings_default()};
  const wend_status status = wend_lattice_fill(team, &x->domain, &lattice, mask, &x->particles);
  if (status != WEND_OK) return status;
  double **column = x->particles.column;
  for (int32_t i = 0; i < x->particles.n; i++) {
    column[WEND_BX][i] = -column[WEND_Y][i];
    column[WEND_BY][i] = column[WEND_X][i];
    column[WEND_KPAR][i] = kappa;
  }
  return wend_experiment_begin(team, x, start, NULL);
}

static wend_status run_seed(wend_team *team, const ring_case *c, int seed, ring_figures *f) {
  wend_experiment x;
  wend_status status = begin(team, c, seed, &x);
  if (status == WEND_OK) status = wend_experiment_run(team, &x, c->time);
  if (status == WEND_OK) {
    const wend_norms norms = wend_experiment_norms(team, &x, exact, &c->time);
    f->mean += norms.l1 / c->seeds;
    f->worst = fmax(f->worst, norms.l1);
    f->below = fmax(f->below, base - x.march.seen_low);
    f->above = fmax(f->above, x.march.seen_high - patch);
    f->closure = fmax(f->closure, wend_ledger_relative(&x.march.ledger));
    f->steps += x.march.steps;
    f->stages += x.march.stages;
  }
  wend_experiment_end(&x);
  return status;
}

static wend_status run_case(wend_team *team, const ring_case *c, int first, ring_figures *f) {
  const double begun = MPI_Wtime();
  *f = (ring_figures){0};
  for (int seed = first; seed < first + c->seeds; seed++) {
    const wend_status status = run_seed(team, c, seed, f);
    if (status != WEND_OK) return status;
  }
  f->seconds = MPI_Wtime() - begun;
  return WEND_OK;
}

static void print_row(const wend_team *team, const ring_case *c, const ring_figures *f) {
  wend_scene_say(team, "%5d x%-2d %6.1f %5.0f %3d  %.5f  %.5f  %8.1e %8.1e  %5lld %7lld %7.1f",
                 c->side, c->layers, c->jitter, c->time, c->seeds, f->mean, f->worst, f->below,
                 f->above, (long long)f->steps, (long long)f->stages, f->seconds);
  if (c->symmetric > 0)
    wend_scene_say(team, "   %.5f  %.5f\n", c->symmetric, c->monotone);
  else
    wend_scene_say(team, "\n");
}

static void print_head(const wend_team *team) {
  wend_scene_say(
      team,
      "ring: L1 = volume-weighted mean |e - exact|; below 10 and above 12 at the end of any "
      "super-step\n"
      " side      jitter  time seeds L1 mean L1 worst  below 10 above 12  steps  stages "
      "seconds   mesh L1: symmetric, best monotone\n");
}

static void judge_case(const wend_team *team, const ring_case *c, const ring_figures *f,
                       wend_verdict *verdict) {
  const char *kind = c->layers > 1 ? "slab" : "plane";
  wend_verdict_most(team, verdict, f->mean, c->mean_bar,
                    "%d a side, %s, jitter %g, t = %g: mean L1", c->side, kind, c->jitter,
                    c->time);
  if (c->worst_bar > 0)
    wend_verdict_most(team, verdict, f->worst, c->worst_bar,
                      "%d a side, %s, jitter %g, t = %g: worst L1", c->side, kind, c->jitter,
                      c->time);
  wend_verdict_most(team, verdict, fmax(f->below, f->above), 1e-11,
                    "%d a side, %s, jitter %g, t = %g: beyond [10, 12]", c->side, kind,
                    c->jitter, c->time);
}

/* A case of the user's own: figures without bars. */
static wend_status run_own(wend_team *team, const wend_scene_options *options) {
  const int first = options->seed_first > 0 ? options->seed_first : 1;
  const ring_case c = {
      .side = options->side > 0 ? options->side : 50,
      .layers = 1,
      .seeds = options->seed_last >= first ? options->seed_last - first + 1 : 1,
      .jitter = options->jitter >= 0 ? options->jitter : 0.2,
      .time = options->time > 0 ? options->time : 200,
  };
  ring_figures f;
  const wend_status status = run_case(team, &c, first, &f);
  if (status == WEND_OK) print_row(team, &c, &f);
  return status;
}

wend_status wend_ring_prove(wend_team *team, const wend_scene_options *options) {
  enum { CASES = sizeof cases / sizeof cases[0] };
  ring_figures figures[CASES];
  wend_verdict verdict = {0, 0};
  print_head(team);
  if (options->side > 0 || options->time > 0 || options->jitter >= 0 || options->seed_first > 0)
    return run_own(team, options);
  for (int k = 0; k < CASES; k++) {
    if (cases[k].full && !options->full) continue;
    const wend_status status = run_case(team, &cases[k], 1, &figures[k]);
    if (status != WEND_OK) return status;
    print_row(team, &cases[k], &figures[k]);
  }
  for (int k = 0; k < CASES; k++)
    if (!cases[k].full || options->full) judge_case(team, &cases[k], &figures[k], &verdict);
  return wend_verdict_close(team, &verdict, "ring");
}
