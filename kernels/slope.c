/* SPDX-License-Identifier: LGPL-3.0-or-later
 * slope.c: second-order derivatives along the field, blended with first-order ones by their
 * noise. */
#include "slope.h"
#include <math.h>
#include <stdbool.h>

enum { TERMS = WEND_SLOPE_TERMS };

/* Most noise of a blend, in that of the first-order fit. */
static const double noise_most = 1.5;

/* Least pivot of the scaled normal matrix, over its diagonal: below, rounding decides. */
static const double pivot_least = 1e-9;

static double kernel(const wend_face_source *s, int32_t i, const double *r) {
  const double h = s->place[i][3];
  const double q = sqrt(r[0] * r[0] + r[1] * r[1] + r[2] * r[2]) / h;
  double w;
  s->smoothing->shape(1, &q, &w);
  return w * s->smoothing->norm[s->domain->dim - 2] / (s->domain->dim == 2 ? h * h : h * h * h);
}

/* The arm over H, then the products of its components; returns their number. */
static int terms_of(int dim, double h, const double r[3], double phi[TERMS]) {
  int n = dim == 2 ? 2 : 3;
  for (int a = 0; a < 3; a++) phi[a] = r[a] / h;
  for (int a = 0; a < dim; a++)
    for (int c = a; c < dim; c++) phi[n++] = phi[a] * phi[c];
  return n;
}

static int normal_matrix(const wend_pairs *p, const wend_face_source *s, float *const arm[3],
                         int32_t i, double m[TERMS][TERMS]) {
  const int dim = s->domain->dim;
  int n = 0;
  for (int a = 0; a < TERMS; a++)
    for (int c = 0; c < TERMS; c++) m[a][c] = 0;
  for (int32_t k = 0; k < p->count[i]; k++) {
    const int64_t entry = wend_pairs_entry(p, i, k);
    double r[3], phi[TERMS];
    for (int a = 0; a < 3; a++) r[a] = arm[a][entry];
    const double w = kernel(s, i, r);
    n = terms_of(dim, s->place[i][3], r, phi);
    for (int a = 0; a < n; a++)
      for (int c = 0; c <= a; c++) m[a][c] += w * (phi[a] * phi[c]);
  }
  return n;
}

/* Solves m x = x by Cholesky factors, lower triangle in place; false where a pivot is lost. */
static bool solve(int n, double m[TERMS][TERMS], double x[TERMS]) {
  for (int a = 0; a < n; a++) {
    const double whole = m[a][a];
    for (int c = 0; c <= a; c++) {
      double sum = m[a][c];
      for (int k = 0; k < c; k++) sum -= m[a][k] * m[c][k];
      m[a][c] = c < a ? sum / m[c][c] : sum;
    }
    if (!(m[a][a] > pivot_least * whole)) return false;
    m[a][a] = sqrt(m[a][a]);
  }
  for (int a = 0; a < n; a++) {
    for (int k = 0; k < a; k++) x[a] -= m[a][k] * x[k];
    x[a] /= m[a][a];
  }
  for (int a = n - 1; a >= 0; a--) {
    for (int k = a + 1; k < n; k++) x[a] -= m[k][a] * x[k];
    x[a] /= m[a][a];
  }
  return true;
}

/* The share of the second-order fit, by the noise of both. */
static double share_of(double noise_1, double noise_2) {
  const double spare = (noise_most - 1) * noise_1, more = noise_2 - noise_1;
  return more > spare ? sqrt(spare / more) : 1;
}

void wend_slope_fit(const wend_pairs *pairs, const wend_face_source *source,
                    float *const arm[3], int32_t i, const double b[3], wend_slope *slope) {
  const int dim = source->domain->dim;
  const double h = source->place[i][3], *m = source->inverse[i];
  const double first[3] = {m[0] * b[0] + m[1] * b[1] + m[2] * b[2],
                           m[1] * b[0] + m[3] * b[1] + m[4] * b[2],
                           m[2] * b[0] + m[4] * b[1] + m[5] * b[2]};
  double matrix[TERMS][TERMS], second[TERMS] = {0}, noise[2] = {0};
  const int n = normal_matrix(pairs, source, arm, i, matrix);
  *slope = (wend_slope){.terms = n};
  for (int a = 0; a < dim; a++) second[a] = b[a] / h;
  const bool solved = n > 0 && solve(n, matrix, second);
  for (int a = 0; a < dim; a++) {
    noise[0] += b[a] * first[a];
    noise[1] += b[a] * second[a] / h;
  }
  const double share = solved && noise[1] > 0 ? share_of(noise[0], noise[1]) : 0;
  for (int k = 0; k < n; k++) slope->factor[k] = share > 0 ? share * second[k] : 0;
  for (int a = 0; a < dim && n > 0; a++) slope->factor[a] += (1 - share) * h * first[a];
}

double wend_slope_weight(const wend_face_source *source, const wend_slope *slope, int32_t i,
                         const double r[3]) {
  double phi[TERMS], sum = 0;
  terms_of(source->domain->dim, source->place[i][3], r, phi);
  for (int k = 0; k < slope->terms; k++) sum += slope->factor[k] * phi[k];
  return kernel(source, i, r) * sum;
}
