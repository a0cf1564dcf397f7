/* SPDX-License-Identifier: LGPL-3.0-or-later
 * geometry.h: everything that follows from where particles are: supports, pairs, volumes,
 * faces. */
#ifndef WEND_SRC_GEOMETRY_H
#define WEND_SRC_GEOMETRY_H

#include "faces.h"
#include "neighbours.h"
#include "settings.h"

/** How well the geometry turned out; the same on every rank. */
typedef struct wend_geometry_report {
  int64_t particles, pairs; /**< pairs counted once */
  int64_t fallbacks;        /**< gradients that fell back to the isotropic form */
  int64_t surface;          /**< particles on a free surface */
  int sweeps;               /**< Chebyshev sweeps made */
  double closure_raw,
      closure; /**< before and after: sqrt(sum |sum_j A|^2 / sum (sum_j |A|)^2) */
  double span_mean, span_rms; /**< sum_j A_ij.r_ij / (2 D V_i): mean, and rms about 1, after */
  double span_raw;            /**< its mean before */
  double support_least, support_most;
  double seconds_supports, seconds_pairs, seconds_faces; /**< wall time of this rank */
} wend_geometry_report;

typedef struct wend_geometry {
  wend_domain domain;
  const wend_smoothing *smoothing;
  wend_neighbours near;
  double *volume;         /**< [local] */
  double (*inverse)[6];   /**< [local] inverse moment matrix */
  unsigned char *surface; /**< [owned] 1 on a free surface */
  wend_faces faces;       /**< [entries] */
  wend_geometry_report report;
} wend_geometry;

/** Builds the geometry of particles that were cut (cut.h). Collective.
 *
 *  Supports come from WEND_SUPPORT where present, else from the target number; volumes from
 * WEND_VOLUME, else from the kernel sum. Errors name the particle. */
wend_status wend_geometry_init(wend_team *team, const wend_domain *domain,
                               const wend_settings *settings, const wend_particles *particles,
                               wend_geometry *geometry);
/** What the face kernels read. Local; borrowed from the geometry. */
wend_face_source wend_geometry_source(const wend_geometry *geometry);
/** Frees pair columns that only the building of operators needs. Local. */
void wend_geometry_release_faces(wend_geometry *geometry);
/** Frees all of it. Local. */
void wend_geometry_reset(wend_geometry *geometry);

#endif
