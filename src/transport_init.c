/* SPDX-License-Identifier: LGPL-3.0-or-later
 * transport_init.c: builds the transport operator on a geometry. */
#include "operator.h"
#include "sharpen.h"
#include "transport.h"
#include <inttypes.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

static double value_of(const wend_particles *p, wend_column column, int32_t i) {
  return p->column[column] != NULL ? p->column[column][i] : 0;
}

/* Unit field, and the coefficients along and across it; where B = 0 both are the isotropic mean
 * of a tangled field, (kappa_par + 2 kappa_perp)/3, or nothing. */
static void magnetise(wend_team *team, const wend_settings *settings, const wend_particles *p,
                      wend_transport *t) {
  for (int32_t i = 0; i < p->n; i++) {
    double b[3], b2 = 0;
    for (int a = 0; a < 3; a++) {
      b[a] = value_of(p, WEND_BX + a, i);
      b2 = fmax(b2, fabs(b[a]));
    }
    const double largest = b2 > 0 ? b2 : 1;
    double length = 0;
    for (int a = 0; a < 3; a++) length += (b[a] / largest) * (b[a] / largest);
    length = sqrt(length);
    for (int a = 0; a < 3; a++) t->field[i][a] = b2 > 0 ? b[a] / largest / length : 0;
    const double par = value_of(p, WEND_KPAR, i), perp = value_of(p, WEND_KPERP, i);
    if (!(par >= 0) || !(perp >= 0) || isinf(par) || isinf(perp) || !isfinite(length))
      wend_fail(team, WEND_ERR_PARTICLES,
                "particle %" PRIu64
                ": kappa_par %g, kappa_perp %g, B (%g, %g, %g): coefficients "
                "must be finite and not negative, and the field finite",
                p->id[i], par, perp, b[0], b[1], b[2]);
    const double mean = settings->isotropic_unmagnetised ? (par + 2 * perp) / 3 : 0;
    t->kappa[i][0] = b2 > 0 ? par : mean;
    t->kappa[i][1] = b2 > 0 ? perp : mean;
  }
}

static bool wants_streaming(const wend_settings *settings) {
  return settings->streaming_length > 0 || settings->streaming_supports > 0;
}

/* v_A = |B| / sqrt(4 pi rho_ion), Gaussian, up to the ceiling; and the regularisation length.
 */
static void set_speeds(wend_team *team, const wend_settings *settings, const wend_particles *p,
                       wend_transport *t) {
  const double ceiling = settings->alfven_ceiling > 0 ? settings->alfven_ceiling : INFINITY;
  if (p->column[WEND_DENSITY] == NULL)
    wend_fail(team, WEND_ERR_PARTICLES, "streaming needs the mass density of the particles");
  for (int32_t i = 0; team->status == WEND_OK && i < p->n; i++) {
    const double b =
        hypot(hypot(value_of(p, WEND_BX, i), value_of(p, WEND_BY, i)), value_of(p, WEND_BZ, i));
    const double ionised = p->column[WEND_IONISED] != NULL ? p->column[WEND_IONISED][i] : 1;
    const double rho = ionised * p->column[WEND_DENSITY][i];
    const double speed = b > 0 ? b / sqrt(4 * M_PI * rho) : 0;
    if (!(rho >= 0) || isnan(speed) || (isinf(speed) && isinf(ceiling)))
      wend_fail(team, WEND_ERR_PARTICLES,
                "particle %" PRIu64
                ": ion density %g and field %g give no Alfven speed: set a ceiling "
                "(streaming: alfven_ceiling) or mend the particle",
                p->id[i], rho, b);
    t->ceilings += speed > ceiling;
    t->speed[i][0] = fmin(speed, ceiling);
    t->speed[i][1] = settings->streaming_length > 0
                         ? settings->streaming_length
                         : settings->streaming_supports * t->geometry->near.place[i][3];
  }
}

