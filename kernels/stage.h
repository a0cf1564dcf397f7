/* SPDX-License-Identifier: LGPL-3.0-or-later
 * stage.h: the vector arithmetic of super-time-stepping in increments. */
#ifndef WEND_KERNELS_STAGE_H
#define WEND_KERNELS_STAGE_H

#include "supertime.h"
#include <stdint.h>

/** First stage: increment = first dt rate, n values. No overlap. */
void wend_stage_first(int64_t n, double step, const double *restrict rate,
                      double *restrict increment);

/** Next stage, in place of the older increment: older = mu latest + nu older + dt (mt rate + ga
 * rate_0). */
void wend_stage_next(int64_t n, const wend_stage *stage, double dt,
                     const double *restrict latest, const double *restrict rate,
                     const double *restrict rate_0, double *restrict older);

/** sum = a + b, n values. No overlap. */
void wend_stage_add(int64_t n, const double *restrict a, const double *restrict b,
                    double *restrict sum);

/** Error of a super-step of second order, [12 (y_0 - y_1) + 6 dt (F_0 + F_1)] / 15 (Sommeijer,
 * Shampine & Verwer 1998, J. Comput. Appl. Math. 88, 315, recalled), its magnitude, from the
 * increment y_1 - y_0. */
void wend_stage_error(int64_t n, double dt, const double *restrict increment,
                      const double *restrict rate_0, const double *restrict rate_1,
                      double *restrict error);

#endif
