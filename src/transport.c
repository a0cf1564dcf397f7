/* SPDX-License-Identifier: LGPL-3.0-or-later
 * transport.c: the right-hand side of CR transport, halos overlapped with interior work. */
#include "transport.h"
#include "exchange.h"
#include "sharpen.h"
#include <math.h>
#include <stdlib.h>
#include <string.h>

/* One pass over some slices. */
typedef void (*pass)(wend_transport *t, wend_slices slices);

/* Fills the ghosts of a field while the inside is worked on, then works on the border. */
static wend_status overlapped(wend_team *team, wend_transport *t, double *field, int stride,
                              int width, pass work) {
  const wend_neighbours *near = &t->geometry->near;
  wend_status status =
      wend_halo_begin(team, &t->geometry->near.halo, field, stride, width, sizeof(double));
  if (status != WEND_OK) return status;
  work(t, near->interior);
  status = wend_halo_end(team, &t->geometry->near.halo);
  work(t, near->border);
  return status;
}

static wend_streaming_source streaming_source(const wend_transport *t) {
  return (wend_streaming_source){.kappa = (const double(*)[2])t->kappa,
                                 .speed = (const double(*)[2])t->speed};
}

static void flux(wend_transport *t, wend_slices slices) {
  const wend_pairs *pairs = &t->geometry->near.pairs;
  const wend_streaming_source source = streaming_source(t);
  if (t->streams)
    wend_streaming_flux(pairs, slices, t->slope, &source, (double(*)[2])t->state);
  else if (t->along)
    wend_exchange_flux_along(pairs, slices, t->slope, t->kappa_along, (double(*)[2])t->state);
  else
    wend_exchange_flux_full(pairs, slices, t->gradient, (const double(*)[3])t->field,
                            (const double(*)[2])t->kappa, (double(*)[4])t->state);
}

static void sharpen(wend_transport *t, wend_slices slices) {
  wend_sharpen_flux(&t->geometry->near.pairs, slices, t->mu, t->state, t->width, t->sharp);
}

/* Sharpened fluxes take the place of the plain ones once no row needs those any more. */
static wend_status sharpen_fluxes(wend_team *team, wend_transport *t) {
  const int width = t->width - 1;
  const wend_status status = overlapped(team, t, t->state + 1, t->width, width, sharpen);
  for (int64_t i = 0; i < t->geometry->near.owned; i++)
    memcpy(&t->state[i * t->width + 1], &t->sharp[i * width], (size_t)width * sizeof(double));
  return status;
}

static void ratios(wend_transport *t, wend_slices slices) {
  const wend_pairs *pairs = &t->geometry->near.pairs;
  const wend_streaming_source source = streaming_source(t);
  if (t->streams)
    wend_streaming_ratios(pairs, slices, t->alpha, t->beta, &source, &t->stream, t->sum_full,
                          (const double(*)[2])t->state, t->kept, t->antidiffusive, t->ratio);
  else if (t->along)
    wend_exchange_ratios_along(pairs, slices, t->alpha, t->beta, t->kept, t->sum_full,
                               (const double(*)[2])t->state, t->antidiffusive, t->ratio);
  else
    wend_exchange_ratios_full(pairs, slices, t->geometry->faces.area, t->kept, t->sum_full,
                              (const double(*)[4])t->state, t->antidiffusive, t->ratio);
  if (t->limited) return;
  for (int32_t i = 0; i < t->geometry->near.owned; i++) t->ratio[i][0] = t->ratio[i][1] = 1;
}

static void exchange(const wend_transport *t, wend_slices slices, double *rate) {
  wend_exchange_rate(&t->geometry->near.pairs, slices, t->kept, t->state, t->width,
                     t->antidiffusive, (const double(*)[2])t->ratio, rate);
}

/* Heat is summed over pairs, which may be negative at a particle, then clipped there. */
static void heat_gas(wend_transport *t, double *rate) {
  const wend_neighbours *near = &t->geometry->near;
  for (int32_t i = 0; i < near->local; i++) t->root[i] = sqrt(sqrt(t->state[2 * (int64_t)i]));
  wend_streaming_heat(&near->pairs, near->all, t->kept, t->stream.fraction,
                      (const double(*)[2])t->state, t->root, t->antidiffusive,
                      (const double(*)[2])t->ratio, t->heat);
  for (int32_t i = 0; i < near->owned; i++) {
    t->heat[i] = fmax(0, t->heat[i]);
    rate[i] -= t->heat[i];
  }
}

static void let_escape(const wend_transport *t, double *rate, double *escaped) {
  for (int32_t i = 0; i < t->geometry->near.owned; i++) {
    escaped[i] = t->escape[i] * t->state[(int64_t)i * t->width];
    rate[i] -= escaped[i];
  }
}

wend_status wend_transport_rate(wend_team *team, wend_transport *transport,
                                const double *energy, double *rate, double *escaped) {
  wend_transport *t = transport;
  wend_halo *halo = &t->geometry->near.halo;
  for (int32_t i = 0; i < t->geometry->near.owned; i++)
    t->state[(int64_t)i * t->width] = energy[i] / t->geometry->volume[i];
  t->applications++;
  wend_status status = overlapped(team, t, t->state, t->width, 1, flux);
  if (status == WEND_OK && t->mu != NULL) status = sharpen_fluxes(team, t);
  if (status != WEND_OK) return status;
  status = overlapped(team, t, t->state + 1, t->width, t->width - 1, ratios);
  if (status != WEND_OK) return status;
  status = wend_halo_begin(team, halo, t->ratio, 2, 2, sizeof(double));
  if (status != WEND_OK) return status;
  exchange(t, t->geometry->near.interior, rate);
  status = wend_halo_end(team, halo);
  exchange(t, t->geometry->near.border, rate);
  if (t->streams) heat_gas(t, rate);
  if (t->escapes) let_escape(t, rate, escaped);
  return status;
}

double wend_transport_limited_share(wend_team *team, const wend_transport *transport) {
  int64_t count[2];
  wend_exchange_count_limited(&transport->geometry->near.pairs, transport->geometry->near.all,
                              transport->antidiffusive, (const double(*)[2])transport->ratio,
                              count);
  wend_team_count(team, 2, count);
  return count[1] > 0 ? (double)count[0] / (double)count[1] : 0;
}

void wend_transport_reset(wend_transport *transport) {
  wend_transport *t = transport;
  free(t->field);
  free(t->kappa);
  free(t->kappa_along);
  free(t->slope);
  free(t->alpha);
  free(t->beta);
  for (int d = 0; d < 3; d++) free(t->gradient[d]);
  free(t->kept);
  free(t->mu);
  free(t->sharp);
  free(t->sum_full);
  free(t->escape);
  free(t->speed);
  free(t->stream.pull);
  free(t->stream.share);
  free(t->stream.reach);
  free(t->stream.fraction);
  free(t->root);
  free(t->heat);
  free(t->state);
  free(t->antidiffusive);
  free(t->ratio);
  memset(t, 0, sizeof *t);
}
