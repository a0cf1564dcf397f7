/* SPDX-License-Identifier: LGPL-3.0-or-later
 * sharpen.c: undoes the second-order smoothing of slopes and faces. */
#include "sharpen.h"

/* A correction up to this share of the flux counts as small. */
static const double small_share = 0.2;

static double kernel_shape(const wend_face_source *s, int32_t i, double r2) {
  const double q = sqrt(r2) / s->place[i][3];
  double w;
  s->smoothing->shape(1, &q, &w);
  return w;
}

/* x^2 and x^4 of an arm: along b, or their means over directions (1/D and 3/(D(D+2)) of r^2 and
 * r^4). */
static void powers(int dim, bool along, const double *b, const double r[3], double r2,
                   double x[2]) {
  const double xb = b[0] * r[0] + b[1] * r[1] + b[2] * r[2];
  x[0] = along ? xb * xb : r2 / dim;
  x[1] = along ? x[0] * x[0] : 3 * r2 * r2 / (dim * (dim + 2));
}

/* Weights of one row before they are scaled: w, times cos^4 along the field. */
static void weigh_row(const wend_pairs *p, const wend_face_source *s, const double *b,
                      bool along, float *const arm[3], int32_t i, float *mu) {
  const int dim = s->domain->dim;
  double m2 = 0, m4 = 0, spread = 0;
  for (int32_t m = 0; m < p->count[i]; m++) {
    const int64_t k = wend_pairs_entry(p, i, m);
    const double r[3] = {arm[0][k], arm[1][k], arm[2][k]};
    const double r2 = r[0] * r[0] + r[1] * r[1] + r[2] * r[2], w = kernel_shape(s, i, r2);
    double x[2];
    powers(dim, along, b, r, r2, x);
    const double cos2 = along && r2 > 0 ? x[0] / r2 : 1;
    mu[k] = (float)(w * cos2 * cos2);
    m2 += w * x[0];
    m4 += w * x[1];
    spread += mu[k] * x[0];
  }
  const double scale = m2 > 0 && spread > 0 ? 2 * m4 / (3 * m2 * spread) : 0;
  for (int32_t m = 0; m < p->count[i]; m++) {
    const int64_t k = wend_pairs_entry(p, i, m);
    mu[k] = (float)(mu[k] * scale);
  }
}

void wend_sharpen_weights(const wend_pairs *pairs, wend_slices slices,
                          const wend_face_source *source, const double (*restrict field)[3],
                          bool along, float *const arm[3], float *restrict mu) {
  for (int32_t t = 0; t < slices.n; t++) {
    const int32_t slice = slices.list[t];
    for (int64_t k = pairs->first[slice]; k < pairs->first[slice + 1]; k++) mu[k] = 0;
    for (int lane = 0; lane < wend_pairs_lanes(pairs, slice); lane++) {
      const int32_t i = slice * WEND_LANES + lane;
      weigh_row(pairs, source, field[i], along, arm, i, mu);
    }
  }
}

static int32_t row_of(const wend_pairs *p, int32_t slice, int lane) {
  const int32_t i = slice * WEND_LANES + lane;
  return i < p->rows ? i : p->rows - 1;
}

/* What is kept of a correction c of the flux q: all of it where it is small, nothing where it
 * is of the size of the flux, as at jumps, where it would sharpen what the limiter then has to
 * flatten. */
static double kept_share(double c2, double q2) {
  const double c = sqrt(c2), most = 2 * small_share * sqrt(q2);
  return c > 0 ? fmin(c, fmax(0, most - c)) / c : 0;
}

/* Own fluxes of eight rows and what sharpening adds to them, component by component. */
typedef struct eight_rows {
  double own[3][WEND_LANES], sum[3][WEND_LANES];
} eight_rows;

static void store_rows(const wend_pairs *p, int32_t slice, int components,
                       const eight_rows *rows, double *sharp) {
  for (int l = 0; l < wend_pairs_lanes(p, slice); l++) {
    double c2 = 0, q2 = 0;
    for (int d = 0; d < components; d++) {
      c2 += rows->sum[d][l] * rows->sum[d][l];
      q2 += rows->own[d][l] * rows->own[d][l];
    }
    const double share = kept_share(c2, q2);
    double *out = sharp + ((int64_t)slice * WEND_LANES + l) * components;
    for (int d = 0; d < components; d++) out[d] = rows->own[d][l] + share * rows->sum[d][l];
  }
}

void wend_sharpen_flux(const wend_pairs *pairs, wend_slices slices, const float *restrict mu,
                       const double *restrict state, int width, double *restrict sharp) {
  for (int32_t t = 0; t < slices.n; t++) {
    const int32_t slice = slices.list[t];
    eight_rows rows = {.sum = {{0}}};
    for (int d = 0; d < width - 1; d++) {
      for (int l = 0; l < WEND_LANES; l++)
        rows.own[d][l] = state[(int64_t)row_of(pairs, slice, l) * width + d + 1];
      for (int64_t k = pairs->first[slice]; k < pairs->first[slice + 1]; k += WEND_LANES)
        for (int l = 0; l < WEND_LANES; l++)
          rows.sum[d][l] += mu[k + l] * (rows.own[d][l] -
                                         state[(int64_t)pairs->index[k + l] * width + d + 1]);
    }
    store_rows(pairs, slice, width - 1, &rows, sharp);
  }
}
