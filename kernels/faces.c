/* SPDX-License-Identifier: LGPL-3.0-or-later
 * faces.c: closed, volume-exact pair areas. */
#include "faces.h"

/* Entries worked on at a time: 32 of each of the eight rows of a slice. */
enum { CHUNK = 32 * WEND_LANES };

static int32_t row_of(const wend_pairs *p, int32_t slice, int lane) {
  const int32_t i = slice * WEND_LANES + lane;
  return i < p->rows ? i : p->rows - 1;
}

typedef struct chunk {
  double r[3][CHUNK], r2[CHUNK];
  double qi[CHUNK], qj[CHUNK], wi[CHUNK], wj[CHUNK];
} chunk;

/* Arms and both kernel shapes of the entries k .. k + n - 1 of a slice. */
static void measure(const wend_pairs *p, int32_t slice, int64_t k, int n,
                    const wend_face_source *s, chunk *c) {
  for (int e = 0; e < n; e++) {
    const double *xi = s->place[row_of(p, slice, e % WEND_LANES)];
    const double *xj = s->place[p->index[k + e]];
    double r2 = 0;
    for (int a = 0; a < 3; a++) {
      c->r[a][e] = wend_domain_wrap(s->domain, a, xj[a] - xi[a]);
      r2 += c->r[a][e] * c->r[a][e];
    }
    c->r2[e] = r2;
    const double r = sqrt(r2);
    c->qi[e] = r / xi[3];
    c->qj[e] = r / xj[3];
  }
  s->smoothing->shape(n, c->qi, c->wi);
  s->smoothing->shape(n, c->qj, c->wj);
}

/* V M^-1 r w: one end's half of the raw area. */
static void half_area(double weight, const double *m, double x, double y, double z, double *a) {
  a[0] = weight * (m[0] * x + m[1] * y + m[2] * z);
  a[1] = weight * (m[1] * x + m[3] * y + m[4] * z);
  a[2] = weight * (m[2] * x + m[4] * y + m[5] * z);
}

static void raw_chunk(const wend_pairs *p, int32_t slice, int64_t k, int n,
                      const wend_face_source *s, const chunk *c, const wend_faces *f,
                      double (*diagonal)[2]) {
  const double norm = s->smoothing->norm[s->domain->dim - 2];
  for (int e = 0; e < n; e++) {
    const int lane = e % WEND_LANES;
    const int32_t i = row_of(p, slice, lane), j = p->index[k + e];
    const double hi = s->place[i][3], hj = s->place[j][3];
    const double di = s->domain->dim == 2 ? hi * hi : hi * hi * hi;
    const double dj = s->domain->dim == 2 ? hj * hj : hj * hj * hj;
    const double wi = norm * c->wi[e] / di, wj = norm * c->wj[e] / dj;
    const double x = c->r[0][e], y = c->r[1][e], z = c->r[2][e];
    double a[3], b[3];
    half_area(s->volume[i] * wi, s->inverse[i], x, y, z, a);
    half_area(s->volume[j] * wj, s->inverse[j], x, y, z, b);
    const double omega = (wi + wj) * (s->volume[i] + s->volume[j]) / (hi * hi + hj * hj);
    for (int d = 0; d < 3; d++) {
      f->area[d][k + e] = (float)(a[d] + b[d]);
      f->arm[d][k + e] = (float)c->r[d][e];
    }
    f->weight[k + e] = j == i ? 0 : (float)omega;
    diagonal[lane][0] += f->weight[k + e];
    diagonal[lane][1] += f->weight[k + e] * c->r2[e];
  }
}

void wend_faces_raw(const wend_pairs *pairs, wend_slices slices, const wend_face_source *source,
                    const wend_faces *faces, double (*restrict diagonal)[2]) {
  chunk c;
  for (int32_t t = 0; t < slices.n; t++) {
    const int32_t slice = slices.list[t];
    double sum[WEND_LANES][2] = {{0}};
    for (int64_t k = pairs->first[slice]; k < pairs->first[slice + 1]; k += CHUNK) {
      const int64_t left = pairs->first[slice + 1] - k;
      const int n = left < CHUNK ? (int)left : CHUNK;
      measure(pairs, slice, k, n, source, &c);
      raw_chunk(pairs, slice, k, n, source, &c, faces, sum);
    }
    for (int lane = 0; lane < wend_pairs_lanes(pairs, slice); lane++)
      for (int d = 0; d < 2; d++) diagonal[slice * WEND_LANES + lane][d] = sum[lane][d];
  }
}

/* The eight rows' own unknowns, component by component, so that lanes lie side by side. */
static void own_unknowns(const wend_pairs *p, int32_t slice, const double (*unknown)[4],
                         double own[4][WEND_LANES]) {
  for (int lane = 0; lane < WEND_LANES; lane++)
    for (int d = 0; d < 4; d++) own[d][lane] = unknown[row_of(p, slice, lane)][d];
}

