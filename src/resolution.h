/* SPDX-License-Identifier: LGPL-3.0-or-later
 * resolution.h: how well particles resolve the CR energy they carry: is it the physics, or the
 * solver's smearing? */
#ifndef WEND_SRC_RESOLUTION_H
#define WEND_SRC_RESOLUTION_H

#include "transport.h"

/** Means are over the CR energy. Exact sums: the same on any number of ranks. */
typedef struct wend_resolution {
  double unresolved; /**< share of CR energy where the support exceeds |e/g|, g = b.grad e (grad
                        e where there is no field) */
  double kappa_par, kappa_perp; /**< mean diffusivities in use */
  double smearing; /**< mean numerical diffusivity across the field to be expected */
  double limited;  /**< share of pairs on which the limiter holds something back */
} wend_resolution;

/** Share of kappa_par that moves across the field numerically, for each (H/s)^2, s the scale
 * height of e across the field: see resolution.c for where the figure comes from. */
extern const double wend_resolution_smearing;

/** Measures the resolution of energy [owned] = E. The limiter's share belongs to the last rate
 * that was computed. Collective. */
wend_status wend_resolution_measure(wend_team *team, const wend_transport *transport,
                                    const double *energy, wend_resolution *resolution);

#endif
