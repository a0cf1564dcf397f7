/* SPDX-License-Identifier: LGPL-3.0-or-later
 * sum.h: exact sums of doubles, the same for any order and any split of the terms.
 *
 * A fixed-point number of 32-bit digits in 64-bit limbs spans the whole double range. Adding a
 * double is exact; partial sums add limb by limb as integers (one MPI operation), so that sums
 * over ranks do not depend on their number. Room for 2^40 terms; NaN and infinities are
 * flagged. */
#ifndef WEND_KERNELS_SUM_H
#define WEND_KERNELS_SUM_H

#include <stdint.h>

/** Limbs of one sum: 2^-1074 to 2^1024 in 32-bit digits, headroom of 2^40 and a sign on top,
 * and a last limb that counts terms that were not finite. */
#define WEND_SUM_LIMBS 70

typedef struct wend_sum {
  int64_t limb[WEND_SUM_LIMBS];
} wend_sum;

/** Sets the sum to zero. */
void wend_sum_reset(wend_sum *sum);
/** Adds n doubles, stride apart, exactly. Limbs are left normalised: any 2^30 may be added. */
void wend_sum_add(wend_sum *sum, int64_t n, const double *term, int64_t stride);
/** Adds another sum, exactly. */
void wend_sum_merge(wend_sum *sum, const wend_sum *other);
/** Makes limbs canonical after they were added as integers (at most 2^30 at a time). */
void wend_sum_normalise(wend_sum *sum);
/** The sum rounded once to the nearest double, ties to even; NaN where a term was not finite.
 */
double wend_sum_value(const wend_sum *sum);

#endif
