/* SPDX-License-Identifier: LGPL-3.0-or-later
 * operator.c: pair coefficients of diffusion along and across the field. */
#include "operator.h"
#include "slope.h"

static double dot(const double *a, const double *b) {
  return a[0] * b[0] + a[1] * b[1] + a[2] * b[2];
}

static void entry_vector(float *const column[3], int64_t k, double vector[3]) {
  for (int d = 0; d < 3; d++) vector[d] = column[d][k];
}

/* Most of sum_j a_ij, in kappa V / H^2: the mean on a jittered lattice is 9.5, single particles
 * reach twice that and would set the step of all. Any sum >= 0 keeps the limiter's promise; a
 * smaller one limits more. */
static const double room_most = 10;

/* a_ij and s_ij of one entry; every product and sum is even under the exchange of the ends. */
static void low_order(const wend_operator_source *s, const double *area, const double *arm,
                      int32_t i, int32_t j, float *full, float *kept) {
  const double r2 = dot(arm, arm);
  if (!(r2 > 0)) {
    *full = *kept = 0;
    return;
  }
  const double *bi = s->field[i], *bj = s->field[j];
  const double ri = dot(bi, arm), rj = dot(bj, arm);
  const double excess =
      ((s->kappa[i][0] - s->kappa[i][1]) + (s->kappa[j][0] - s->kappa[j][1])) / 2;
  const double across = (s->kappa[i][1] + s->kappa[j][1]) / 2;
  const double along = excess * (dot(area, bi) * ri + dot(area, bj) * rj) / (2 * r2);
  const double isotropic = across * dot(area, arm) / r2;
  const double cos2 = (ri * ri + rj * rj) / (2 * r2);
  const double a = fmax(0, along + isotropic);
  const double share = s->angle_share * pow(cos2, s->angle_power);
  *full = (float)a;
  *kept = (float)fmin(a, fmax(0, share * along + isotropic));
}

/* What a pair adds to the room: diffusion along the field counts once, across it in each
 * dimension. */
static double room_of(const wend_operator_source *s, int32_t i, int32_t j) {
  const double along = (s->kappa[i][0] + s->kappa[j][0]) / 2;
  const double across = (s->kappa[i][1] + s->kappa[j][1]) / 2;
  return fmax(0, along - across) + s->face.domain->dim * across;
}

void wend_operator_low_order(const wend_pairs *pairs, wend_slices slices,
                             const wend_operator_source *source, const wend_faces *faces,
                             float *restrict kept, double *restrict sum_full,
                             double *restrict sum_both) {
  for (int32_t t = 0; t < slices.n; t++) {
    const int32_t slice = slices.list[t];
    double full[WEND_LANES] = {0}, left[WEND_LANES] = {0}, widest[WEND_LANES] = {0};
    const int lanes = wend_pairs_lanes(pairs, slice);
    for (int64_t k = pairs->first[slice]; k < pairs->first[slice + 1]; k++) {
      const int lane = (int)(k % WEND_LANES);
      const int32_t i = slice * WEND_LANES + (lane < lanes ? lane : 0);
      double area[3], arm[3];
      entry_vector(faces->area, k, area);
      entry_vector(faces->arm, k, arm);
      float a;
      low_order(source, area, arm, i, pairs->index[k], &a, &kept[k]);
      full[lane] += a;
      left[lane] += kept[k];
      /* Padding does not count: how much of it there is depends on the ranks. */
      if (pairs->index[k] != i)
        widest[lane] = fmax(widest[lane], room_of(source, i, pairs->index[k]));
    }
    for (int lane = 0; lane < lanes; lane++) {
      const int32_t i = slice * WEND_LANES + lane;
      const double h = source->face.place[i][3];
      const double room = room_most * widest[lane] * source->face.volume[i] / (h * h);
      sum_full[i] = fmin(full[lane], room);
      sum_both[i] = sum_full[i] + left[lane];
    }
  }
}

/* c_ij = M_i^-1 r_ij w_ij of one entry: zero beyond the row's own support. */
static void gradient_weight(const wend_face_source *s, const double *arm, int32_t i,
                            double c[3]) {
  const double h = s->place[i][3], *m = s->inverse[i];
  const double q = sqrt(dot(arm, arm)) / h;
  double w;
  s->smoothing->shape(1, &q, &w);
  w *= s->smoothing->norm[s->domain->dim - 2] / (s->domain->dim == 2 ? h * h : h * h * h);
  c[0] = w * (m[0] * arm[0] + m[1] * arm[1] + m[2] * arm[2]);
  c[1] = w * (m[1] * arm[0] + m[3] * arm[1] + m[4] * arm[2]);
  c[2] = w * (m[2] * arm[0] + m[4] * arm[1] + m[5] * arm[2]);
}

