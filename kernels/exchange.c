/* SPDX-License-Identifier: LGPL-3.0-or-later
 * exchange.c: the limited pairwise exchange of energy, in three passes over the pairs.
 *
 * All passes run over slices: eight rows side by side, each lane summing its own row in list
 * order. */
#include "exchange.h"
#include <math.h>

typedef double lanes[WEND_LANES];

static int32_t row_of(const wend_pairs *p, int32_t slice, int lane) {
  const int32_t i = slice * WEND_LANES + lane;
  return i < p->rows ? i : p->rows - 1;
}

static inline double least(double a, double b) { return a < b ? a : b; }
static inline double most(double a, double b) { return a > b ? a : b; }

void wend_exchange_flux_along(const wend_pairs *pairs, wend_slices slices,
                              const float *restrict slope, const double *restrict kappa,
                              double (*state)[2]) {
  for (int32_t t = 0; t < slices.n; t++) {
    const int32_t slice = slices.list[t];
    lanes own, g = {0};
    for (int l = 0; l < WEND_LANES; l++) own[l] = state[row_of(pairs, slice, l)][0];
    for (int64_t k = pairs->first[slice]; k < pairs->first[slice + 1]; k += WEND_LANES) {
      lanes e;
      for (int l = 0; l < WEND_LANES; l++) e[l] = state[pairs->index[k + l]][0];
      for (int l = 0; l < WEND_LANES; l++) g[l] += slope[k + l] * (e[l] - own[l]);
    }
    for (int l = 0; l < wend_pairs_lanes(pairs, slice); l++) {
      const int32_t i = slice * WEND_LANES + l;
      state[i][1] = -kappa[i] * g[l];
    }
  }
}

void wend_exchange_flux_full(const wend_pairs *pairs, wend_slices slices,
                             float *const gradient[3], const double (*restrict field)[3],
                             const double (*restrict kappa)[2], double (*state)[4]) {
  for (int32_t t = 0; t < slices.n; t++) {
    const int32_t slice = slices.list[t];
    lanes own, g[3] = {{0}};
    for (int l = 0; l < WEND_LANES; l++) own[l] = state[row_of(pairs, slice, l)][0];
    for (int64_t k = pairs->first[slice]; k < pairs->first[slice + 1]; k += WEND_LANES) {
      lanes de;
      for (int l = 0; l < WEND_LANES; l++) de[l] = state[pairs->index[k + l]][0] - own[l];
      for (int d = 0; d < 3; d++)
        for (int l = 0; l < WEND_LANES; l++) g[d][l] += gradient[d][k + l] * de[l];
    }
    for (int l = 0; l < wend_pairs_lanes(pairs, slice); l++) {
      const int32_t i = slice * WEND_LANES + l;
      const double *b = field[i];
      const double along = b[0] * g[0][l] + b[1] * g[1][l] + b[2] * g[2][l];
      const double excess = (kappa[i][0] - kappa[i][1]) * along;
      for (int d = 0; d < 3; d++) state[i][1 + d] = -(excess * b[d] + kappa[i][1] * g[d][l]);
    }
  }
}

/* What pass 2 sums up for eight rows. */
typedef struct balance {
  lanes enter, leave; /* P+, P- */
  lanes high, low;    /* largest and smallest e_j - e_i, 0 included */
} balance;

static inline void add_entry(balance *b, int l, double t, double de) {
  b->enter[l] += 0.5 * (t + fabs(t));
  b->leave[l] += 0.5 * (t - fabs(t));
  b->high[l] = most(b->high[l], de);
  b->low[l] = least(b->low[l], de);
}

/* min(1, Q/P), 1 where P = 0: what the row may receive and what it may give. */
static void ratios(const wend_pairs *p, int32_t slice, const balance *b, const double *sum_full,
                   double (*ratio)[2]) {
  for (int l = 0; l < wend_pairs_lanes(p, slice); l++) {
    const int32_t i = slice * WEND_LANES + l;
    const double enter = sum_full[i] * b->high[l], leave = sum_full[i] * b->low[l];
    ratio[i][0] = b->enter[l] > enter ? enter / b->enter[l] : 1;
    ratio[i][1] = b->leave[l] < leave ? leave / b->leave[l] : 1;
  }
}

