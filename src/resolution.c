/* SPDX-License-Identifier: LGPL-3.0-or-later
 * resolution.c: how well particles resolve the CR energy they carry.
 *
 * Numerical diffusion across the field: an oblique Gaussian of width s0 = 6.4 spacings, on
 * particles with 22 neighbours in 2-D (H = sqrt(22/pi) spacings), spreads across the field with
 * 2.3e-4 of kappa_par (`wend prove blob`, five seeds: 2e-4 at jitter 0.2, 1.3e-3 at jitter
 * 0.5). At s0 = 3.2 spacings it is 8e-4 at jitter 0.2: the figure is scaled by (H/s)^2, as
 * truncation errors of gradients that are exact for linear fields, with the local scale height
 * s = e / |grad_perp e| of one direction across the field. In a Gaussian the mean of 1/s^2 over
 * its energy is 1/s0^2. Where s < H nothing more is claimed than at s = H. */
#include "resolution.h"
#include "gradient.h"
#include "total.h"
#include <math.h>
#include <stdlib.h>

/* 2.3e-4 (6.4 spacings / H)^2, H^2 = 22/pi spacings^2. */
const double wend_resolution_smearing = 2.3e-4 * 6.4 * 6.4 * M_PI / 22;

typedef struct work {
  double *density;       /* [local] e */
  double (*inverse)[6];  /* [owned] */
  double (*gradient)[3]; /* [owned] */
  double *term;          /* [owned] of one sum */
} work;

static void free_work(work *w) {
  free(w->density);
  free(w->inverse);
  free(w->gradient);
  free(w->term);
}

static wend_status take_gradients(wend_team *team, wend_geometry *g, const double *energy,
                                  work *w) {
  const wend_neighbours *near = &g->near;
  wend_status status;
  w->density = wend_allocate(team, near->local, sizeof *w->density);
  w->inverse = wend_allocate(team, near->owned, sizeof *w->inverse);
  w->gradient = wend_allocate(team, near->owned, sizeof *w->gradient);
  w->term = wend_allocate(team, near->owned, sizeof *w->term);
  WEND_TRY(wend_agree(team));
  for (int32_t i = 0; i < near->owned; i++) w->density[i] = energy[i] / g->volume[i];
  WEND_TRY(wend_halo_exchange(team, &g->near.halo, w->density, 1, 1, sizeof(double)));
  const wend_batch_source source = {&near->pairs, &g->domain, g->smoothing,
                                    (const double(*)[4])near->place};
  wend_gradient_matrices(&near->pairs, near->all, &g->domain, g->smoothing, source.place,
                         w->inverse);
  wend_gradient_apply(&source, near->all, (const double(*)[6])w->inverse, w->density,
                      w->gradient);
done:
  return status;
}

/* Squared slopes of e along and across the field. */
static void slopes(const double b[3], const double gradient[3], double *along2,
                   double *across2) {
  double g = 0, all2 = 0;
  for (int a = 0; a < 3; a++) {
    g += b[a] * gradient[a];
    all2 += gradient[a] * gradient[a];
  }
  const bool magnetised = b[0] != 0 || b[1] != 0 || b[2] != 0;
  *along2 = magnetised ? g * g : all2;
  *across2 = magnetised ? fmax(0, all2 - g * g) : 0;
}

enum { UNRESOLVED, SMEARING, PARALLEL, PERPENDICULAR, TERMS };

static double term_of(const wend_transport *t, const work *w, int32_t i, int which) {
  const double e = w->density[i], h = t->geometry->near.place[i][3];
  double along2, across2;
  slopes(t->field[i], w->gradient[i], &along2, &across2);
  switch (which) {
  case UNRESOLVED:
    return h * sqrt(along2) > e;
  case SMEARING:
    return e > 0 ? t->kappa[i][0] * fmin(1, h * h * across2 / (e * e)) : 0;
  case PARALLEL:
    return t->kappa[i][0];
  default:
    return t->kappa[i][1];
  }
}

wend_status wend_resolution_measure(wend_team *team, const wend_transport *transport,
                                    const double *energy, wend_resolution *resolution) {
  wend_geometry *g = transport->geometry;
  const int32_t n = g->near.owned;
  double mean[TERMS] = {0};
  work w = {.density = NULL};
  wend_status status;
  WEND_TRY(take_gradients(team, g, energy, &w));
  const double total = wend_total_of(team, n, energy);
  for (int k = 0; k < TERMS && total > 0; k++) {
    for (int32_t i = 0; i < n; i++) w.term[i] = energy[i] * term_of(transport, &w, i, k);
    mean[k] = wend_total_of(team, n, w.term) / total;
  }
  *resolution = (wend_resolution){.unresolved = mean[UNRESOLVED],
                                  .kappa_par = mean[PARALLEL],
                                  .kappa_perp = mean[PERPENDICULAR],
                                  .smearing = wend_resolution_smearing * mean[SMEARING] /
                                              (g->domain.dim - 1),
                                  .limited = wend_transport_limited_share(team, transport)};
  status = wend_agree(team);
done:
  free_work(&w);
  return status;
}
