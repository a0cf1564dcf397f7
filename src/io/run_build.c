/* SPDX-License-Identifier: LGPL-3.0-or-later
 * run_build.c: from particles as they were read to a march that can step. */
#include "cut.h"
#include "laws.h"
#include "run.h"
#include <math.h>
#include <stdlib.h>
#include <string.h>

/* Ranks whose pairs exceed the mean by more than this share are cut again. */
static const double uneven = 0.05;

/* Keeps the supports and volumes in use with the particles: files show them, and a second
 * geometry of the same particles finds them there. */
static wend_status keep_measures(wend_team *team, wend_run *run) {
  wend_particles *p = &run->particles;
  const wend_geometry *g = &run->geometry;
  wend_particles_add(team, p, WEND_SUPPORT);
  wend_particles_add(team, p, WEND_VOLUME);
  for (int32_t i = 0; i < p->n && team->status == WEND_OK; i++) {
    p->column[WEND_SUPPORT][i] = g->near.place[i][3];
    p->column[WEND_VOLUME][i] = g->volume[i];
  }
  return wend_agree(team);
}

static double pairs_of(const wend_neighbours *near) {
  double pairs = 0;
  for (int32_t i = 0; i < near->owned; i++) pairs += near->count[i];
  return pairs;
}

static double imbalance_of(wend_team *team, const wend_run *run) {
  const wend_geometry *g = &run->geometry;
  double most = pairs_of(&g->near);
  wend_team_max(team, 1, &most);
  return g->report.pairs > 0 ? most * team->size / (2 * (double)g->report.pairs) : 1;
}

static wend_status cut_again(wend_team *team, wend_run *run) {
  wend_status status;
  wend_geometry *g = &run->geometry;
  const wend_geometry_report first = g->report;
  uint32_t *weight = wend_allocate(team, run->particles.n, sizeof *weight);
  WEND_TRY(wend_agree(team));
  for (int32_t i = 0; i < run->particles.n; i++) weight[i] = (uint32_t)g->near.count[i] + 1;
  wend_geometry_reset(g);
  WEND_TRY(wend_cut_particles(team, &run->domain, &run->particles, weight));
  WEND_TRY(wend_geometry_init(team, &run->domain, &run->setup.settings, &run->particles, g));
  g->report.seconds_supports += first.seconds_supports;
  g->report.seconds_pairs += first.seconds_pairs;
  g->report.seconds_faces += first.seconds_faces;
done:
  free(weight);
  return status;
}

static wend_status build_geometry(wend_team *team, wend_run *run) {
  wend_status status;
  WEND_TRY(wend_cut_particles(team, &run->domain, &run->particles, NULL));
  WEND_TRY(wend_geometry_init(team, &run->domain, &run->setup.settings, &run->particles,
                              &run->geometry));
  WEND_TRY(keep_measures(team, run));
  run->imbalance = imbalance_of(team, run);
  if (run->imbalance > 1 + uneven) {
    WEND_TRY(cut_again(team, run));
    run->imbalance = imbalance_of(team, run);
  }
done:
  return status;
}

static void finish_energies(wend_run *run) {
  double *energy = run->particles.column[WEND_ENERGY];
  for (int32_t i = 0; i < run->particles.n && run->energy_is_density; i++)
    energy[i] *= run->geometry.volume[i];
  run->energy_is_density = false;
}

/* Coefficients and fluxes of pairs are kept in single precision. Units far from the particles'
 * own leave its range: above it they are infinite, which shows, and below it they are 0, which
 * would pass for more smearing. */
static wend_status check_units(wend_team *team, const wend_run *run) {
  const wend_transport *t = &run->transport;
  const double highest = 1e36, lowest = 1e-20;
  double flux = 0;
  for (int32_t i = 0; i < run->particles.n; i++)
    flux = fmax(flux, t->sum_full[i] * run->march.high);
  wend_team_max(team, 1, &flux);
  if (!(t->explicit_step > 0) || !(flux <= highest) || (flux > 0 && flux < lowest))
    wend_fail(team, WEND_ERR_SETUP,
              "%s: units: with these, coefficients of the exchange leave the range of single "
              "precision: choose units of length, time and mass nearer to the particles' own, "
              "for example kpc, Myr and Msun",
              run->setup.path);
  return wend_agree(team);
}

wend_status wend_run_build(wend_team *team, wend_run *run) {
  wend_status status;
  const wend_settings *settings = &run->setup.settings;
  WEND_TRY(wend_laws_apply(team, &run->setup, &run->particles));
  WEND_TRY(build_geometry(team, run));
  finish_energies(run);
  WEND_TRY(
      wend_transport_init(team, settings, &run->particles, &run->geometry, &run->transport));
  wend_laws_drop_constant(&run->setup, &run->particles);
  WEND_TRY(wend_march_init(team, settings, &run->transport, run->particles.column[WEND_ENERGY],
                           run->start, &run->march));
  WEND_TRY(check_units(team, run));
done:
  return status;
}