static void fit_slopes(const wend_pairs *pairs, int32_t slice,
                       const wend_operator_source *source, float *const arm[3],
                       wend_slope fit[WEND_LANES]) {
  for (int lane = 0; lane < wend_pairs_lanes(pairs, slice); lane++) {
    const int32_t i = slice * WEND_LANES + lane;
    wend_slope_fit(pairs, &source->face, arm, i, source->field[i], &fit[lane]);
  }
}

void wend_operator_slope(const wend_pairs *pairs, wend_slices slices,
                         const wend_operator_source *source, float *const arm[3],
                         float *slope) {
  for (int32_t t = 0; t < slices.n; t++) {
    const int32_t slice = slices.list[t];
    const int lanes = wend_pairs_lanes(pairs, slice);
    wend_slope fit[WEND_LANES];
    fit_slopes(pairs, slice, source, arm, fit);
    for (int64_t k = pairs->first[slice]; k < pairs->first[slice + 1]; k++) {
      const int lane = (int)(k % WEND_LANES) < lanes ? (int)(k % WEND_LANES) : 0;
      double r[3];
      entry_vector(arm, k, r);
      slope[k] =
          (float)wend_slope_weight(&source->face, &fit[lane], slice * WEND_LANES + lane, r);
    }
  }
}

void wend_operator_along(const wend_pairs *pairs, wend_slices slices,
                         const double (*restrict field)[3], float *const area[3], float *alpha,
                         float *beta) {
  for (int32_t t = 0; t < slices.n; t++) {
    const int32_t slice = slices.list[t];
    const int lanes = wend_pairs_lanes(pairs, slice);
    for (int64_t k = pairs->first[slice]; k < pairs->first[slice + 1]; k++) {
      const int lane = (int)(k % WEND_LANES);
      const int32_t i = slice * WEND_LANES + (lane < lanes ? lane : 0);
      double a[3];
      entry_vector(area, k, a);
      alpha[k] = (float)(dot(a, field[i]) / 2);
      beta[k] = (float)(dot(a, field[pairs->index[k]]) / 2);
    }
  }
}

void wend_operator_gradient(const wend_pairs *pairs, wend_slices slices,
                            const wend_operator_source *source, float *const arm[3],
                            float *const gradient[3]) {
  for (int32_t t = 0; t < slices.n; t++) {
    const int32_t slice = slices.list[t];
    const int lanes = wend_pairs_lanes(pairs, slice);
    wend_slope fit[WEND_LANES];
    fit_slopes(pairs, slice, source, arm, fit);
    for (int64_t k = pairs->first[slice]; k < pairs->first[slice + 1]; k++) {
      const int lane = (int)(k % WEND_LANES) < lanes ? (int)(k % WEND_LANES) : 0;
      const int32_t i = slice * WEND_LANES + lane;
      double r[3], c[3];
      entry_vector(arm, k, r);
      gradient_weight(&source->face, r, i, c);
      const double *b = source->field[i];
      const double more = wend_slope_weight(&source->face, &fit[lane], i, r) - dot(b, c);
      for (int d = 0; d < 3; d++) gradient[d][k] = (float)(c[d] + b[d] * more);
    }
  }
}

static double escape_rate(const wend_operator_source *s, int32_t i, const double *m) {
  const wend_domain *domain = s->face.domain;
  const double m2 = dot(m, m);
  if (!(m2 > 0)) return 0;
  const double width =
      domain->dim == 2 ? sqrt(s->face.volume[i] / domain->thickness) : cbrt(s->face.volume[i]);
  const double mb = dot(m, s->field[i]);
  return (s->kappa[i][0] * mb * mb + s->kappa[i][1] * (m2 - mb * mb)) / (sqrt(m2) * width / 2);
}

void wend_operator_escape(const wend_pairs *pairs, wend_slices slices,
                          const wend_operator_source *source, const wend_faces *faces,
                          const unsigned char *restrict surface, double *restrict rate) {
  for (int32_t t = 0; t < slices.n; t++)
    for (int lane = 0; lane < wend_pairs_lanes(pairs, slices.list[t]); lane++) {
      const int32_t i = slices.list[t] * WEND_LANES + lane;
      double missing[3] = {0};
      for (int32_t m = 0; surface[i] && m < pairs->count[i]; m++)
        for (int d = 0; d < 3; d++)
          if (source->face.domain->open[d])
            missing[d] -= faces->area[d][wend_pairs_entry(pairs, i, m)];
      rate[i] = escape_rate(source, i, missing);
    }
}
