/* SPDX-License-Identifier: LGPL-3.0-or-later
 * particle_file_read.c: reads particles from an openPMD 1.x file. */
#include "box.h"
#include "particle_file.h"
#include "particle_reader.h"
#include <inttypes.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum { NAME_MOST = 256 };

/* CR energy of a particle from energy a volume or a mass, as far as the file allows. Local. */
static void finish_energy(wend_particle_reader *r, bool by_mass, bool *density) {
  double *const *column = r->particles->column;
  double *energy = column[WEND_ENERGY];
  if (by_mass && column[WEND_MASS] == NULL) {
    wend_record_complain(r, "cosmicRaySpecificEnergy", "needs the record mass beside it");
    return;
  }
  const bool volume = column[WEND_VOLUME] != NULL;
  const bool ratio = column[WEND_MASS] != NULL && column[WEND_DENSITY] != NULL;
  *density = !by_mass && !volume && !ratio;
  if (*density) return;
  for (int32_t i = 0; i < r->particles->n; i++)
    energy[i] *= by_mass  ? column[WEND_MASS][i]
                 : volume ? column[WEND_VOLUME][i]
                          : column[WEND_MASS][i] / column[WEND_DENSITY][i];
  for (int32_t i = 0; i < r->particles->n; i++)
    if (!isfinite(energy[i]))
      wend_fail(r->team, WEND_ERR_PARTICLES, "%s: CR energy of particle id %" PRIu64 " is %g",
                r->hdf.path, r->particles->id[i], energy[i]);
}

/* The first form of CR energy that is there. Runs after all other records. Collective. */
static wend_status take_energy(wend_particle_reader *r, bool *density) {
  const wend_record *const form[] = {wend_record_of(WEND_ENERGY), wend_record_energy_density(),
                                     wend_record_specific_energy()};
  wend_status status = WEND_OK;
  *density = false;
  int f = 0;
  while (f < 3 && !wend_hdf_has(&r->hdf, r->gas, form[f]->name)) f++;
  if (f == 3) return wend_agree(r->team);
  WEND_TRY(wend_record_take(r, form[f]));
  if (f > 0) finish_energy(r, f == 2, density);
  WEND_TRY(wend_agree(r->team));
done:
  return status;
}

static void check_needed(wend_particle_reader *r, uint64_t needed) {
  for (int c = 0; c < WEND_COLUMNS; c++) {
    if (!(needed >> c & 1) || r->particles->column[c] != NULL) continue;
    wend_record_complain(
        r, wend_record_of((wend_column)c)->name,
        c == WEND_ENERGY
            ? "is missing, and so are cosmicRayEnergyDensity and cosmicRaySpecificEnergy"
            : "is missing");
  }
}

/* Deals the particles out in blocks of equal length. Matched. */
static void deal(wend_particle_reader *r) {
  const int64_t total = wend_record_count(r);
  r->block = (wend_hdf_block){.type = H5T_NATIVE_DOUBLE, .total = total};
  r->dim = wend_hdf_has(&r->hdf, r->gas, "position/z") ? 3 : 2;
  wend_hdf_deal(r->team, total, &r->block.first, &r->block.n);
  if (r->block.n > INT32_MAX)
    wend_fail(r->team, WEND_ERR_ARGUMENT, "%s: %" PRId64 " particles are too many for %d ranks",
              r->hdf.path, total, r->team->size);
}

/* Collective. */
static wend_status take_particles(wend_particle_reader *r, uint64_t needed, bool *density) {
  wend_status status;
  deal(r);
  WEND_TRY(wend_agree(r->team));
  wend_particles_init(r->team, r->particles, (int32_t)r->block.n, 0);
  WEND_TRY(wend_agree(r->team));
  WEND_TRY(wend_record_take_ids(r));
  for (int k = 0; wend_record_at(k) != NULL; k++) {
    const wend_record *record = wend_record_at(k);
    if (record->column != WEND_ENERGY && wend_hdf_has(&r->hdf, r->gas, record->name))
      WEND_TRY(wend_record_take(r, record));
  }
  WEND_TRY(take_energy(r, density));
  check_needed(r, needed);
  WEND_TRY(wend_agree(r->team));
done:
  return status;
}

static herr_t note_iteration(hid_t group, const char *name, const H5L_info_t *info,
                             void *last) {
  (void)group;
  (void)info;
  char *end;
  const long long number = strtoll(name, &end, 10);
  if (end != name && *end == '\0' && number >= *(int64_t *)last) *(int64_t *)last = number;
  return 0;
}

/* Finds the iteration and its species. Matched. */
static void find_gas(wend_particle_reader *r, int64_t iteration, wend_file_facts *facts) {
  const wend_hdf *hdf = &r->hdf;
  char path[NAME_MOST], particles[96] = "particles/";
  int64_t last = -1;
  H5Literate_by_name(hdf->file, "/data", H5_INDEX_NAME, H5_ITER_NATIVE, NULL, note_iteration,
                     &last, H5P_DEFAULT);
  facts->iteration = iteration >= 0 ? iteration : last;
  snprintf(path, sizeof path, "data/%" PRId64, facts->iteration);
  if (last < 0 || !wend_hdf_has(&r->hdf, hdf->file, path)) {
    wend_fail(r->team, WEND_ERR_FILE, "%s: there is no iteration /data/%" PRId64, hdf->path,
              facts->iteration >= 0 ? facts->iteration : 0);
    return;
  }
  wend_hdf_get_text(&r->hdf, hdf->file, "particlesPath", sizeof particles, particles);
  const size_t length = strcspn(particles, "/");
  snprintf(path, sizeof path, "data/%" PRId64 "/%.*s/gas", facts->iteration, (int)length,
           particles);
  if (!wend_hdf_has(&r->hdf, hdf->file, path))
    wend_fail(r->team, WEND_ERR_FILE, "%s: species %s is missing", hdf->path, path);
  else if ((r->gas = H5Gopen2(hdf->file, path, H5P_DEFAULT)) < 0)
    wend_hdf_fail(hdf, "cannot open", path);
}