void wend_exchange_ratios_along(const wend_pairs *pairs, wend_slices slices,
                                const float *restrict alpha, const float *restrict beta,
                                const float *restrict kept, const double *restrict sum_full,
                                const double (*restrict state)[2],
                                float *restrict antidiffusive, double (*restrict ratio)[2]) {
  for (int32_t t = 0; t < slices.n; t++) {
    const int32_t slice = slices.list[t];
    lanes own, q;
    balance b = {{0}, {0}, {0}, {0}};
    for (int l = 0; l < WEND_LANES; l++) {
      own[l] = state[row_of(pairs, slice, l)][0];
      q[l] = state[row_of(pairs, slice, l)][1];
    }
    for (int64_t k = pairs->first[slice]; k < pairs->first[slice + 1]; k += WEND_LANES) {
      lanes e, qj;
      for (int l = 0; l < WEND_LANES; l++) {
        e[l] = state[pairs->index[k + l]][0];
        qj[l] = state[pairs->index[k + l]][1];
      }
      for (int l = 0; l < WEND_LANES; l++) {
        const double de = e[l] - own[l];
        const double f = alpha[k + l] * q[l] + beta[k + l] * qj[l];
        const float anti = (float)-(f + kept[k + l] * de);
        antidiffusive[k + l] = anti;
        add_entry(&b, l, anti, de);
      }
    }
    ratios(pairs, slice, &b, sum_full, ratio);
  }
}

void wend_exchange_ratios_full(const wend_pairs *pairs, wend_slices slices,
                               float *const area[3], const float *restrict kept,
                               const double *restrict sum_full,
                               const double (*restrict state)[4], float *restrict antidiffusive,
                               double (*restrict ratio)[2]) {
  for (int32_t t = 0; t < slices.n; t++) {
    const int32_t slice = slices.list[t];
    lanes own[4];
    balance b = {{0}, {0}, {0}, {0}};
    for (int d = 0; d < 4; d++)
      for (int l = 0; l < WEND_LANES; l++) own[d][l] = state[row_of(pairs, slice, l)][d];
    for (int64_t k = pairs->first[slice]; k < pairs->first[slice + 1]; k += WEND_LANES) {
      lanes other[4];
      for (int l = 0; l < WEND_LANES; l++)
        for (int d = 0; d < 4; d++) other[d][l] = state[pairs->index[k + l]][d];
      for (int l = 0; l < WEND_LANES; l++) {
        const double de = other[0][l] - own[0][l];
        const double f = (area[0][k + l] * (own[1][l] + other[1][l]) +
                          area[1][k + l] * (own[2][l] + other[2][l]) +
                          area[2][k + l] * (own[3][l] + other[3][l])) /
                         2;
        const float anti = (float)-(f + kept[k + l] * de);
        antidiffusive[k + l] = anti;
        add_entry(&b, l, anti, de);
      }
    }
    ratios(pairs, slice, &b, sum_full, ratio);
  }
}

/* Both candidates are formed and one is chosen: a branch on the sign costs several times more.
 */
static inline double correction(double t, const double *own, const double *other) {
  const double in = least(own[0], other[1]), out = least(own[1], other[0]);
  return t > 0 ? in : out;
}

/* C t = in t for t > 0, else out t, to the same bits, by arithmetic alone: compilers turn a
 * choice by the sign of a float into a branch. */
static inline double corrected(double t, double in, double out) {
  return 0.5 * (in * (t + fabs(t)) + out * (t - fabs(t)));
}

void wend_exchange_rate(const wend_pairs *pairs, wend_slices slices, const float *restrict kept,
                        const double *restrict state, int width,
                        const float *restrict antidiffusive, const double (*restrict ratio)[2],
                        double *restrict rate) {
  for (int32_t t = 0; t < slices.n; t++) {
    const int32_t slice = slices.list[t];
    lanes own, enter, leave, sum = {0};
    for (int l = 0; l < WEND_LANES; l++) {
      const int32_t i = row_of(pairs, slice, l);
      own[l] = state[(int64_t)i * width];
      enter[l] = ratio[i][0];
      leave[l] = ratio[i][1];
    }
    for (int64_t k = pairs->first[slice]; k < pairs->first[slice + 1]; k += WEND_LANES)
      for (int l = 0; l < WEND_LANES; l++) {
        const int32_t j = pairs->index[k + l];
        const double in = least(enter[l], ratio[j][1]), out = least(leave[l], ratio[j][0]);
        sum[l] += kept[k + l] * (state[(int64_t)j * width] - own[l]) +
                  corrected(antidiffusive[k + l], in, out);
      }
    for (int l = 0; l < wend_pairs_lanes(pairs, slice); l++)
      rate[slice * WEND_LANES + l] = sum[l];
  }
}

void wend_exchange_count_limited(const wend_pairs *pairs, wend_slices slices,
                                 const float *restrict antidiffusive,
                                 const double (*restrict ratio)[2], int64_t counts[2]) {
  counts[0] = counts[1] = 0;
  for (int32_t t = 0; t < slices.n; t++)
    for (int64_t k = pairs->first[slices.list[t]]; k < pairs->first[slices.list[t] + 1]; k++) {
      const int32_t i = row_of(pairs, slices.list[t], (int)(k % WEND_LANES));
      const double anti = antidiffusive[k];
      counts[0] += anti != 0 && correction(anti, ratio[i], ratio[pairs->index[k]]) < 1;
      counts[1] += anti != 0;
    }
}
