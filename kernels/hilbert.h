/* SPDX-License-Identifier: LGPL-3.0-or-later
 * hilbert.h: keys along the Hilbert curve (Skilling 2004, AIP Conf. Proc. 707, 381). */
#ifndef WEND_KERNELS_HILBERT_H
#define WEND_KERNELS_HILBERT_H

#include "domain.h"
#include <stdint.h>

/** Computes the Hilbert key of n places: 31 bits an axis in 2-D, 21 bits an axis in 3-D.
 *  place [n][4] holds x, y, z and one more number that is not read; coordinates outside the
 * domain count as being on its border. Keys lie in [0, 2^62) in 2-D and [0, 2^63) in 3-D. */
void wend_hilbert_keys(const wend_domain *domain, int32_t n, const double (*restrict place)[4],
                       uint64_t *restrict key);

#endif
