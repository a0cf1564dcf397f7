/* SPDX-License-Identifier: GPL-3.0-or-later
 * web.c: particles on a jittered lattice with their lists, volumes, gradients and faces. */
#include "web.h"

#include "cloud.h"
#include "gradient.h"
#include "surface.h"
#include "volume.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

static const wend_smoothing *smoothing(void) { return wend_smoothing_find("wendland-c2"); }

/* Back into [-1, 1): around periodic axes, reflected at others. */
static double settle(const wend_domain *d, int axis, double x) {
  if (d->period[axis] > 0) return x - 2.0 * floor((x + 1.0) / 2.0);
  return x < -1.0 ? -2.0 - x : x >= 1.0 ? 2.0 - x : x;
}

static void place_all(lists *l, const web_plan *p, uint64_t seed) {
  const double spacing = 2.0 / p->side;
  for (int32_t i = 0; i < l->n; i++) {
    int32_t rest = i;
    for (int a = 0; a < p->dim; a++) {
      const double push = p->jitter * (2.0 * cloud_random(&seed) - 1.0);
      const double x = -1.0 + (rest % p->side + 0.5 + push) * spacing;
      l->place[i][a] = settle(&l->domain, a, x);
      rest /= p->side;
    }
    l->place[i][3] = p->support * spacing * (0.8 + 0.4 * cloud_random(&seed));
  }
}

web web_create(const web_plan *plan, uint64_t seed) {
  const int32_t n = (int32_t)lround(pow(plan->side, plan->dim));
  web w = {.l = lists_create(lists_box(plan->dim, plan->periodic), n)};
  place_all(&w.l, plan, seed);
  lists_find(&w.l, n, plan->extra);
  w.volume = calloc((size_t)n, sizeof *w.volume);
  w.inverse = calloc((size_t)n, sizeof *w.inverse);
  w.surface = calloc((size_t)n, sizeof *w.surface);
  w.diagonal = calloc((size_t)n, sizeof *w.diagonal);
  w.unknown = calloc((size_t)n, sizeof *w.unknown);
  w.field = calloc((size_t)n, sizeof *w.field);
  w.kappa = calloc((size_t)n, sizeof *w.kappa);
  for (int d = 0; d < 3; d++) {
    w.faces.area[d] = web_column(&w);
    w.faces.arm[d] = web_column(&w);
  }
  w.faces.weight = web_column(&w);
  const double(*place)[4] = (const double(*)[4])w.l.place;
  wend_volume_estimate(&w.l.pairs, w.l.all, &w.l.domain, smoothing(), place, w.volume);
  wend_gradient_matrices(&w.l.pairs, w.l.all, &w.l.domain, smoothing(), place, w.inverse);
  if (plan->periodic != (1u << plan->dim) - 1u)
    wend_surface_find(&w.l.pairs, w.l.all, &w.l.domain, smoothing(), place, w.surface);
  const wend_face_source source = web_source(&w);
  wend_faces_raw(&w.l.pairs, w.l.all, &source, &w.faces, w.diagonal);
  return w;
}

void web_destroy(web *w) {
  free(w->volume);
  free(w->inverse);
  free(w->surface);
  free(w->diagonal);
  free(w->unknown);
  free(w->field);
  free(w->kappa);
  for (int d = 0; d < 3; d++) {
    free(w->faces.area[d]);
    free(w->faces.arm[d]);
  }
  free(w->faces.weight);
  lists_destroy(&w->l);
}

wend_face_source web_source(const web *w) {
  return (wend_face_source){.domain = &w->l.domain,
                            .smoothing = smoothing(),
                            .place = (const double(*)[4])w->l.place,
                            .volume = w->volume,
                            .inverse = (const double(*)[6])w->inverse};
}

void web_magnetise(web *w, bool across, uint64_t seed) {
  const double turn = 6.28 * cloud_random(&seed), wall = 2 * cloud_random(&seed) - 1;
  const double null = 2 * cloud_random(&seed) - 1;
  for (int32_t i = 0; i < w->l.n; i++) {
    const double *x = w->l.place[i];
    const bool beyond = x[0] > wall, none = hypot(x[0] - null, x[1] + null) < 0.4;
    const double angle = turn + 2 * x[1] + (beyond ? 1.5 : 0);
    const double tilt = w->l.domain.dim == 3 ? sin(turn + x[0] + 2 * x[2]) : 0;
    w->field[i][0] = none ? 0 : cos(tilt) * cos(angle);
    w->field[i][1] = none ? 0 : cos(tilt) * sin(angle);
    w->field[i][2] = none ? 0 : sin(tilt);
    w->kappa[i][0] = (beyond ? 0.01 : 1) * (0.5 + cloud_random(&seed));
    w->kappa[i][1] = across ? 0.1 * cloud_random(&seed) : 0;
    if (none) w->kappa[i][0] = w->kappa[i][1];
  }
}

wend_operator_source web_operator(const web *w) {
  return (wend_operator_source){.face = web_source(w),
                                .field = (const double(*)[3])w->field,
                                .kappa = (const double(*)[2])w->kappa,
                                .angle_power = 4,
                                .angle_share = 0.6};
}

int64_t web_entries(const web *w) { return w->l.pairs.first[w->l.pairs.slices]; }

float *web_column(const web *w) { return calloc((size_t)web_entries(w) + 1, sizeof(float)); }

int64_t web_twin(const web *w, int32_t i, int64_t k) {
  const int32_t j = w->l.pairs.index[k];
  for (int32_t m = 0; m < w->l.pairs.count[j]; m++) {
    const int64_t twin = wend_pairs_entry(&w->l.pairs, j, m);
    if (w->l.pairs.index[twin] == i) return twin;
  }
  return -1;
}

void web_sweep(web *w, double lowest, int sweeps) {
  const double both[2] = {1, 1};
  const size_t n = (size_t)w->l.n;
  double(*direction)[4] = calloc(n, sizeof *direction);
  wend_chebyshev chebyshev = wend_chebyshev_begin(lowest, 4);
  for (int k = 0; k < sweeps; k++) {
    double(*residual)[4] = web_residual(w);
    wend_faces_update(w->l.n, &chebyshev, both, (const double(*)[2])w->diagonal,
                      (const double(*)[4])residual, w->surface, direction, w->unknown);
    wend_chebyshev_next(&chebyshev);
    free(residual);
  }
  free(direction);
}

void web_close(web *w) {
  web_sweep(w, 0.01, 400);
  wend_faces_apply(&w->l.pairs, w->l.all, &w->faces, (const double(*)[4])w->unknown);
}

double (*web_residual(const web *w))[4] {
  double(*residual)[4] = calloc((size_t)w->l.n, sizeof *residual);
  wend_faces_residual(&w->l.pairs, w->l.all, w->l.domain.dim, &w->faces, w->volume,
                      (const double(*)[4])w->unknown, residual);
  return residual;
}

bool web_same_float(float a, float b) { return memcmp(&a, &b, sizeof a) == 0; }

bool web_same(double a, double b) { return memcmp(&a, &b, sizeof a) == 0; }