/* Matched. */
static void check_standard(wend_particle_reader *r) {
  char version[32] = "", base[96] = "";
  if (!wend_hdf_get_text(&r->hdf, r->hdf.file, "openPMD", sizeof version, version))
    wend_fail(r->team, WEND_ERR_FILE,
              "%s: no openPMD file: the root attribute openPMD is missing", r->hdf.path);
  else if (strncmp(version, "1.", 2) != 0)
    wend_fail(r->team, WEND_ERR_FILE, "%s: follows openPMD %s, and only 1.x can be read",
              r->hdf.path, version);
  else if (!wend_hdf_get_text(&r->hdf, r->hdf.file, "basePath", sizeof base, base) ||
           strcmp(base, "/data/%T/") != 0)
    wend_fail(r->team, WEND_ERR_FILE, "%s: the root attribute basePath is not /data/%%T/",
              r->hdf.path);
}

/* Matched. */
static void take_time(wend_particle_reader *r, wend_file_facts *facts) {
  char path[NAME_MOST];
  double unit = 1;
  snprintf(path, sizeof path, "/data/%" PRId64, facts->iteration);
  const hid_t group = H5Gopen2(r->hdf.file, path, H5P_DEFAULT);
  if (group < 0 || !wend_hdf_get(&r->hdf, group, "time", H5T_NATIVE_DOUBLE, 1, &facts->time) ||
      !wend_hdf_get(&r->hdf, group, "dt", H5T_NATIVE_DOUBLE, 1, &facts->dt) ||
      !wend_hdf_get(&r->hdf, group, "timeUnitSI", H5T_NATIVE_DOUBLE, 1, &unit) ||
      !isfinite(facts->time * unit) || !isfinite(facts->dt * unit))
    wend_fail(r->team, WEND_ERR_FILE, "%s: %s lacks a finite time, dt or timeUnitSI",
              r->hdf.path, path);
  if (group >= 0) H5Gclose(group);
  facts->time *= unit / r->units->time;
  facts->dt *= unit / r->units->time;
}

/* Our own group, which other writers lack. Matched. */
static void take_domain(wend_particle_reader *r, wend_file_facts *facts) {
  facts->domain.dim = r->dim;
  if (!wend_hdf_has(&r->hdf, r->hdf.file, "wend/domain")) return;
  const hid_t group = H5Gopen2(r->hdf.file, "wend/domain", H5P_DEFAULT);
  double lo[3], hi[3], thickness = 1, unit = 1;
  wend_boundary boundary[3] = {WEND_BOUNDARY_PERIODIC};
  bool good = group >= 0 &&
              wend_hdf_get(&r->hdf, group, "lower", H5T_NATIVE_DOUBLE, r->dim, lo) &&
              wend_hdf_get(&r->hdf, group, "upper", H5T_NATIVE_DOUBLE, r->dim, hi) &&
              wend_hdf_get(&r->hdf, group, "thickness", H5T_NATIVE_DOUBLE, 1, &thickness) &&
              wend_hdf_get(&r->hdf, group, "unitSI", H5T_NATIVE_DOUBLE, 1, &unit);
  const double factor = unit / r->units->length;
  for (int a = 0; a < r->dim && good; a++) {
    char name[32], text[32] = "";
    snprintf(name, sizeof name, "boundary_%c", "xyz"[a]);
    wend_hdf_get_text(&r->hdf, group, name, sizeof text, text);
    const int found = wend_boundary_find(text);
    lo[a] *= factor;
    hi[a] *= factor;
    good = found >= 0 && lo[a] < hi[a] && isfinite(lo[a]) && isfinite(hi[a]);
    boundary[a] = (wend_boundary)found;
  }
  if (group >= 0) H5Gclose(group);
  if (!good || !(thickness * factor > 0)) {
    wend_fail(r->team, WEND_ERR_FILE,
              "%s: group /wend/domain does not describe a box of %d axes", r->hdf.path, r->dim);
    return;
  }
  facts->domain = wend_box_make(r->dim, lo, hi, boundary, thickness * factor);
  facts->domain_given = true;
}

wend_status wend_particle_file_read_at(wend_team *team, const char *path, int64_t iteration,
                                       const wend_units *units, uint64_t needed,
                                       wend_particles *particles, wend_file_facts *facts,
                                       bool *density) {
  wend_status status;
  wend_particle_reader r = {.team = team, .units = units, .particles = particles, .gas = -1};
  memset(particles, 0, sizeof *particles);
  memset(facts, 0, sizeof *facts);
  WEND_TRY(wend_hdf_open(team, path, &r.hdf));
  check_standard(&r);
  WEND_TRY(wend_agree(team));
  find_gas(&r, iteration, facts);
  WEND_TRY(wend_agree(team));
  WEND_TRY(take_particles(&r, needed, density));
  take_time(&r, facts);
  WEND_TRY(wend_agree(team));
  take_domain(&r, facts);
  WEND_TRY(wend_agree(team));
done:
  if (r.gas >= 0) H5Gclose(r.gas);
  wend_hdf_close(&r.hdf);
  if (status != WEND_OK) wend_particles_reset(particles);
  return status;
}

wend_status wend_particle_file_read(wend_team *team, const char *path, const wend_units *units,
                                    uint64_t needed, wend_particles *particles,
                                    wend_file_facts *facts, bool *density) {
  return wend_particle_file_read_at(team, path, -1, units, needed, particles, facts, density);
}
