/* SPDX-License-Identifier: LGPL-3.0-or-later
 * particle_file_read.c: reads particles from an openPMD 1.x file.
 *
 * A component is a data set, or an empty group whose attributes `value` and `shape` stand for a
 * constant one. A value in SI is stored value x unitSI; it is divided by the SI value of a run
 * unit, both combined first so that a file written in the units of the run is read back to the
 * bit. */
#include "box.h"
#include "hdf.h"
#include "particle_file.h"
#include "records.h"
#include <inttypes.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum { NAME_MOST = 256 };

typedef struct reader {
  wend_hdf hdf;
  wend_team *team;
  const wend_units *units;
  wend_particles *particles;
  hid_t gas; /* group of the species */
  int dim;
  wend_hdf_block block; /* this rank's share of the particles */
} reader;

/* One component, data set or constant. */
typedef struct component {
  hid_t object;
  bool constant;
  double value, unit_si;
  int64_t length;
} component;

static const char *const axis_name[3] = {"x", "y", "z"};

static void component_path(const wend_record *record, int axis, size_t size, char *path) {
  if (record->components == 1)
    snprintf(path, size, "%s", record->name);
  else
    snprintf(path, size, "%s/%s", record->name, axis_name[axis]);
}

static void complain(reader *r, const char *path, const char *what) {
  wend_fail(r->team, WEND_ERR_FILE, "%s: record gas/%s %s", r->hdf.path, path, what);
}

static bool numeric(hid_t set) {
  const hid_t type = H5Dget_type(set);
  const H5T_class_t class = H5Tget_class(type);
  H5Tclose(type);
  return class == H5T_INTEGER || class == H5T_FLOAT;
}

static void open_constant(reader *r, const char *path, component *c) {
  uint64_t shape = 0;
  c->constant = true;
  if (!wend_hdf_get(&r->hdf, c->object, "shape", H5T_NATIVE_UINT64, 1, &shape) ||
      !wend_hdf_get(&r->hdf, c->object, "value", H5T_NATIVE_DOUBLE, 1, &c->value))
    complain(r, path,
             "is a group without the attributes value and shape of a constant component");
  c->length = (int64_t)shape;
}

/* Matched. A failure leaves object at -1 or open for close_component. */
static void open_component(reader *r, const char *path, component *c) {
  *c = (component){.object = -1, .unit_si = 1};
  if (!wend_hdf_has(&r->hdf, r->gas, path)) {
    complain(r, path, "is missing");
    return;
  }
  c->object = H5Oopen(r->gas, path, H5P_DEFAULT);
  if (c->object < 0) {
    wend_hdf_fail(&r->hdf, "cannot open record", path);
  } else if (H5Iget_type(c->object) == H5I_GROUP) {
    open_constant(r, path, c);
  } else if (H5Iget_type(c->object) != H5I_DATASET || !numeric(c->object)) {
    complain(r, path, "holds no numbers");
  } else {
    c->length = wend_hdf_length(c->object);
    if (c->length < 0) complain(r, path, "has more than one dimension");
  }
  if (r->team->status == WEND_OK &&
      !wend_hdf_get(&r->hdf, c->object, "unitSI", H5T_NATIVE_DOUBLE, 1, &c->unit_si))
    complain(r, path, "has no unitSI");
  if (r->team->status == WEND_OK && c->length != r->block.total && r->block.total >= 0)
    complain(r, path, "has another length than position/x");
}

static void close_component(component *c) {
  if (c->object >= 0) H5Oclose(c->object);
  c->object = -1;
}

