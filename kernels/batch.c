/* SPDX-License-Identifier: LGPL-3.0-or-later
 * batch.c: arms and weights of a slice of rows, a piece at a time. */
#include "batch.h"

#include "clones.h"

#include <math.h>
#include <string.h>

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
    for (int a = 0; a < 3; a++) batch->own[a][lane] = source->place[row][a];
    batch->inverse[lane] = 1.0 / h;
    batch->factor[lane] = norm / (dim == 2 ? h * h : h * h * h);
  }
  batch->first = p->first[slice];
  batch->end = p->first[slice + 1];
  batch->n = 0;
}

/* Places of the neighbours, component by component: the only part that jumps about in memory,
 * kept apart because clang vectorises nothing that follows such loads directly. */
static void gather(const wend_batch_source *source, wend_batch *b) {
  const int32_t *restrict index = source->pairs->index + b->first;
  for (int e = 0; e < b->n; e++) {
    const double *place = source->place[index[e]];
    for (int a = 0; a < 3; a++) b->arm[a][e] = place[a];
  }
}

/* Places become arms, and q = |r_ij| / H_i. The copies tell the compiler that nothing it writes
 * to can change them. */
WEND_CLONES static void measure(const wend_batch_source *source, wend_batch *b,
                                double *restrict q) {
  const wend_domain domain = *source->domain;
  double own[3][WEND_LANES], inverse[WEND_LANES];
  memcpy(own, b->own, sizeof own);
  memcpy(inverse, b->inverse, sizeof inverse);
  for (int e = 0; e < b->n; e += WEND_LANES)
    for (int lane = 0; lane < WEND_LANES; lane++) {
      const double x = wend_domain_wrap(&domain, 0, b->arm[0][e + lane] - own[0][lane]);
      const double y = wend_domain_wrap(&domain, 1, b->arm[1][e + lane] - own[1][lane]);
      const double z = wend_domain_wrap(&domain, 2, b->arm[2][e + lane] - own[2][lane]);
      b->arm[0][e + lane] = x;
      b->arm[1][e + lane] = y;
      b->arm[2][e + lane] = z;
      q[e + lane] = sqrt(x * x + y * y + z * z) * inverse[lane];
    }
}

/* Padding lies beyond the support. `before` entries of each row came before this piece. */
static void discard_padding(const wend_batch *b, int32_t before, double *restrict q) {
  for (int lane = 0; lane < WEND_LANES; lane++) {
    const int32_t left = b->count[lane] > before ? b->count[lane] - before : 0;
    for (int e = WEND_LANES * left + lane; e < b->n; e += WEND_LANES) q[e] = beyond;
  }
}

WEND_CLONES static void weigh(wend_batch *b, const double *restrict shape) {
  double factor[WEND_LANES];
  memcpy(factor, b->factor, sizeof factor);
  for (int e = 0; e < b->n; e += WEND_LANES)
    for (int lane = 0; lane < WEND_LANES; lane++)
      b->weight[e + lane] = factor[lane] * shape[e + lane];
}

bool wend_batch_next(const wend_batch_source *source, wend_batch *batch) {
  const wend_pairs *p = source->pairs;
  double q[WEND_BATCH], shape[WEND_BATCH];
  batch->first += batch->n;
  const int64_t left = batch->end - batch->first;
  if (left <= 0) return false;
  batch->n = left < WEND_BATCH ? (int)left : WEND_BATCH;
  gather(source, batch);
  measure(source, batch, q);
  const int32_t slice = batch->row[0] / WEND_LANES;
  discard_padding(batch, (int32_t)((batch->first - p->first[slice]) / WEND_LANES), q);
  source->smoothing->shape(batch->n, q, shape);
  weigh(batch, shape);
  return true;
}
