/* SPDX-License-Identifier: LGPL-3.0-or-later
 * batch.c: arms and weights of a slice of rows, a piece at a time. */
#include "batch.h"

#include <math.h>

/* Any distance over H at which every shape is exactly zero. */
static const double beyond = 2.0;

void wend_batch_open(const wend_batch_source *source, int32_t slice, wend_batch *batch) {
  const wend_pairs *p = source->pairs;
  const int dim = source->domain->dim;
  const double norm = source->smoothing->norm[dim - 2];
  for (int lane = 0; lane < WEND_LANES; lane++) {
    const int32_t i = slice * WEND_LANES + lane;
    const int32_t row = i < p->rows ? i : p->rows - 1;
    const double h = source->place[row][3];
    batch->row[lane] = row;
    batch->count[lane] = row == i ? p->count[i] : 0;
    for (int a = 0; a < 4; a++) batch->own[a][lane] = source->place[row][a];
    batch->factor[lane] = norm / (dim == 2 ? h * h : h * h * h);
  }
  for (int e = 0; e < WEND_BATCH; e++) batch->arm[2][e] = 0.0; /* and stays so in 2-D */
  batch->first = p->first[slice];
  batch->end = p->first[slice + 1];
  batch->n = 0;
}

/* x_j - x_i, entry by entry: the only part that jumps about in memory. */
static void gather(const wend_batch_source *source, wend_batch *b) {
  const int32_t *restrict index = source->pairs->index + b->first;
  const int dim = source->domain->dim;
  for (int e = 0; e < b->n; e += WEND_LANES)
    for (int lane = 0; lane < WEND_LANES; lane++) {
      const double *restrict other = source->place[index[e + lane]];
      for (int a = 0; a < dim; a++) b->arm[a][e + lane] = other[a] - b->own[a][lane];
    }
}

static void wrap(const wend_domain *domain, int axis, int n, double *restrict arm) {
  for (int e = 0; e < n; e++) arm[e] = wend_domain_wrap(domain, axis, arm[e]);
}

/* |r_ij| / H_i, and beyond the support on padding. */
static void scaled_distances(wend_batch *b, int32_t before, double *restrict q) {
  for (int e = 0; e < b->n; e += WEND_LANES)
    for (int lane = 0; lane < WEND_LANES; lane++) {
      const double x = b->arm[0][e + lane], y = b->arm[1][e + lane], z = b->arm[2][e + lane];
      q[e + lane] = sqrt(x * x + y * y + z * z) / b->own[3][lane];
    }
  for (int lane = 0; lane < WEND_LANES; lane++) {
    const int32_t left = b->count[lane] > before ? b->count[lane] - before : 0;
    for (int e = WEND_LANES * left + lane; e < b->n; e += WEND_LANES) q[e] = beyond;
  }
}

bool wend_batch_next(const wend_batch_source *source, wend_batch *batch) {
  const wend_pairs *p = source->pairs;
  double q[WEND_BATCH], shape[WEND_BATCH];
  batch->first += batch->n;
  const int64_t left = batch->end - batch->first;
  if (left <= 0) return false;
  batch->n = left < WEND_BATCH ? (int)left : WEND_BATCH;
  gather(source, batch);
  for (int a = 0; a < source->domain->dim; a++)
    if (source->domain->period[a] > 0) wrap(source->domain, a, batch->n, batch->arm[a]);
  const int32_t slice = batch->row[0] / WEND_LANES;
  scaled_distances(batch, (int32_t)((batch->first - p->first[slice]) / WEND_LANES), q);
  source->smoothing->shape(batch->n, q, shape);
  for (int e = 0; e < batch->n; e += WEND_LANES)
    for (int lane = 0; lane < WEND_LANES; lane++)
      batch->weight[e + lane] = batch->factor[lane] * shape[e + lane];
  return true;
}
