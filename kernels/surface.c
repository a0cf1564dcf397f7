/* SPDX-License-Identifier: LGPL-3.0-or-later
 * surface.c: particles on a free surface, by their one-sided neighbourhood. */
#include "surface.h"

/* How one-sided a neighbourhood must be, and the half-angle of the cone that must be empty. */
static const double one_sided = 0.1;
static const double cos2_cone = 0.5;

static double arm(const wend_domain *domain, const double *xi, const double *xj, double r[3]) {
  for (int a = 0; a < 3; a++) r[a] = wend_domain_wrap(domain, a, xj[a] - xi[a]);
  return r[0] * r[0] + r[1] * r[1] + r[2] * r[2];
}

static unsigned char on_surface(const wend_pairs *p, int32_t i, const wend_domain *domain,
                                const wend_smoothing *smoothing, const double (*place)[4]) {
  double r[3], n[3] = {0}, sum = 0;
  for (int32_t m = 0; m < p->count[i]; m++) {
    const int32_t j = p->index[wend_pairs_entry(p, i, m)];
    const double q = sqrt(arm(domain, place[i], place[j], r)) / place[i][3];
    double w;
    smoothing->shape(1, &q, &w);
    for (int a = 0; a < 3; a++) n[a] -= w * r[a];
    sum += w;
  }
  const double n2 = n[0] * n[0] + n[1] * n[1] + n[2] * n[2];
  const double least = one_sided * place[i][3] * sum;
  if (n2 <= least * least) return 0;
  for (int32_t m = 0; m < p->count[i]; m++) {
    const int32_t j = p->index[wend_pairs_entry(p, i, m)];
    const double r2 = arm(domain, place[i], place[j], r);
    const double along = n[0] * r[0] + n[1] * r[1] + n[2] * r[2];
    if (along > 0 && along * along > cos2_cone * n2 * r2) return 0;
  }
  return 1;
}

void wend_surface_find(const wend_pairs *pairs, wend_slices slices, const wend_domain *domain,
                       const wend_smoothing *smoothing, const double (*restrict place)[4],
                       unsigned char *restrict surface) {
  for (int32_t t = 0; t < slices.n; t++)
    for (int lane = 0; lane < wend_pairs_lanes(pairs, slices.list[t]); lane++) {
      const int32_t i = slices.list[t] * WEND_LANES + lane;
      surface[i] = on_surface(pairs, i, domain, smoothing, place);
    }
}
