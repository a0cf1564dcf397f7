/* SPDX-License-Identifier: LGPL-3.0-or-later
 * streaming.c: Alfvenic streaming as a field-aligned exchange. */
#include "streaming.h"
#include <math.h>

static const double cr_gamma = WEND_CR_GAMMA;

/* As in operator.c: the most of sum_j a_ij, in kappa V / H^2. */
static const double room_most = 10;

typedef double lanes[WEND_LANES];

static int32_t row_of(const wend_pairs *p, int32_t slice, int lane) {
  const int32_t i = slice * WEND_LANES + lane;
  return i < p->rows ? i : p->rows - 1;
}

static double dot(const double *a, const double *b) {
  return a[0] * b[0] + a[1] * b[1] + a[2] * b[2];
}

static inline double least(double a, double b) { return a < b ? a : b; }
static inline double most(double a, double b) { return a > b ? a : b; }

void wend_streaming_columns(const wend_pairs *pairs, wend_slices slices,
                            const wend_operator_source *source, const wend_faces *faces,
                            const wend_streaming_pairs *columns) {
  for (int32_t t = 0; t < slices.n; t++)
    for (int64_t k = pairs->first[slices.list[t]]; k < pairs->first[slices.list[t] + 1]; k++) {
      const int32_t i = row_of(pairs, slices.list[t], (int)(k % WEND_LANES));
      const double *bi = source->field[i], *bj = source->field[pairs->index[k]];
      const double area[3] = {faces->area[0][k], faces->area[1][k], faces->area[2][k]};
      const double arm[3] = {faces->arm[0][k], faces->arm[1][k], faces->arm[2][k]};
      const double r2 = dot(arm, arm), ri = dot(bi, arm), rj = dot(bj, arm);
      const bool apart = r2 > 0;
      const double cos2 = apart ? (ri * ri + rj * rj) / (2 * r2) : 0;
      columns->pull[k] =
          apart ? (float)((dot(area, bi) * ri + dot(area, bj) * rj) / (2 * r2)) : 0;
      columns->share[k] = (float)(source->angle_share * pow(cos2, source->angle_power));
      columns->reach[k] = (float)(fabs(ri + rj) / 2);
    }
}

/* The largest coefficient a pair can have. */
static double largest(const wend_streaming_source *s, int32_t i, int32_t j) {
  const double speed = (s->speed[i][0] + s->speed[j][0]) / 2;
  const double ell = (s->speed[i][1] + s->speed[j][1]) / 2;
  return (s->kappa[i][0] + s->kappa[j][0]) / 2 + cr_gamma * speed * ell;
}

void wend_streaming_bounds(const wend_pairs *pairs, wend_slices slices,
                           const wend_face_source *face, const wend_streaming_source *source,
                           const wend_streaming_pairs *columns, double *restrict room,
                           double *restrict most_of_sums) {
  for (int32_t t = 0; t < slices.n; t++)
    for (int lane = 0; lane < wend_pairs_lanes(pairs, slices.list[t]); lane++) {
      const int32_t i = slices.list[t] * WEND_LANES + lane;
      double full = 0, kept = 0, widest = 0;
      for (int32_t m = 0; m < pairs->count[i]; m++) {
        const int64_t k = wend_pairs_entry(pairs, i, m);
        const double coefficient = largest(source, i, pairs->index[k]);
        const double a = most(0, coefficient * columns->pull[k]);
        full += a;
        kept += columns->share[k] * a;
        widest = most(widest, coefficient);
      }
      const double h = face->place[i][3];
      room[i] = room_most * widest * face->volume[i] / (h * h);
      most_of_sums[i] = least(full, room[i]) + kept;
    }
}

void wend_streaming_flux(const wend_pairs *pairs, wend_slices slices,
                         const float *restrict slope, const wend_streaming_source *source,
                         double (*state)[2]) {
  for (int32_t t = 0; t < slices.n; t++) {
    const int32_t slice = slices.list[t];
    lanes own, g = {0};
    for (int l = 0; l < WEND_LANES; l++) own[l] = state[row_of(pairs, slice, l)][0];
    for (int64_t k = pairs->first[slice]; k < pairs->first[slice + 1]; k += WEND_LANES)
      for (int l = 0; l < WEND_LANES; l++)
        g[l] += slope[k + l] * (state[pairs->index[k + l]][0] - own[l]);
    for (int l = 0; l < wend_pairs_lanes(pairs, slice); l++) {
      const int32_t i = slice * WEND_LANES + l;
      const double speed = source->speed[i][0], ell = source->speed[i][1];
      const double stream =
          own[l] > 0 ? cr_gamma * speed * own[l] * tanh(ell * g[l] / own[l]) : 0;
      state[i][1] = -(source->kappa[i][0] * g[l] + stream);
    }
  }
}