/* Adds factor x the component to, or stores it in, column [n]. Collective. */
static wend_status take_component(reader *r, const char *path, wend_quantity quantity, bool add,
                                  double *column) {
  wend_status status;
  component c;
  double *stored = NULL;
  const int64_t n = r->block.n;
  open_component(r, path, &c);
  WEND_TRY(wend_agree(r->team));
  const double factor =
      c.unit_si / wend_units_scale(r->units, wend_quantity_find(quantity)->dimension);
  if (c.constant) {
    /* An offset of 0 is left alone: it would turn -0 into 0. */
    for (int64_t i = 0; i < n && !add; i++) column[i] = c.value * factor;
    for (int64_t i = 0; i < n && add && c.value != 0; i++) column[i] += c.value * factor;
    goto done;
  }
  stored = wend_allocate(r->team, n, sizeof *stored);
  WEND_TRY(wend_hdf_read(&r->hdf, c.object, &r->block, stored));
  for (int64_t i = 0; i < n; i++)
    column[i] = add ? column[i] + stored[i] * factor : stored[i] * factor;
done:
  free(stored);
  close_component(&c);
  return status;
}

/* Matched. */
static void check_dimension(reader *r, const wend_record *record) {
  const double *expected = wend_quantity_find(record->quantity)->dimension;
  double found[7] = {0};
  const hid_t object = H5Oopen(r->gas, record->name, H5P_DEFAULT);
  if (object < 0)
    wend_hdf_fail(&r->hdf, "cannot open record", record->name);
  else if (!wend_hdf_get(&r->hdf, object, "unitDimension", H5T_NATIVE_DOUBLE, 7, found))
    complain(r, record->name, "has no unitDimension of 7 numbers");
  for (int k = 0; k < 7 && r->team->status == WEND_OK; k++)
    if (!(fabs(found[k] - expected[k]) < 1e-6))
      complain(r, record->name, "has another unitDimension than expected");
  if (object >= 0) H5Oclose(object);
}

static void check_values(reader *r, const wend_record *record, const char *path,
                         const double *column) {
  for (int64_t i = 0; i < r->block.n; i++)
    if (!wend_range_holds(record->range, column[i])) {
      wend_fail(r->team, WEND_ERR_PARTICLES,
                "%s: record gas/%s of particle id %" PRIu64 " is %g: it must be %s",
                r->hdf.path, path, r->particles->id[i], column[i],
                wend_range_text(record->range));
      return;
    }
}

/* Reads a record into its columns, made if absent. Collective. */
static wend_status take_record(reader *r, const wend_record *record) {
  wend_status status;
  check_dimension(r, record);
  for (int a = 0; a < record->components; a++)
    wend_particles_add(r->team, r->particles, (wend_column)(record->column + a));
  WEND_TRY(wend_agree(r->team));
  for (int a = 0; a < record->components; a++) {
    char path[NAME_MOST];
    double *column = r->particles->column[record->column + a];
    component_path(record, a, sizeof path, path);
    if (r->dim == 2 && a == 2 &&
        (record->column == WEND_X || !wend_hdf_has(&r->hdf, r->gas, path)))
      continue; /* zeroed when it was made */
    WEND_TRY(take_component(r, path, record->quantity, false, column));
    if (record->column == WEND_X) {
      char offset[NAME_MOST];
      snprintf(offset, sizeof offset, "positionOffset/%s", axis_name[a]);
      WEND_TRY(take_component(r, offset, record->quantity, true, column));
    }
    check_values(r, record, path, column);
    WEND_TRY(wend_agree(r->team));
  }
done:
  return status;
}

/* Ids: whole numbers of any type, or the place in the file. Collective. */
static wend_status take_ids(reader *r) {
  wend_status status;
  component c = {.object = -1};
  wend_hdf_block block = r->block;
  uint64_t *id = r->particles->id;
  for (int64_t i = 0; i < block.n; i++) id[i] = (uint64_t)(block.first + i);
  if (!wend_hdf_has(&r->hdf, r->gas, "id")) return wend_agree(r->team);
  open_component(r, "id", &c);
  WEND_TRY(wend_agree(r->team));
  const hid_t type = c.constant ? -1 : H5Dget_type(c.object);
  const bool whole = !c.constant && H5Tget_class(type) == H5T_INTEGER;
  const bool sign = whole && H5Tget_sign(type) == H5T_SGN_2;
  if (type >= 0) H5Tclose(type);
  if (!whole) complain(r, "id", "must be a data set of whole numbers");
  WEND_TRY(wend_agree(r->team));
  block.type = sign ? H5T_NATIVE_INT64 : H5T_NATIVE_UINT64;
  WEND_TRY(wend_hdf_read(&r->hdf, c.object, &block, id));
  for (int64_t i = 0; i < block.n && sign; i++)
    if (id[i] > INT64_MAX) complain(r, "id", "holds a negative number");
  WEND_TRY(wend_agree(r->team));
done:
  close_component(&c);
  return status;
}

