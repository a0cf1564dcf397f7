/* SPDX-License-Identifier: LGPL-3.0-or-later
 * transport.h: the right-hand side dE/dt of CR transport on a fixed geometry, over all ranks.
 */
#ifndef WEND_SRC_TRANSPORT_H
#define WEND_SRC_TRANSPORT_H

#include "geometry.h"
#include "streaming.h"

typedef struct wend_transport {
  wend_geometry *geometry;
  bool along; /**< kappa_perp = 0 everywhere: one scalar flux a particle */
  bool limited;
  bool streams;        /**< Alfvenic streaming beside diffusion */
  bool escapes;        /**< some surface is open */
  int width;           /**< values a particle in `state`: 2 along the field, 4 in full */
  double (*field)[3];  /**< [local] unit field, 0 where B = 0 */
  double (*kappa)[2];  /**< [local] kappa_par, kappa_perp; equal where B = 0 */
  double *kappa_along; /**< [owned] kappa_par once more, for the along-field pass */
  float *slope, *alpha, *beta; /**< [entries] along-field coefficients */
  float *gradient[3];          /**< [entries] c_ij, in full only */
  float *kept;                 /**< [entries] s_ij */
  float *mu;        /**< [entries] sharpening weights; NULL: fluxes are not sharpened */
  double *sharp;    /**< [owned][width - 1] sharpened fluxes; NULL likewise */
  double *sum_full; /**< [owned] sum_j a_ij */
  double
      *escape; /**< [owned] energy that leaves through a free surface: rate x e; NULL: none */
  double (*speed)[2];          /**< [local] v_A and ell; NULL: no streaming */
  wend_streaming_pairs stream; /**< [entries] streaming columns */
  double *root;                /**< [local] e^(1/4), for the heat */
  double *heat;                /**< [owned] streaming heat a time, after each rate */
  int64_t ceilings;            /**< particles whose v_A was cut to the ceiling; all ranks */
  double *state;               /**< [local][width] e and flux */
  float *antidiffusive;        /**< [entries] t_ij */
  double (*ratio)[2];          /**< [local] R+, R- */
  double
      explicit_step; /**< forward-Euler limit min V / sum (a + s + escape) over all particles */
  int64_t applications; /**< times the right-hand side was computed */
} wend_transport;

/** Builds the operator from B, kappa_par and kappa_perp of the particles. Collective.
 *
 *  Pair columns and matrices that only this needs are freed from the geometry, which must
 * outlive the transport. Absent columns count as zero; with streaming the density must be
 * there, and an absent ionised fraction counts as one. A NaN or negative coefficient is an
 * error that names the particle. */
wend_status wend_transport_init(wend_team *team, const wend_settings *settings,
                                const wend_particles *particles, wend_geometry *geometry,
                                wend_transport *transport);

/** Computes rate [owned] = dE/dt from energy [owned] = E, and escaped [owned] = what of it
 * leaves through open surfaces a time (may be NULL where none is open). Collective; halos
 * travel while interior slices are worked on. */
wend_status wend_transport_rate(wend_team *team, wend_transport *transport,
                                const double *energy, double *rate, double *escaped);

/** Share of pairs on which the limiter holds something back, for the last rate. Collective. */
double wend_transport_limited_share(wend_team *team, const wend_transport *transport);

/** Frees all of it. Local. */
void wend_transport_reset(wend_transport *transport);

#endif
