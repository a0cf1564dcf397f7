/* SPDX-License-Identifier: LGPL-3.0-or-later
 * gradient.c: moving-least-squares matrices, coefficients and gradients. */
#include "gradient.h"

#include "clones.h"

#include <math.h>

/* Least 1/(|M| |M^-1|) in Frobenius norms, at most 1/D. Eigenvalues of M go with squares of
 * widths: a neighbourhood thinner than about 1% of its width counts as flat, and coefficients
 * never exceed those of a round neighbourhood by more than 100. */
static const double least_condition = 1e-4;

/* Least determinant of M scaled to trace D, where it is 1 at most. Rounding leaves 1e-16 of it
 * where the exact one is zero, and then the condition itself is noise; above least_condition it
 * is never below 1e-7. */
static const double least_determinant = 1e-12;

/* Order of the six: xx, xy, xz, yy, yz, zz. */
static const int row_axis[6] = {0, 0, 0, 1, 1, 2};
static const int column_axis[6] = {0, 1, 2, 1, 2, 2};
static const int diagonal[3] = {0, 3, 5};

WEND_CLONES static void add_moment(const wend_batch *b, int k, double sum[WEND_LANES]) {
  const double *restrict w = b->weight;
  const double *x = b->arm[row_axis[k]], *y = b->arm[column_axis[k]];
  double s[WEND_LANES];
  for (int lane = 0; lane < WEND_LANES; lane++) s[lane] = sum[lane];
  for (int e = 0; e < b->n; e += WEND_LANES)
    for (int lane = 0; lane < WEND_LANES; lane++)
      s[lane] += w[e + lane] * (x[e + lane] * y[e + lane]);
  for (int lane = 0; lane < WEND_LANES; lane++) sum[lane] = s[lane];
}

/* Adjugate, so that M^-1 = adjugate / determinant, which is returned. */
static double adjugate(int dim, const double m[6], double adj[6]) {
  if (dim == 2) {
    adj[0] = m[3];
    adj[1] = -m[1];
    adj[3] = m[0];
    adj[2] = adj[4] = adj[5] = 0.0;
  } else {
    adj[0] = m[3] * m[5] - m[4] * m[4];
    adj[1] = m[2] * m[4] - m[1] * m[5];
    adj[2] = m[1] * m[4] - m[2] * m[3];
    adj[3] = m[0] * m[5] - m[2] * m[2];
    adj[4] = m[1] * m[2] - m[0] * m[4];
    adj[5] = m[0] * m[3] - m[1] * m[1];
  }
  return m[0] * adj[0] + m[1] * adj[1] + m[2] * adj[2];
}

static double frobenius(const double m[6]) {
  return sqrt(m[0] * m[0] + m[3] * m[3] + m[5] * m[5] +
              2.0 * (m[1] * m[1] + m[2] * m[2] + m[4] * m[4]));
}

/* The inverse to use; true where it is not the inverse of m itself. M is scaled to trace D
 * first, so that limits do not depend on units. */
static bool invert(int dim, const double m[6], double inverse[6]) {
  const double trace = m[0] + m[3] + m[5], scale = dim / trace;
  double unit[6], adj[6];
  for (int k = 0; k < 6; k++) inverse[k] = 0.0;
  if (!(trace > 0.0 && isfinite(scale))) return true;
  for (int k = 0; k < 6; k++) unit[k] = scale * m[k];
  const double det = adjugate(dim, unit, adj);
  const bool usable =
      det > least_determinant && det > least_condition * frobenius(unit) * frobenius(adj);
  if (usable)
    for (int k = 0; k < 6; k++) inverse[k] = scale * (adj[k] / det);
  else
    for (int a = 0; a < dim; a++) inverse[diagonal[a]] = scale;
  return !usable;
}

int32_t wend_gradient_matrices(const wend_pairs *pairs, wend_slices slices,
                               const wend_domain *domain, const wend_smoothing *smoothing,
                               const double (*restrict place)[4],
                               double (*restrict inverse)[6]) {
  const wend_batch_source source = {pairs, domain, smoothing, place};
  int32_t fallbacks = 0;
  wend_batch batch;
  for (int32_t t = 0; t < slices.n; t++) {
    double sum[6][WEND_LANES] = {{0}};
    wend_batch_open(&source, slices.list[t], &batch);
    while (wend_batch_next(&source, &batch))
      for (int k = 0; k < 6; k++) add_moment(&batch, k, sum[k]);
    for (int lane = 0; lane < wend_pairs_lanes(pairs, slices.list[t]); lane++) {
      double m[6];
      for (int k = 0; k < 6; k++) m[k] = sum[k][lane];
      fallbacks += invert(domain->dim, m, inverse[batch.row[lane]]);
    }
  }
  return fallbacks;
}

WEND_CLONES static void multiply(const wend_batch *batch, double m[6][WEND_LANES],
                                 double c[restrict 3][WEND_BATCH]) {
  for (int e = 0; e < batch->n; e += WEND_LANES)
    for (int lane = 0; lane < WEND_LANES; lane++) {
      const double x = batch->arm[0][e + lane], y = batch->arm[1][e + lane];
      const double z = batch->arm[2][e + lane], w = batch->weight[e + lane];
      c[0][e + lane] = w * (m[0][lane] * x + m[1][lane] * y + m[2][lane] * z);
      c[1][e + lane] = w * (m[1][lane] * x + m[3][lane] * y + m[4][lane] * z);
      c[2][e + lane] = w * (m[2][lane] * x + m[4][lane] * y + m[5][lane] * z);
    }
}

void wend_gradient_coefficients(const wend_batch *batch, const double (*restrict inverse)[6],
                                double c[restrict 3][WEND_BATCH]) {
  double m[6][WEND_LANES];
  for (int lane = 0; lane < WEND_LANES; lane++)
    for (int k = 0; k < 6; k++) m[k][lane] = inverse[batch->row[lane]][k];
  multiply(batch, m, c);
}

/* Adds c_ij (e_j - e_i) of a piece to the rows' sums. */
static void add_gradient(const wend_batch *batch, const int32_t *restrict index,
                         const double *restrict field, double c[3][WEND_BATCH],
                         double sum[3][WEND_LANES]) {
  for (int e = 0; e < batch->n; e += WEND_LANES)
    for (int lane = 0; lane < WEND_LANES; lane++) {
      const double rise = field[index[e + lane]] - field[batch->row[lane]];
      for (int a = 0; a < 3; a++) sum[a][lane] += c[a][e + lane] * rise;
    }
}

void wend_gradient_apply(const wend_batch_source *source, wend_slices slices,
                         const double (*restrict inverse)[6], const double *restrict field,
                         double (*restrict gradient)[3]) {
  wend_batch batch;
  double c[3][WEND_BATCH];
  for (int32_t t = 0; t < slices.n; t++) {
    double sum[3][WEND_LANES] = {{0}};
    wend_batch_open(source, slices.list[t], &batch);
    while (wend_batch_next(source, &batch)) {
      wend_gradient_coefficients(&batch, inverse, c);
      add_gradient(&batch, source->pairs->index + batch.first, field, c, sum);
    }
    for (int lane = 0; lane < wend_pairs_lanes(source->pairs, slices.list[t]); lane++)
      for (int a = 0; a < 3; a++) gradient[batch.row[lane]][a] = sum[a][lane];
  }
}
