/* SPDX-License-Identifier: LGPL-3.0-or-later
 * close_faces.c: Chebyshev sweeps over all ranks. No floating-point sum crosses ranks: the
 * closure that decides when to stop is an exact sum, the same on any number of them. */
#include "close_faces.h"
#include "total.h"
#include <math.h>
#include <stdlib.h>

/* Bounds of the Jacobi-scaled spectrum: above, by counting; below, where sweeps stop to pay. */
static const double highest = 4, lowest = 0.1;

/* Sweeps are judged in batches: a look at the closure costs one reduction and a pass over the
 * pairs. */
enum { BATCH = 4 };

typedef struct work {
  double (*unknown)[4];   /* [local] l, s */
  double (*direction)[4]; /* [owned] */
  double (*residual)[4];  /* [owned] */
  double (*diagonal)[2];  /* [owned] */
  double *extent;         /* [owned] */
} work;

static void free_work(work *w) {
  free(w->unknown);
  free(w->direction);
  free(w->residual);
  free(w->diagonal);
  free(w->extent);
}

static wend_status make_work(wend_team *team, const wend_neighbours *near, work *w) {
  w->unknown = wend_allocate(team, near->local, sizeof *w->unknown);
  w->direction = wend_allocate(team, near->owned, sizeof *w->direction);
  w->residual = wend_allocate(team, near->owned, sizeof *w->residual);
  w->diagonal = wend_allocate(team, near->owned, sizeof *w->diagonal);
  w->extent = wend_allocate(team, near->owned, sizeof *w->extent);
  return wend_agree(team);
}

static void residual(const wend_geometry *g, wend_slices slices, work *w) {
  wend_faces_residual(&g->near.pairs, slices, g->domain.dim, &g->faces, g->volume,
                      (const double(*)[4])w->unknown, w->residual);
}

typedef struct judgement {
  double closure, span_mean, span_rms;
} judgement;

enum { MISS, EXTENT, SPAN, SPAN2, COUNT, SUMS };

/* Particles whose terms are gathered before they are summed: an exact sum likes company. */
enum { BLOCK = 256 };

/* Terms of both conditions of the particles from *i on that carry them: those off free
 * surfaces. */
static int gather_terms(const wend_geometry *g, const work *w, int32_t *i,
                        double term[SUMS][BLOCK]) {
  int n = 0;
  for (; *i < g->near.owned && n < BLOCK; ++*i) {
    if (g->surface[*i]) continue;
    const double *r = w->residual[*i];
    const double off = -r[3] / (2 * g->domain.dim * g->volume[*i]);
    term[MISS][n] = r[0] * r[0] + r[1] * r[1] + r[2] * r[2];
    term[EXTENT][n] = w->extent[*i] * w->extent[*i];
    term[SPAN][n] = 1 + off;
    term[SPAN2][n] = off * off;
    term[COUNT][n++] = 1;
  }
  return n;
}

static judgement judge(wend_team *team, const wend_geometry *g, work *w) {
  wend_sum sum[SUMS];
  double term[SUMS][BLOCK], all[SUMS];
  for (int k = 0; k < SUMS; k++) wend_sum_reset(&sum[k]);
  wend_faces_extent(&g->near.pairs, g->near.all, &g->faces, (const double(*)[4])w->unknown,
                    w->extent);
  for (int32_t i = 0; i < g->near.owned;) {
    const int n = gather_terms(g, w, &i, term);
    for (int k = 0; k < SUMS; k++) wend_sum_add(&sum[k], n, term[k], 1);
  }
  wend_total(team, SUMS, sum);
  for (int k = 0; k < SUMS; k++) all[k] = wend_sum_value(&sum[k]);
  if (!(all[COUNT] > 0) || !(all[EXTENT] > 0)) return (judgement){0, 1, 0};
  return (judgement){sqrt(all[MISS] / all[EXTENT]), all[SPAN] / all[COUNT],
                     sqrt(all[SPAN2] / all[COUNT])};
}

/* One sweep: update the owned unknowns, send them out, and see to the inside while they travel.
 */
static wend_status sweep(wend_team *team, wend_geometry *g, const wend_chebyshev *chebyshev,
                         const double scale[2], work *w) {
  wend_faces_update(g->near.owned, chebyshev, scale, (const double(*)[2])w->diagonal,
                    (const double(*)[4])w->residual, g->surface, w->direction, w->unknown);
  wend_status status = wend_halo_begin(team, &g->near.halo, w->unknown, 4, 4, sizeof(double));
  if (status != WEND_OK) return status;
  residual(g, g->near.interior, w);
  status = wend_halo_end(team, &g->near.halo);
  residual(g, g->near.border, w);
  return status;
}

wend_status wend_close_faces(wend_team *team, const wend_settings *settings,
                             wend_geometry *geometry) {
  const double scale[2] = {settings->close_faces, settings->fix_volumes};
  const wend_face_source source = wend_geometry_source(geometry);
  wend_geometry_report *report = &geometry->report;
  work w = {0};
  wend_status status = make_work(team, &geometry->near, &w);
  if (status != WEND_OK) goto done;
  wend_faces_raw(&geometry->near.pairs, geometry->near.all, &source, &geometry->faces,
                 w.diagonal);
  residual(geometry, geometry->near.all, &w);
  judgement now = judge(team, geometry, &w);
  report->closure_raw = now.closure;
  report->span_raw = now.span_mean;
  wend_chebyshev chebyshev = wend_chebyshev_begin(lowest, highest);
  const int most = scale[0] > 0 || scale[1] > 0 ? settings->sweeps : 0;
  for (report->sweeps = 0; report->sweeps < most && now.closure > settings->closure;) {
    for (int k = 0; k < BATCH && report->sweeps < most; k++, report->sweeps++) {
      WEND_TRY(sweep(team, geometry, &chebyshev, scale, &w));
      wend_chebyshev_next(&chebyshev);
    }
    now = judge(team, geometry, &w);
  }
  report->closure = now.closure;
  report->span_mean = now.span_mean;
  report->span_rms = now.span_rms;
  wend_faces_apply(&geometry->near.pairs, geometry->near.all, &geometry->faces,
                   (const double(*)[4])w.unknown);
done:
  free_work(&w);
  return status;
}
