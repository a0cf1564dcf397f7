/* SPDX-License-Identifier: LGPL-3.0-or-later
 * volume.c: volumes of particles from the number density of the smoothing kernel. */
#include "volume.h"

void wend_volume_estimate(const wend_pairs *pairs, wend_slices slices,
                          const wend_domain *domain, const wend_smoothing *smoothing,
                          const double (*restrict place)[4], double *restrict volume) {
  const wend_batch_source source = {pairs, domain, smoothing, place};
  const double here = 0.0;
  double top;
  wend_batch batch;
  smoothing->shape(1, &here, &top);
  for (int32_t t = 0; t < slices.n; t++) {
    double sum[WEND_LANES];
    wend_batch_open(&source, slices.list[t], &batch);
    for (int lane = 0; lane < WEND_LANES; lane++) sum[lane] = batch.factor[lane] * top;
    while (wend_batch_next(&source, &batch))
      for (int e = 0; e < batch.n; e += WEND_LANES)
        for (int lane = 0; lane < WEND_LANES; lane++) sum[lane] += batch.weight[e + lane];
    for (int lane = 0; lane < wend_pairs_lanes(pairs, slices.list[t]); lane++)
      volume[batch.row[lane]] = domain->thickness / sum[lane];
  }
}
