/* SPDX-License-Identifier: LGPL-3.0-or-later
 * total.c: exact sums over ranks, limb by limb as integers. */
#include "total.h"

void wend_total(wend_team *team, int n, wend_sum *sum) {
  wend_team_count(team, n * WEND_SUM_LIMBS, sum->limb);
  for (int k = 0; k < n; k++) wend_sum_normalise(&sum[k]);
}

double wend_total_of(wend_team *team, int64_t n, const double *value) {
  wend_sum sum;
  wend_sum_reset(&sum);
  wend_sum_add(&sum, n, value, 1);
  wend_total(team, 1, &sum);
  return wend_sum_value(&sum);
}
