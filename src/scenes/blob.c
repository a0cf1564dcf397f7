/* SPDX-License-Identifier: GPL-3.0-or-later
 * blob.c: a Gaussian spreading along an oblique uniform field.
 *
 * Box [-1,1]^2 periodic, b at 0.5 rad to the x axis, s0 = 0.1, kappa = 0.01, background 1e-3 of
 * the peak, to t = 1. Exact: the variance along b is s0^2 + 2 kappa_par t, across s0^2 + 2
 * kappa_perp t, and the peak falls as the product of s0/s(t); images at whole periods are
 * summed.
 *
 * The effective kappa is the growth of the measured second moment over that of the exact
 * solution sampled on the same particles. Its bias is the mean of sum_j A_ij.r_ij / (2 D V_i),
 * which no resolution removes: the sharpest test of the faces. */
#include "blob.h"
#include "lattice.h"
#include "total.h"
#include <math.h>
#include <stdlib.h>

static const double angle = 0.5, s0 = 0.1, kappa = 0.01, background = 1e-3, end_time = 1;

/* Where a particle of the even lattice is put. */
static double stretch(const wend_blob_case *c, double u) {
  if (c->spacing == WEND_BLOB_SMOOTH) return u + 0.6 / M_PI * sin(M_PI * u);
  return u;
}

static void frame(const double x[3], double *along, double *across) {
  *along = cos(angle) * x[0] + sin(angle) * x[1];
  *across = cos(angle) * x[1] - sin(angle) * x[0];
}

/* The problem and the time for which its exact solution is wanted. */
typedef struct moment_of_time {
  const wend_blob_case *c;
  double t;
} moment_of_time;

static double exact(const double x[3], const void *problem) {
  const moment_of_time *p = problem;
  const double par = s0 * s0 + 2 * kappa * p->c->parallel * p->t;
  const double perp = s0 * s0 + 2 * kappa * p->c->perpendicular * p->t;
  double sum = 0;
  for (int i = -1; i <= 1; i++)
    for (int j = -1; j <= 1; j++) {
      const double image[3] = {x[0] + 2 * i, x[1] + 2 * j, 0};
      double along, across;
      frame(image, &along, &across);
      sum += exp(-along * along / (2 * par) - across * across / (2 * perp));
    }
  return background + s0 * s0 / sqrt(par * perp) * sum;
}

/* Second moments along and across the field about the middle, of e less the background. */
static void moments(wend_team *team, const wend_experiment *x, const double *e, double m[2]) {
  enum { MASS, ALONG, ACROSS, SUMS };
  wend_sum sum[SUMS];
  for (int k = 0; k < SUMS; k++) wend_sum_reset(&sum[k]);
  for (int32_t i = 0; i < x->particles.n; i++) {
    const double place[3] = {x->particles.column[WEND_X][i], x->particles.column[WEND_Y][i], 0};
    const double weight = (e[i] - background) * x->geometry.volume[i];
    double along, across;
    frame(place, &along, &across);
    const double term[SUMS] = {weight, weight * along * along, weight * across * across};
    for (int k = 0; k < SUMS; k++) wend_sum_add(&sum[k], 1, &term[k], 1);
  }
  wend_total(team, SUMS, sum);
  for (int k = 0; k < 2; k++)
    m[k] = wend_sum_value(&sum[ALONG + k]) / wend_sum_value(&sum[MASS]);
}

static void sample(const wend_experiment *x, const moment_of_time *p, double *e) {
  for (int32_t i = 0; i < x->particles.n; i++) {
    const double place[3] = {x->particles.column[WEND_X][i], x->particles.column[WEND_Y][i], 0};
    e[i] = exact(place, p);
  }
}

