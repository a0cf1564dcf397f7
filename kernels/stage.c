/* SPDX-License-Identifier: LGPL-3.0-or-later
 * stage.c: the vector arithmetic of super-time-stepping in increments. */
#include "stage.h"
#include <math.h>

void wend_stage_first(int64_t n, double step, const double *restrict rate,
                      double *restrict increment) {
  for (int64_t i = 0; i < n; i++) increment[i] = step * rate[i];
}

void wend_stage_next(int64_t n, const wend_stage *stage, double dt,
                     const double *restrict latest, const double *restrict rate,
                     const double *restrict rate_0, double *restrict older) {
  for (int64_t i = 0; i < n; i++)
    older[i] = stage->mu * latest[i] + stage->nu * older[i] +
               dt * (stage->mt * rate[i] + stage->ga * rate_0[i]);
}

void wend_stage_add(int64_t n, const double *restrict a, const double *restrict b,
                    double *restrict sum) {
  for (int64_t i = 0; i < n; i++) sum[i] = a[i] + b[i];
}

void wend_stage_error(int64_t n, double dt, const double *restrict increment,
                      const double *restrict rate_0, const double *restrict rate_1,
                      double *restrict error) {
  for (int64_t i = 0; i < n; i++)
    error[i] = fabs(6 * dt * (rate_0[i] + rate_1[i]) - 12 * increment[i]) / 15;
}
