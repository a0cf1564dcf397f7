/* SPDX-License-Identifier: GPL-3.0-or-later
 * experiment.h: particles, geometry, transport and march of one problem, from particles to the
 * end time. */
#ifndef WEND_SCENES_EXPERIMENT_H
#define WEND_SCENES_EXPERIMENT_H

#include "march.h"

typedef struct wend_experiment {
  wend_domain domain;
  wend_settings settings;
  wend_particles particles;
  wend_geometry geometry;
  wend_transport transport;
  wend_march march;
} wend_experiment;

/** A quantity of a place, given by a problem. */
typedef double (*wend_profile)(const double x[3], const void *problem);

/** Cuts the particles and builds geometry, transport and march. CR energies are set to
 * `density` times volume. Collective. Domain, settings and particles are set; WEND_ENERGY must
 * be a column. */
wend_status wend_experiment_begin(wend_team *team, wend_experiment *experiment,
                                  wend_profile density, const void *problem);

/** Marches to `until`, at most `steps` super-steps (0: no limit). Collective. */
wend_status wend_experiment_run(wend_team *team, wend_experiment *experiment, double until);

/** Norms of e - exact, volume-weighted, over all particles; exact sums, so the same on any
 * ranks. */
typedef struct wend_norms {
  double l1, l2, linf;
  double low, high; /**< least and largest e */
} wend_norms;

/** Compares e with the exact solution. Collective. */
wend_norms wend_experiment_norms(wend_team *team, const wend_experiment *experiment,
                                 wend_profile exact, const void *problem);

/** Frees all of it. Local. */
void wend_experiment_end(wend_experiment *experiment);

#endif