/* CR energy of a particle from energy a volume or a mass, as far as the file allows. Local. */
static void finish_energy(reader *r, bool by_mass, bool *density) {
  double *const *column = r->particles->column;
  double *energy = column[WEND_ENERGY];
  if (by_mass && column[WEND_MASS] == NULL) {
    complain(r, "cosmicRaySpecificEnergy", "needs the record mass beside it");
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
}

/* The first form of CR energy that is there. Runs after all other records. Collective. */
static wend_status take_energy(reader *r, bool *density) {
  const wend_record *const form[] = {wend_record_of(WEND_ENERGY), wend_record_energy_density(),
                                     wend_record_specific_energy()};
  wend_status status = WEND_OK;
  *density = false;
  int f = 0;
  while (f < 3 && !wend_hdf_has(&r->hdf, r->gas, form[f]->name)) f++;
  if (f == 3) return wend_agree(r->team);
  WEND_TRY(take_record(r, form[f]));
  if (f > 0) finish_energy(r, f == 2, density);
  WEND_TRY(wend_agree(r->team));
done:
  return status;
}

static void check_needed(reader *r, uint64_t needed) {
  for (int c = 0; c < WEND_COLUMNS; c++) {
    if (!(needed >> c & 1) || r->particles->column[c] != NULL) continue;
    complain(r, wend_record_of((wend_column)c)->name,
             c == WEND_ENERGY
                 ? "is missing, and so are cosmicRayEnergyDensity and cosmicRaySpecificEnergy"
                 : "is missing");
  }
}

/* Deals the particles out in blocks of equal length. Matched. */
static void deal(reader *r) {
  component x;
  r->block.total = -1;
  open_component(r, "position/x", &x);
  r->block = (wend_hdf_block){.type = H5T_NATIVE_DOUBLE, .total = x.length};
  close_component(&x);
  r->dim = wend_hdf_has(&r->hdf, r->gas, "position/z") ? 3 : 2;
  const int64_t size = r->team->size, rank = r->team->rank, share = x.length / size,
                rest = x.length % size;
  r->block.first = rank * share + (rank < rest ? rank : rest);
  r->block.n = share + (rank < rest);
  if (r->block.n > INT32_MAX)
    wend_fail(r->team, WEND_ERR_ARGUMENT, "%s: %" PRId64 " particles are too many for %d ranks",
              r->hdf.path, x.length, r->team->size);
}

/* Collective. */
static wend_status take_particles(reader *r, uint64_t needed, bool *density) {
  wend_status status;
  deal(r);
  WEND_TRY(wend_agree(r->team));
  wend_particles_init(r->team, r->particles, (int32_t)r->block.n, 0);
  WEND_TRY(wend_agree(r->team));
  WEND_TRY(take_ids(r));
  for (int k = 0; wend_record_at(k) != NULL; k++) {
    const wend_record *record = wend_record_at(k);
    if (record->column != WEND_ENERGY && wend_hdf_has(&r->hdf, r->gas, record->name))
      WEND_TRY(take_record(r, record));
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
static void find_gas(reader *r, int64_t iteration, wend_file_facts *facts) {
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
static void check_standard(reader *r) {
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
static void take_time(reader *r, wend_file_facts *facts) {
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
static void take_domain(reader *r, wend_file_facts *facts) {
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
    snprintf(name, sizeof name, "boundary_%s", axis_name[a]);
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
  reader r = {.team = team, .units = units, .particles = particles, .gas = -1};
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