/* kappa_s of a pair from its own difference. */
static inline double pair_coefficient(double speed, double ell, double ebar, double de,
                                      double reach) {
  if (!(ebar > 0) || !(reach > 0)) return 0;
  const double x = ell * fabs(de) / (ebar * reach);
  return cr_gamma * speed * ell * (x > 1e-4 ? tanh(x) / x : 1 - x * x / 3);
}

/* What pass 2 sums up for eight rows. */
typedef struct balance {
  lanes enter, leave, high, low, full;
} balance;

static void ratios(const wend_pairs *p, int32_t slice, const balance *b, const double *room,
                   double (*ratio)[2]) {
  for (int l = 0; l < wend_pairs_lanes(p, slice); l++) {
    const int32_t i = slice * WEND_LANES + l;
    const double full = least(b->full[l], room[i]);
    const double enter = full * b->high[l], leave = full * b->low[l];
    ratio[i][0] = b->enter[l] > enter ? enter / b->enter[l] : 1;
    ratio[i][1] = b->leave[l] < leave ? leave / b->leave[l] : 1;
  }
}

void wend_streaming_ratios(const wend_pairs *pairs, wend_slices slices,
                           const float *restrict alpha, const float *restrict beta,
                           const wend_streaming_source *source,
                           const wend_streaming_pairs *columns, const double *restrict room,
                           const double (*restrict state)[2], float *restrict kept,
                           float *restrict antidiffusive, double (*restrict ratio)[2]) {
  for (int32_t t = 0; t < slices.n; t++) {
    const int32_t slice = slices.list[t];
    balance b = {{0}, {0}, {0}, {0}, {0}};
    for (int64_t k = pairs->first[slice]; k < pairs->first[slice + 1]; k++) {
      const int l = (int)(k % WEND_LANES);
      const int32_t i = row_of(pairs, slice, l), j = pairs->index[k];
      const double de = state[j][0] - state[i][0], ebar = (state[j][0] + state[i][0]) / 2;
      const double speed = (source->speed[i][0] + source->speed[j][0]) / 2;
      const double ell = (source->speed[i][1] + source->speed[j][1]) / 2;
      const double stream = pair_coefficient(speed, ell, ebar, de, columns->reach[k]);
      const double all = (source->kappa[i][0] + source->kappa[j][0]) / 2 + stream;
      const double a = most(0, all * columns->pull[k]);
      kept[k] = (float)(columns->share[k] * a);
      columns->fraction[k] = all > 0 ? (float)(stream / all) : 0;
      const double f = alpha[k] * state[i][1] + beta[k] * state[j][1];
      const float anti = (float)-(f + kept[k] * de);
      antidiffusive[k] = anti;
      b.full[l] += a;
      b.enter[l] += most(anti, 0);
      b.leave[l] += least(anti, 0);
      b.high[l] = most(b.high[l], de);
      b.low[l] = least(b.low[l], de);
    }
    ratios(pairs, slice, &b, room, ratio);
  }
}

static inline double correction(double t, const double *own, const double *other) {
  const double in = least(own[0], other[1]), out = least(own[1], other[0]);
  return t > 0 ? in : out;
}

void wend_streaming_heat(const wend_pairs *pairs, wend_slices slices,
                         const float *restrict kept, const float *restrict fraction,
                         const double (*restrict state)[2], const double *restrict root,
                         const float *restrict antidiffusive, const double (*restrict ratio)[2],
                         double *restrict heat) {
  for (int32_t t = 0; t < slices.n; t++) {
    const int32_t slice = slices.list[t];
    lanes sum = {0};
    for (int64_t k = pairs->first[slice]; k < pairs->first[slice + 1]; k++) {
      const int l = (int)(k % WEND_LANES);
      const int32_t i = row_of(pairs, slice, l), j = pairs->index[k];
      const double anti = antidiffusive[k];
      const double leaves = -(kept[k] * (state[j][0] - state[i][0]) +
                              correction(anti, ratio[i], ratio[j]) * anti);
      const double both = root[i] + root[j];
      const double lost = both > 0 ? (root[i] - root[j]) / both : 0;
      sum[l] += fraction[k] * leaves * lost;
    }
    for (int l = 0; l < wend_pairs_lanes(pairs, slice); l++)
      heat[slice * WEND_LANES + l] = sum[l];
  }
}
