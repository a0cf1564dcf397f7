/* SPDX-License-Identifier: LGPL-3.0-or-later
 * volume.h: volumes of particles from the number density of the smoothing kernel. */
#ifndef WEND_KERNELS_VOLUME_H
#define WEND_KERNELS_VOLUME_H

#include "batch.h"

/** Estimates volume [rows] for the rows in `slices`: V_i = 1 / sum_j W(r_ij, H_i), particle i
 * itself included, times the thickness of a 2-D domain. place [n][4]: x, y, z, H > 0; owned
 * particles, then ghosts. A particle without neighbours inside its support gets 1/W(0, H).
 * Local, no overlap. */
void wend_volume_estimate(const wend_pairs *pairs, wend_slices slices,
                          const wend_domain *domain, const wend_smoothing *smoothing,
                          const double (*restrict place)[4], double *restrict volume);

#endif