static void measure(wend_team *team, const wend_blob_case *c, const wend_experiment *x,
                    double *e, wend_blob_figures *f) {
  double ours[2], begun[2], ended[2];
  const moment_of_time start = {c, 0}, end = {c, end_time};
  for (int32_t i = 0; i < x->particles.n; i++)
    e[i] = x->particles.column[WEND_ENERGY][i] / x->geometry.volume[i];
  moments(team, x, e, ours);
  sample(x, &start, e);
  moments(team, x, e, begun);
  sample(x, &end, e);
  moments(team, x, e, ended);
  const wend_norms norms = wend_experiment_norms(team, x, exact, &end);
  const int main_axis = c->parallel > 0 ? 0 : 1;
  f->kappa = (ours[main_axis] - begun[main_axis]) / (ended[main_axis] - begun[main_axis]);
  f->across =
      (ours[1 - main_axis] - begun[1 - main_axis]) / (ours[main_axis] - begun[main_axis]);
  f->l1 = norms.l1;
  f->beyond = fmax(x->march.low - x->march.seen_low, x->march.seen_high - x->march.high);
  f->steps = x->march.steps;
  f->stages = x->march.stages;
  f->report = x->geometry.report;
}

/* The lattices of the case: one over the box, or a coarse and a fine half that meet at x = 0.
 */
static wend_status fill(wend_team *team, const wend_blob_case *c, int seed,
                        wend_experiment *x) {
  const uint64_t mask = UINT64_C(1) << WEND_BX | UINT64_C(1) << WEND_BY |
                        UINT64_C(1) << WEND_ENERGY | UINT64_C(1) << WEND_KPAR |
                        UINT64_C(1) << WEND_KPERP;
  wend_lattice lattice = {{c->side, c->side, 1}, c->jitter, (uint64_t)seed};
  if (c->spacing != WEND_BLOB_JUMP)
    return wend_lattice_fill(team, &x->domain, &lattice, mask, &x->particles);
  wend_domain half = x->domain;
  wend_particles fine;
  half.hi[0] = 0;
  lattice.side[0] = c->side / 2;
  wend_status status = wend_lattice_fill(team, &half, &lattice, mask, &x->particles);
  if (status != WEND_OK) return status;
  half.lo[0] = 0;
  half.hi[0] = 1;
  lattice.side[0] = 3 * c->side / 2;
  lattice.side[1] = 3 * c->side;
  status = wend_lattice_fill(team, &half, &lattice, mask, &fine);
  if (status != WEND_OK) return status;
  for (int32_t i = 0; i < fine.n; i++) fine.id[i] += (uint64_t)c->side * (uint64_t)c->side;
  status = wend_lattice_join(team, &x->particles, &fine);
  wend_particles_reset(&fine);
  return status;
}

static void dress(const wend_blob_case *c, wend_experiment *x) {
  double **column = x->particles.column;
  for (int32_t i = 0; i < x->particles.n; i++) {
    for (int a = 0; a < 2; a++) column[WEND_X + a][i] = stretch(c, column[WEND_X + a][i]);
    column[WEND_BX][i] = c->magnetised ? cos(angle) : 0;
    column[WEND_BY][i] = c->magnetised ? sin(angle) : 0;
    /* Without a field the coefficient is (kappa_par + 2 kappa_perp)/3: equal ones stay what
     * they are. */
    column[WEND_KPAR][i] = kappa * c->parallel;
    column[WEND_KPERP][i] = kappa * c->perpendicular;
  }
}

wend_status wend_blob_run(wend_team *team, const wend_blob_case *c, int seed,
                          wend_blob_figures *figures) {
  wend_status status = WEND_OK;
  const double lo[3] = {-1, -1, 0}, hi[3] = {1, 1, 0};
  const moment_of_time start = {c, 0};
  double *e = NULL;
  wend_experiment x = {.domain = wend_scene_domain(2, lo, hi, true),
                       .settings = wend_settings_default()};
  x.settings.close_faces = c->faces >= WEND_BLOB_CLOSED;
  x.settings.fix_volumes = c->faces >= WEND_BLOB_EXACT;
  WEND_TRY(fill(team, c, seed, &x));
  dress(c, &x);
  WEND_TRY(wend_experiment_begin(team, &x, exact, &start));
  WEND_TRY(wend_experiment_run(team, &x, end_time));
  e = wend_allocate(team, x.particles.n, sizeof *e);
  WEND_TRY(wend_agree(team));
  measure(team, c, &x, e, figures);
done:
  free(e);
  wend_experiment_end(&x);
  return status;
}