/* Areas of one entry of the eight rows with the unknowns applied. */
static inline void changed_areas(const wend_pairs *p, const wend_faces *f, int64_t k,
                                 const double (*unknown)[4], double own[4][WEND_LANES],
                                 double a[3][WEND_LANES]) {
  double other[4][WEND_LANES];
  for (int lane = 0; lane < WEND_LANES; lane++)
    for (int d = 0; d < 4; d++) other[d][lane] = unknown[p->index[k + lane]][d];
  for (int d = 0; d < 3; d++)
    for (int lane = 0; lane < WEND_LANES; lane++)
      a[d][lane] =
          f->area[d][k + lane] +
          f->weight[k + lane] * ((own[d][lane] - other[d][lane]) +
                                 (own[3][lane] + other[3][lane]) * f->arm[d][k + lane]);
}

void wend_faces_residual(const wend_pairs *pairs, wend_slices slices, int dim,
                         const wend_faces *faces, const double *restrict volume,
                         const double (*restrict unknown)[4], double (*restrict residual)[4]) {
  for (int32_t t = 0; t < slices.n; t++) {
    const int32_t slice = slices.list[t];
    double own[4][WEND_LANES], a[3][WEND_LANES], sum[4][WEND_LANES] = {{0}};
    own_unknowns(pairs, slice, unknown, own);
    for (int64_t k = pairs->first[slice]; k < pairs->first[slice + 1]; k += WEND_LANES) {
      changed_areas(pairs, faces, k, unknown, own, a);
      for (int d = 0; d < 3; d++)
        for (int lane = 0; lane < WEND_LANES; lane++) {
          sum[d][lane] += a[d][lane];
          sum[3][lane] += a[d][lane] * faces->arm[d][k + lane];
        }
    }
    for (int lane = 0; lane < wend_pairs_lanes(pairs, slice); lane++) {
      const int32_t i = slice * WEND_LANES + lane;
      for (int d = 0; d < 3; d++) residual[i][d] = -sum[d][lane];
      residual[i][3] = 2 * dim * volume[i] - sum[3][lane];
    }
  }
}

void wend_faces_extent(const wend_pairs *pairs, wend_slices slices, const wend_faces *faces,
                       const double (*restrict unknown)[4], double *restrict extent) {
  for (int32_t t = 0; t < slices.n; t++) {
    const int32_t slice = slices.list[t];
    double own[4][WEND_LANES], a[3][WEND_LANES], sum[WEND_LANES] = {0};
    own_unknowns(pairs, slice, unknown, own);
    for (int64_t k = pairs->first[slice]; k < pairs->first[slice + 1]; k += WEND_LANES) {
      changed_areas(pairs, faces, k, unknown, own, a);
      for (int lane = 0; lane < WEND_LANES; lane++)
        sum[lane] +=
            sqrt(a[0][lane] * a[0][lane] + a[1][lane] * a[1][lane] + a[2][lane] * a[2][lane]);
    }
    for (int lane = 0; lane < wend_pairs_lanes(pairs, slice); lane++)
      extent[slice * WEND_LANES + lane] = sum[lane];
  }
}

void wend_faces_apply(const wend_pairs *pairs, wend_slices slices, const wend_faces *faces,
                      const double (*restrict unknown)[4]) {
  for (int32_t t = 0; t < slices.n; t++) {
    const int32_t slice = slices.list[t];
    double own[4][WEND_LANES], a[3][WEND_LANES];
    own_unknowns(pairs, slice, unknown, own);
    for (int64_t k = pairs->first[slice]; k < pairs->first[slice + 1]; k += WEND_LANES) {
      changed_areas(pairs, faces, k, unknown, own, a);
      for (int d = 0; d < 3; d++)
        for (int lane = 0; lane < WEND_LANES; lane++)
          faces->area[d][k + lane] = (float)a[d][lane];
    }
  }
}

wend_chebyshev wend_chebyshev_begin(double lowest, double highest) {
  const double theta = (highest + lowest) / 2, delta = (highest - lowest) / 2;
  return (wend_chebyshev){.sigma = theta / delta,
                          .delta = delta,
                          .rho = delta / theta,
                          .carry = 0,
                          .gain = 1 / theta};
}

void wend_chebyshev_next(wend_chebyshev *chebyshev) {
  const double rho = 1 / (2 * chebyshev->sigma - chebyshev->rho);
  chebyshev->carry = rho * chebyshev->rho;
  chebyshev->gain = 2 * rho / chebyshev->delta;
  chebyshev->rho = rho;
}

void wend_faces_update(int32_t n, const wend_chebyshev *chebyshev, const double scale[2],
                       const double (*restrict diagonal)[2],
                       const double (*restrict residual)[4],
                       const unsigned char *restrict surface, double (*restrict direction)[4],
                       double (*restrict unknown)[4]) {
  for (int32_t i = 0; i < n; i++) {
    if (surface[i] || !(diagonal[i][0] > 0 && diagonal[i][1] > 0)) continue;
    const double inverse[2] = {scale[0] / diagonal[i][0], scale[1] / diagonal[i][1]};
    for (int d = 0; d < 4; d++) {
      direction[i][d] = chebyshev->carry * direction[i][d] +
                        chebyshev->gain * inverse[d / 3] * residual[i][d];
      unknown[i][d] += direction[i][d];
    }
  }
}
