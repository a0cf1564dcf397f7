/* SPDX-License-Identifier: LGPL-3.0-or-later
 * batch.h: arms and weights of a slice of rows, a piece at a time on the stack.
 *
 * A piece holds up to 32 entries of each of the eight rows, in the order of pairs.h, so that
 * arithmetic runs across rows and every row meets its entries in list order whatever the size
 * of a piece. Padding has arm 0 and weight 0: adding it changes no bit of a sum. */
#ifndef WEND_KERNELS_BATCH_H
#define WEND_KERNELS_BATCH_H

#include "domain.h"
#include "pairs.h"
#include "smoothing.h"

#include <stdbool.h>
#include <stdint.h>

#define WEND_BATCH (32 * WEND_LANES)

/** Where pieces come from. Borrowed. */
typedef struct wend_batch_source {
  const wend_pairs *pairs;
  const wend_domain *domain;
  const wend_smoothing *smoothing;
  const double (*place)[4]; /**< x, y, z, H; owned particles, then ghosts; z = 0 in 2-D */
} wend_batch_source;

/** One piece of a slice. */
typedef struct wend_batch {
  int32_t row[WEND_LANES];   /**< the rows; the last one stands in for rows that do not exist */
  int32_t count[WEND_LANES]; /**< entries of each row, 0 where it does not exist */
  double own[3][WEND_LANES]; /**< x, y, z of the rows */
  double inverse[WEND_LANES]; /**< 1/H */
  double factor[WEND_LANES];  /**< W(r, H) = factor s(r / H) */
  int64_t first, end;         /**< first entry of this piece; end of the slice */
  int n;                      /**< entries of this piece, padding included: a multiple of 8 */
  double arm[3][WEND_BATCH];  /**< r_ij = wrap(x_j - x_i) */
  double weight[WEND_BATCH];  /**< w_ij = W(|r_ij|, H_i) */
} wend_batch;

/** Goes to a slice, before its first piece. Local. */
void wend_batch_open(const wend_batch_source *source, int32_t slice, wend_batch *batch);
/** Measures the next piece; false where the slice is done. Local. */
bool wend_batch_next(const wend_batch_source *source, wend_batch *batch);

#endif
