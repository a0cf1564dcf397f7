/* SPDX-License-Identifier: LGPL-3.0-or-later
 * geometry.c: supports, pairs, volumes, gradients and faces of a set of particles. */
#include "geometry.h"
#include "close_faces.h"
#include "gradient.h"
#include "supports.h"
#include "surface.h"
#include "total.h"
#include "volume.h"
#include <inttypes.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

static double default_neighbours(int dim) { return dim == 2 ? 22 : 48; }

static wend_status find_supports(wend_team *team, const wend_settings *settings,
                                 const wend_particles *p, wend_geometry *g,
                                 double (*place)[4]) {
  for (int32_t i = 0; i < p->n; i++)
    for (int c = 0; c < 3; c++) place[i][c] = p->column[WEND_X + c][i];
  if (p->column[WEND_SUPPORT] != NULL) {
    for (int32_t i = 0; i < p->n; i++) place[i][3] = p->column[WEND_SUPPORT][i];
  } else {
    const double target =
        settings->neighbours > 0 ? settings->neighbours : default_neighbours(g->domain.dim);
    const wend_status status =
        wend_supports_find(team, &g->domain, wend_smoothing_count(), target, p, place);
    if (status != WEND_OK) return status;
  }
  return wend_supports_check(team, &g->domain, p, (const double(*)[4])place);
}

static wend_status find_pairs(wend_team *team, const wend_settings *settings,
                              const wend_particles *p, wend_geometry *g) {
  wend_status status = WEND_OK;
  const double start = MPI_Wtime();
  double(*place)[4] = wend_allocate(team, p->n, sizeof *place);
  WEND_TRY(wend_agree(team));
  WEND_TRY(find_supports(team, settings, p, g, place));
  g->report.seconds_supports = MPI_Wtime() - start;
  WEND_TRY(wend_neighbours_init(team, &g->domain, p, (const double(*)[4])place, &g->near));
  g->report.seconds_pairs = MPI_Wtime() - start - g->report.seconds_supports;
done:
  free(place);
  return status;
}

static wend_status allocate(wend_team *team, wend_geometry *g) {
  const int64_t entries = wend_neighbours_entries(&g->near);
  g->volume = wend_allocate(team, g->near.local, sizeof *g->volume);
  g->inverse = wend_allocate(team, g->near.local, sizeof *g->inverse);
  g->surface = wend_allocate(team, g->near.owned, sizeof *g->surface);
  for (int d = 0; d < 3; d++) {
    g->faces.area[d] = wend_allocate(team, entries, sizeof(float));
    g->faces.arm[d] = wend_allocate(team, entries, sizeof(float));
  }
  g->faces.weight = wend_allocate(team, entries, sizeof(float));
  return wend_agree(team);
}

static wend_status measure_volumes(wend_team *team, const wend_particles *p, wend_geometry *g) {
  if (p->column[WEND_VOLUME] != NULL && p->n > 0)
    memcpy(g->volume, p->column[WEND_VOLUME], (size_t)p->n * sizeof *g->volume);
  else
    wend_volume_estimate(&g->near.pairs, g->near.all, &g->domain, g->smoothing,
                         (const double(*)[4])g->near.place, g->volume);
  wend_halo_exchange(team, &g->near.halo, g->volume, 1, 1, sizeof(double));
  return wend_agree(team);
}

static wend_status measure_gradients(wend_team *team, wend_geometry *g) {
  g->report.fallbacks =
      wend_gradient_matrices(&g->near.pairs, g->near.all, &g->domain, g->smoothing,
                             (const double(*)[4])g->near.place, g->inverse);
  wend_halo_exchange(team, &g->near.halo, g->inverse, 6, 6, sizeof(double));
  return wend_agree(team);
}

static bool all_periodic(const wend_domain *domain) {
  for (int a = 0; a < domain->dim; a++)
    if (domain->period[a] == 0) return false;
  return true;
}

static void count_up(wend_team *team, wend_geometry *g) {
  wend_geometry_report *r = &g->report;
  int64_t count[4] = {g->near.owned, 0, r->fallbacks, 0};
  double support[2] = {0, -INFINITY};
  for (int32_t i = 0; i < g->near.owned; i++) {
    count[1] += g->near.count[i];
    count[3] += g->surface[i];
    support[0] = fmax(support[0], g->near.place[i][3]);
    support[1] = fmax(support[1], -g->near.place[i][3]);
  }
  wend_team_count(team, 4, count);
  wend_team_max(team, 2, support);
  r->particles = count[0];
  r->pairs = count[1] / 2;
  r->fallbacks = count[2];
  r->surface = count[3];
  r->support_most = support[0];
  r->support_least = -support[1];
}

wend_status wend_geometry_init(wend_team *team, const wend_domain *domain,
                               const wend_settings *settings, const wend_particles *particles,
                               wend_geometry *geometry) {
  wend_status status = WEND_OK;
  memset(geometry, 0, sizeof *geometry);
  geometry->domain = *domain;
  geometry->smoothing = wend_smoothing_find(settings->smoothing);
  if (geometry->smoothing == NULL)
    wend_fail(team, WEND_ERR_ARGUMENT, "no smoothing kernel is called \"%s\"",
              settings->smoothing);
  WEND_TRY(wend_agree(team));
  WEND_TRY(find_pairs(team, settings, particles, geometry));
  const double start = MPI_Wtime();
  WEND_TRY(allocate(team, geometry));
  WEND_TRY(measure_volumes(team, particles, geometry));
  WEND_TRY(measure_gradients(team, geometry));
  if (!all_periodic(domain))
    wend_surface_find(&geometry->near.pairs, geometry->near.all, &geometry->domain,
                      geometry->smoothing, (const double(*)[4])geometry->near.place,
                      geometry->surface);
  WEND_TRY(wend_close_faces(team, settings, geometry));
  geometry->report.seconds_faces = MPI_Wtime() - start;
  count_up(team, geometry);
done:
  if (status != WEND_OK) wend_geometry_reset(geometry);
  return status;
}

wend_face_source wend_geometry_source(const wend_geometry *geometry) {
  return (wend_face_source){.domain = &geometry->domain,
                            .smoothing = geometry->smoothing,
                            .place = (const double(*)[4])geometry->near.place,
                            .volume = geometry->volume,
                            .inverse = (const double(*)[6])geometry->inverse};
}

void wend_geometry_release_faces(wend_geometry *geometry) {
  for (int d = 0; d < 3; d++) {
    free(geometry->faces.area[d]);
    free(geometry->faces.arm[d]);
  }
  free(geometry->faces.weight);
  memset(&geometry->faces, 0, sizeof geometry->faces);
}

void wend_geometry_reset(wend_geometry *geometry) {
  wend_geometry_release_faces(geometry);
  wend_neighbours_reset(&geometry->near);
  free(geometry->volume);
  free(geometry->inverse);
  free(geometry->surface);
  memset(geometry, 0, sizeof *geometry);
}
