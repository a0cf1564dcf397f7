/* SPDX-License-Identifier: LGPL-3.0-or-later
 * reach.c: the range of values within so many layers of neighbours. */
#include "reach.h"
#include <math.h>

void wend_reach_widen(const wend_pairs *pairs, wend_slices slices,
                      const double (*restrict range)[2], double (*restrict wide)[2]) {
  for (int32_t t = 0; t < slices.n; t++)
    for (int lane = 0; lane < wend_pairs_lanes(pairs, slices.list[t]); lane++) {
      const int32_t i = slices.list[t] * WEND_LANES + lane;
      double low = range[i][0], high = range[i][1];
      for (int32_t m = 0; m < pairs->count[i]; m++) {
        const int32_t j = pairs->index[wend_pairs_entry(pairs, i, m)];
        low = range[j][0] < low ? range[j][0] : low;
        high = range[j][1] > high ? range[j][1] : high;
      }
      wide[i][0] = low;
      wide[i][1] = high;
    }
}

double wend_reach_excess(int32_t n, const double *restrict value,
                         const double (*restrict range)[2]) {
  double most = 0;
  for (int32_t i = 0; i < n; i++) {
    if (isnan(value[i])) return NAN;
    most = fmax(most, fmax(range[i][0] - value[i], value[i] - range[i][1]));
  }
  return most;
}
