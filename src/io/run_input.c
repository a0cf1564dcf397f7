/* SPDX-License-Identifier: LGPL-3.0-or-later
 * run_input.c: reads the setup and the particles of a run, and checks that they fit. */
#include "particle_file.h"
#include "run.h"
#include <string.h>

#define BIT(column) ((uint64_t)1 << (column))

/* Without a field everything diffuses in all directions alike: nobody means that by silence. */
static const uint64_t needed = BIT(WEND_X) | BIT(WEND_Y) | BIT(WEND_BX) | BIT(WEND_ENERGY);

static void choose_domain(wend_team *team, wend_run *run, const wend_file_facts *facts) {
  const wend_setup *setup = &run->setup;
  if (!setup->domain_given && !facts->domain_given)
    wend_fail(team, WEND_ERR_SETUP, "%s: domain is missing, and %s holds no box", setup->path,
              setup->particles);
  else if (setup->domain_given && setup->domain.dim != facts->domain.dim)
    wend_fail(team, WEND_ERR_SETUP, "%s: domain has %d axes, and the positions in %s have %d",
              setup->path, setup->domain.dim, setup->particles, facts->domain.dim);
  run->domain = setup->domain_given ? setup->domain : facts->domain;
}

static void choose_start(wend_team *team, wend_run *run, const wend_file_facts *facts) {
  const wend_setup *setup = &run->setup;
  run->start = setup->start_given ? setup->start : facts->time;
  if (!(setup->end > run->start))
    wend_fail(team, WEND_ERR_SETUP,
              "%s: time.end is not after the time of %s, where the run starts", setup->path,
              setup->particles);
  else if (setup->n_times > 0 && setup->times[0] < run->start)
    wend_fail(team, WEND_ERR_SETUP,
              "%s: output.times begins before the time of %s, where the run starts",
              setup->path, setup->particles);
}

static void check_streaming(wend_team *team, const wend_run *run) {
  const wend_settings *settings = &run->setup.settings;
  const bool streams = settings->streaming_length > 0 || settings->streaming_supports > 0;
  if (streams && run->particles.column[WEND_DENSITY] == NULL)
    wend_fail(team, WEND_ERR_FILE, "%s: streaming needs the record massDensity, which %s lacks",
              run->setup.path, run->setup.particles);
}

/* A host's own volumes are better than an estimate: its energies and densities belong to them.
 */
static void choose_volumes(wend_team *team, wend_run *run) {
  wend_particles *p = &run->particles;
  run->volumes = p->column[WEND_VOLUME] != NULL ? WEND_VOLUME_RECORD : WEND_VOLUME_KERNEL;
  if (run->volumes == WEND_VOLUME_RECORD || p->column[WEND_MASS] == NULL ||
      p->column[WEND_DENSITY] == NULL)
    return;
  run->volumes = WEND_VOLUME_MASS;
  if (wend_particles_add(team, p, WEND_VOLUME) != WEND_OK) return;
  for (int32_t i = 0; i < p->n; i++)
    p->column[WEND_VOLUME][i] = p->column[WEND_MASS][i] / p->column[WEND_DENSITY][i];
}

wend_status wend_run_read_particles(wend_team *team, wend_run *run) {
  wend_status status;
  wend_file_facts facts;
  const wend_setup *setup = &run->setup;
  WEND_TRY(wend_particle_file_read_at(team, setup->particles, setup->iteration, &setup->units,
                                      needed, &run->particles, &facts,
                                      &run->energy_is_density));
  run->file_records = wend_particles_mask(&run->particles);
  run->total = run->particles.n;
  wend_team_count(team, 1, &run->total);
  if (run->total == 0)
    wend_fail(team, WEND_ERR_PARTICLES, "%s: species gas holds no particles", setup->particles);
  choose_domain(team, run, &facts);
  choose_start(team, run, &facts);
  check_streaming(team, run);
  choose_volumes(team, run);
  WEND_TRY(wend_agree(team));
  WEND_TRY(wend_particle_file_place(team, setup->particles, &run->domain, &run->particles));
done:
  return status;
}

wend_status wend_run_begin(wend_team *team, const char *path, wend_run *run) {
  memset(run, 0, sizeof *run);
  return wend_setup_read(team, path, &run->setup);
}

void wend_run_reset(wend_run *run) {
  wend_march_reset(&run->march);
  wend_transport_reset(&run->transport);
  wend_geometry_reset(&run->geometry);
  wend_particles_reset(&run->particles);
  wend_setup_reset(&run->setup);
  memset(run, 0, sizeof *run);
}
