/* SPDX-License-Identifier: LGPL-3.0-or-later
 * local_bounds.c: the range of a neighbourhood, layer by layer over all ranks. */
#include "local_bounds.h"
#include "reach.h"
#include <stdlib.h>
#include <string.h>

static wend_status widen(wend_team *team, wend_geometry *g, int layers, double (*range)[2],
                         double (*wide)[2]) {
  wend_neighbours *near = &g->near;
  for (int k = 0; k < layers; k++) {
    wend_status status = wend_halo_exchange(team, &near->halo, range, 2, 2, sizeof(double));
    if (status == WEND_OK) status = wend_agree(team);
    if (status != WEND_OK) return status;
    wend_reach_widen(&near->pairs, near->all, (const double(*)[2])range, wide);
    if (near->owned > 0) memcpy(range, wide, (size_t)near->owned * sizeof *range);
  }
  return WEND_OK;
}

wend_status wend_local_bounds_excess(wend_team *team, wend_geometry *geometry, int layers,
                                     const double *before, const double *after,
                                     double *excess) {
  wend_status status = WEND_OK;
  const int32_t n = geometry->near.owned;
  double(*range)[2] = wend_allocate(team, geometry->near.local, sizeof *range);
  double(*wide)[2] = wend_allocate(team, n, sizeof *wide);
  double *e = wend_allocate(team, n, sizeof *e);
  WEND_TRY(wend_agree(team));
  for (int32_t i = 0; i < n; i++) {
    range[i][0] = range[i][1] = before[i] / geometry->volume[i];
    e[i] = after[i] / geometry->volume[i];
  }
  WEND_TRY(widen(team, geometry, layers, range, wide));
  *excess = wend_reach_excess(n, e, (const double(*)[2])range);
  wend_team_max(team, 1, excess);
done:
  free(range);
  free(wide);
  free(e);
  return status;
}