static wend_status prepare_streaming(wend_team *team, const wend_settings *settings,
                                     const wend_particles *p, wend_transport *t) {
  wend_status status = WEND_OK;
  t->streams = wants_streaming(settings);
  if (!t->streams) return WEND_OK;
  if (!t->along)
    wend_fail(
        team, WEND_ERR_SETUP,
        "streaming beside perpendicular diffusion is not there yet: set the perpendicular "
        "diffusivity to 0, and diffusion.unmagnetised to none where B = 0");
  t->speed = wend_allocate(team, t->geometry->near.local, sizeof *t->speed);
  WEND_TRY(wend_agree(team));
  set_speeds(team, settings, p, t);
  wend_halo_exchange(team, &t->geometry->near.halo, t->speed, 2, 2, sizeof(double));
  WEND_TRY(wend_agree(team));
  wend_team_count(team, 1, &t->ceilings);
done:
  return status;
}

static wend_status build_streaming(wend_team *team, const wend_operator_source *source,
                                   wend_transport *t, double *sum_both) {
  const wend_geometry *g = t->geometry;
  const int64_t entries = wend_neighbours_entries(&g->near);
  float **const column[] = {&t->stream.pull, &t->stream.share, &t->stream.reach,
                            &t->stream.fraction};
  for (size_t k = 0; k < sizeof column / sizeof *column; k++)
    *column[k] = wend_allocate(team, entries, sizeof(float));
  t->root = wend_allocate(team, g->near.local, sizeof *t->root);
  t->heat = wend_allocate(team, g->near.owned, sizeof *t->heat);
  const wend_status status = wend_agree(team);
  if (status != WEND_OK) return status;
  const wend_streaming_source streaming = {.kappa = source->kappa,
                                           .speed = (const double(*)[2])t->speed};
  wend_streaming_columns(&g->near.pairs, g->near.all, source, &g->faces, &t->stream);
  wend_streaming_bounds(&g->near.pairs, g->near.all, &source->face, &streaming, &t->stream,
                        t->sum_full, sum_both);
  return WEND_OK;
}

static wend_status exchange_coefficients(wend_team *team, wend_transport *t) {
  wend_halo *halo = &t->geometry->near.halo;
  wend_halo_exchange(team, halo, t->field, 3, 3, sizeof(double));
  wend_halo_exchange(team, halo, t->kappa, 2, 2, sizeof(double));
  const wend_status status = wend_agree(team);
  if (status != WEND_OK) return status;
  double across = 0;
  for (int32_t i = 0; i < t->geometry->near.owned; i++) across = fmax(across, t->kappa[i][1]);
  wend_team_max(team, 1, &across);
  t->along = across == 0;
  t->width = t->along ? 2 : 4;
  return WEND_OK;
}

static bool any_open(const wend_domain *domain) {
  return domain->open[0] || domain->open[1] || domain->open[2];
}

/* Columns take the place of those they are made of, to keep the peak of memory low: slopes or
 * gradients that of arms, alpha and beta that of areas; the inverse matrices have served. */
static wend_status build_pairs(wend_team *team, const wend_operator_source *source,
                               bool sharpen, wend_transport *t) {
  wend_geometry *g = t->geometry;
  wend_faces *faces = &g->faces;
  const wend_pairs *pairs = &g->near.pairs;
  if (sharpen) t->mu = wend_allocate(team, wend_neighbours_entries(&g->near), sizeof(float));
  const wend_status status = wend_agree(team);
  if (status != WEND_OK) return status;
  if (t->mu != NULL)
    wend_sharpen_weights(pairs, g->near.all, &source->face, source->field, t->along, faces->arm,
                         t->mu);
  if (t->along) {
    wend_operator_slope(pairs, g->near.all, source, faces->arm, faces->arm[0]);
    wend_operator_along(pairs, g->near.all, source->field, faces->area, faces->area[0],
                        faces->area[1]);
    t->slope = faces->arm[0];
    t->alpha = faces->area[0];
    t->beta = faces->area[1];
    faces->arm[0] = faces->area[0] = faces->area[1] = NULL;
    wend_geometry_release_faces(g);
  } else {
    wend_operator_gradient(pairs, g->near.all, source, faces->arm, faces->arm);
    for (int d = 0; d < 3; d++) {
      t->gradient[d] = faces->arm[d];
      faces->arm[d] = NULL;
    }
  }
  free(g->inverse);
  g->inverse = NULL;
  return WEND_OK;
}

static void limit_step(wend_team *team, wend_transport *t, const double *sum_both) {
  double fastest = 0;
  for (int32_t i = 0; i < t->geometry->near.owned; i++) {
    const double out = sum_both[i] + (t->escapes ? t->escape[i] : 0);
    fastest = fmax(fastest, out / t->geometry->volume[i]);
  }
  wend_team_max(team, 1, &fastest);
  t->explicit_step = 1 / fastest;
}

static wend_status allocate(wend_team *team, wend_transport *t) {
  const wend_neighbours *near = &t->geometry->near;
  t->kept = wend_allocate(team, wend_neighbours_entries(near), sizeof *t->kept);
  t->sum_full = wend_allocate(team, near->owned, sizeof *t->sum_full);
  t->kappa_along = wend_allocate(team, near->owned, sizeof *t->kappa_along);
  if (t->escapes) t->escape = wend_allocate(team, near->owned, sizeof *t->escape);
  return wend_agree(team);
}

/* One exchange of the widest field makes all room that those of a rate need: they must not
 * fail, since nobody agrees on it inside a stage. */
static wend_status allocate_state(wend_team *team, wend_transport *t) {
  wend_status status = WEND_OK;
  wend_neighbours *near = &t->geometry->near;
  t->antidiffusive =
      wend_allocate(team, wend_neighbours_entries(near), sizeof *t->antidiffusive);
  t->state = wend_allocate(team, (int64_t)near->local * t->width, sizeof *t->state);
  t->ratio = wend_allocate(team, near->local, sizeof *t->ratio);
  if (t->mu != NULL)
    t->sharp = wend_allocate(team, (int64_t)near->owned * (t->width - 1), sizeof *t->sharp);
  WEND_TRY(wend_agree(team));
  wend_halo_exchange(team, &near->halo, t->state, t->width, t->width - 1, sizeof(double));
  WEND_TRY(wend_agree(team));
done:
  return status;
}

wend_status wend_transport_init(wend_team *team, const wend_settings *settings,
                                const wend_particles *particles, wend_geometry *geometry,
                                wend_transport *transport) {
  wend_status status = WEND_OK;
  wend_transport *t = transport;
  double *sum_both = NULL;
  const wend_neighbours *near = &geometry->near;
  *t = (wend_transport){.geometry = geometry, .limited = settings->limited};
  t->escapes = any_open(&geometry->domain);
  t->field = wend_allocate(team, near->local, sizeof *t->field);
  t->kappa = wend_allocate(team, near->local, sizeof *t->kappa);
  sum_both = wend_allocate(team, near->owned, sizeof *sum_both);
  WEND_TRY(wend_agree(team));
  magnetise(team, settings, particles, t);
  WEND_TRY(wend_agree(team));
  WEND_TRY(exchange_coefficients(team, t));
  WEND_TRY(prepare_streaming(team, settings, particles, t));
  const wend_operator_source source = {.face = wend_geometry_source(geometry),
                                       .field = (const double(*)[3])t->field,
                                       .kappa = (const double(*)[2])t->kappa,
                                       .angle_power = settings->angle_power,
                                       .angle_share = settings->angle_share};
  free(geometry->faces.weight);
  geometry->faces.weight = NULL;
  WEND_TRY(allocate(team, t));
  for (int32_t i = 0; i < near->owned; i++) t->kappa_along[i] = t->kappa[i][0];
  if (t->streams)
    WEND_TRY(build_streaming(team, &source, t, sum_both));
  else
    wend_operator_low_order(&near->pairs, near->all, &source, &geometry->faces, t->kept,
                            t->sum_full, sum_both);
  if (t->escapes)
    wend_operator_escape(&near->pairs, near->all, &source, &geometry->faces, geometry->surface,
                         t->escape);
  limit_step(team, t, sum_both);
  WEND_TRY(build_pairs(team, &source, settings->sharpen && !t->streams, t));
  WEND_TRY(allocate_state(team, t));
done:
  free(sum_both);
  if (status != WEND_OK) wend_transport_reset(t);
  return status;
}
