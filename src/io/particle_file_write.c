/* SPDX-License-Identifier: LGPL-3.0-or-later
 * particle_file_write.c: writes particles as openPMD 1.1.0, with what the standard has no place
 * for in the group /wend: the box, the setup, the version. */
#include "box.h"
#include "hdf.h"
#include "particle_file.h"
#include "records.h"
#include "version_text.h"
#include "xdmf.h"
#include <ctype.h>
#include <inttypes.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

enum { NAME_MOST = 256 };

static const char *const axis_name[3] = {"x", "y", "z"};

typedef struct writer {
  wend_hdf hdf;
  wend_team *team;
  const wend_units *units;
  const wend_particles *particles;
  const wend_file_facts *facts;
  hid_t gas;
  int dim;
  wend_hdf_block block;
  bool third[WEND_COLUMNS]; /* in 2-D: this z column holds something */
} writer;

/* The date of this moment, or the one the environment asks for; rank 0's on all ranks. */
static void date_text(wend_team *team, size_t size, char *text) {
  const char *fixed = getenv("SOURCE_DATE_EPOCH");
  const time_t now = fixed != NULL ? (time_t)strtoll(fixed, NULL, 10) : time(NULL);
  struct tm parts;
  gmtime_r(&now, &parts);
  strftime(text, size, "%Y-%m-%d %H:%M:%S +0000", &parts);
  if (MPI_Bcast(text, (int)size, MPI_CHAR, 0, team->comm) != MPI_SUCCESS)
    wend_fail(team, WEND_ERR_MPI, "ranks could not agree on the date");
}

static void author_text(wend_team *team, size_t size, char *text) {
  const char *name = getenv("LOGNAME") != NULL ? getenv("LOGNAME") : getenv("USER");
  snprintf(text, size, "%s", name != NULL && name[0] != '\0' ? name : "unknown");
  if (MPI_Bcast(text, (int)size, MPI_CHAR, 0, team->comm) != MPI_SUCCESS)
    wend_fail(team, WEND_ERR_MPI, "ranks could not agree on the author");
}

/* "NAME_<iteration>.h5", padded with zeros or not, is one of a series: its format goes to text.
 */
static bool series_format(const char *path, int64_t iteration, size_t size, char *text) {
  const char *slash = strrchr(path, '/'), *name = slash != NULL ? slash + 1 : path;
  const size_t length = strlen(name);
  if (length < 5 || strcmp(name + length - 3, ".h5") != 0) return false;
  size_t first = length - 3;
  while (first > 0 && isdigit((unsigned char)name[first - 1])) first--;
  const int digits = (int)(length - 3 - first);
  if (digits == 0 || digits > 18 || first < 2 || name[first - 1] != '_' ||
      strtoll(name + first, NULL, 10) != iteration)
    return false;
  if (name[first] == '0' && digits > 1)
    snprintf(text, size, "%.*s%%0%dT.h5", (int)first, name, digits);
  else
    snprintf(text, size, "%.*s%%T.h5", (int)first, name);
  return true;
}

static void put_root(writer *w) {
  wend_hdf *h = &w->hdf;
  const hid_t root = h->file;
  const uint32_t extension = 0;
  char date[64], author[128], format[NAME_MOST] = "/data/%T/", made[160];
  date_text(w->team, sizeof date, date);
  author_text(w->team, sizeof author, author);
  const bool series = series_format(h->path, w->facts->iteration, sizeof format, format);
  unsigned major = 0, minor = 0, patch = 0;
  H5get_libversion(&major, &minor, &patch);
  snprintf(made, sizeof made, "HDF5 %u.%u.%u", major, minor, patch);
  wend_hdf_put_text(h, root, "openPMD", "1.1.0");
  wend_hdf_put(h, root, "openPMDextension", H5T_NATIVE_UINT32, 0, &extension);
  wend_hdf_put_text(h, root, "basePath", "/data/%T/");
  wend_hdf_put_text(h, root, "particlesPath", "particles/");
  wend_hdf_put_text(h, root, "iterationEncoding", series ? "fileBased" : "groupBased");
  wend_hdf_put_text(h, root, "iterationFormat", format);
  wend_hdf_put_text(h, root, "author", author);
  wend_hdf_put_text(h, root, "software", "wend");
  wend_hdf_put_text(h, root, "softwareVersion", wend_version_text());
  wend_hdf_put_text(h, root, "softwareDependencies", made);
  wend_hdf_put_text(h, root, "date", date);
}

static void put_unit(writer *w, hid_t object, wend_quantity quantity) {
  const double scale = wend_units_scale(w->units, wend_quantity_find(quantity)->dimension);
  wend_hdf_put(&w->hdf, object, "unitSI", H5T_NATIVE_DOUBLE, 0, &scale);
}

/* What the standard asks of every record. */
static void put_record_facts(writer *w, hid_t object, wend_quantity quantity) {
  const double offset = 0;
  wend_hdf_put(&w->hdf, object, "unitDimension", H5T_NATIVE_DOUBLE, 7,
               wend_quantity_find(quantity)->dimension);
  wend_hdf_put(&w->hdf, object, "timeOffset", H5T_NATIVE_DOUBLE, 0, &offset);
}

/* Components of a record in this file: in 2-D the third only where it says something. */
static int components(const writer *w, const wend_record *record) {
  if (record->components == 1) return 1;
  if (w->dim == 3) return 3;
  return w->third[record->column + 2] ? 3 : 2;
}

static wend_status put_component(writer *w, hid_t parent, const char *name,
                                 wend_quantity quantity, const double *column, bool scalar) {
  hid_t set = -1;
  const wend_status status = wend_hdf_write(&w->hdf, parent, name, &w->block, column, &set);
  if (set < 0) return status;
  put_unit(w, set, quantity);
  if (scalar) put_record_facts(w, set, quantity);
  H5Dclose(set);
  return status;
}

static wend_status put_record(writer *w, const wend_record *record) {
  wend_status status = WEND_OK;
  double *const *column = &w->particles->column[record->column];
  if (record->components == 1)
    return put_component(w, w->gas, record->name, record->quantity, column[0], true);
  const hid_t group = wend_hdf_group(&w->hdf, w->gas, record->name);
  put_record_facts(w, group, record->quantity);
  for (int a = 0; a < components(w, record); a++)
    WEND_TRY(put_component(w, group, axis_name[a], record->quantity, column[a], false));
done:
  if (group >= 0) H5Gclose(group);
  return status;
}

/* A constant component of value 0. */
static void put_offset(writer *w) {
  const double zero = 0;
  const uint64_t shape = (uint64_t)w->block.total;
  const hid_t group = wend_hdf_group(&w->hdf, w->gas, "positionOffset");
  put_record_facts(w, group, WEND_Q_LENGTH);
  for (int a = 0; a < w->dim; a++) {
    const hid_t axis = wend_hdf_group(&w->hdf, group, axis_name[a]);
    wend_hdf_put(&w->hdf, axis, "value", H5T_NATIVE_DOUBLE, 0, &zero);
    wend_hdf_put(&w->hdf, axis, "shape", H5T_NATIVE_UINT64, 1, &shape);
    put_unit(w, axis, WEND_Q_LENGTH);
    if (axis >= 0) H5Gclose(axis);
  }
  if (group >= 0) H5Gclose(group);
}

static wend_status put_ids(writer *w) {
  const double one = 1;
  wend_hdf_block block = w->block;
  hid_t set = -1;
  block.type = H5T_NATIVE_UINT64;
  const wend_status status =
      wend_hdf_write(&w->hdf, w->gas, "id", &block, w->particles->id, &set);
  if (set < 0) return status;
  wend_hdf_put(&w->hdf, set, "unitSI", H5T_NATIVE_DOUBLE, 0, &one);
  put_record_facts(w, set, WEND_Q_NUMBER);
  H5Dclose(set);
  return status;
}

static void put_domain(writer *w, hid_t own) {
  if (!w->facts->domain_given) return;
  const wend_domain *domain = &w->facts->domain;
  const hid_t group = wend_hdf_group(&w->hdf, own, "domain");
  wend_hdf_put(&w->hdf, group, "lower", H5T_NATIVE_DOUBLE, w->dim, domain->lo);
  wend_hdf_put(&w->hdf, group, "upper", H5T_NATIVE_DOUBLE, w->dim, domain->hi);
  wend_hdf_put(&w->hdf, group, "thickness", H5T_NATIVE_DOUBLE, 0, &domain->thickness);
  put_unit(w, group, WEND_Q_LENGTH);
  for (int a = 0; a < w->dim; a++) {
    char name[32];
    snprintf(name, sizeof name, "boundary_%s", axis_name[a]);
    wend_hdf_put_text(&w->hdf, group, name, wend_boundary_name(wend_box_boundary(domain, a)));
  }
  if (group >= 0) H5Gclose(group);
}

/* The setup as bytes, since an attribute ends at 64 kB; rank 0 holds the block. */
static wend_status put_setup(writer *w, hid_t own) {
  const char *text = w->facts->setup;
  hid_t set = -1;
  wend_status status = WEND_OK;
  if (text == NULL) return WEND_OK;
  const int64_t length = w->team->rank == 0 ? (int64_t)strlen(text) : 0;
  const wend_hdf_block block = wend_hdf_share(w->team, H5T_NATIVE_UCHAR, length);
  WEND_TRY(wend_hdf_write(&w->hdf, own, "setup", &block, text, &set));
  wend_hdf_put_text(&w->hdf, set, "comment", "the setup of the run, YAML text");
  H5Dclose(set);
done:
  return status;
}

static wend_status put_own(writer *w) {
  wend_status status = WEND_OK;
  const hid_t own = wend_hdf_group(&w->hdf, w->hdf.file, "wend");
  wend_hdf_put_text(&w->hdf, own, "version", wend_version_text());
  wend_hdf_put_text(&w->hdf, own, "git", WEND_GIT_TEXT);
  put_domain(w, own);
  WEND_TRY(wend_agree(w->team));
  WEND_TRY(put_setup(w, own));
done:
  if (own >= 0) H5Gclose(own);
  return status;
}

/* /data/N with its time, down to the species. */
static void open_gas(writer *w) {
  wend_hdf *h = &w->hdf;
  char number[32];
  snprintf(number, sizeof number, "%" PRId64, w->facts->iteration);
  const hid_t data = wend_hdf_group(h, h->file, "data"), step = wend_hdf_group(h, data, number);
  wend_hdf_put(h, step, "time", H5T_NATIVE_DOUBLE, 0, &w->facts->time);
  wend_hdf_put(h, step, "dt", H5T_NATIVE_DOUBLE, 0, &w->facts->dt);
  wend_hdf_put(h, step, "timeUnitSI", H5T_NATIVE_DOUBLE, 0, &w->units->time);
  const hid_t particles = wend_hdf_group(h, step, "particles");
  w->gas = wend_hdf_group(h, particles, "gas");
  if (particles >= 0) H5Gclose(particles);
  if (step >= 0) H5Gclose(step);
  if (data >= 0) H5Gclose(data);
}

/* Columns and dimension must be the same on all ranks; a rank without particles may hold none.
 */
static void find_third(writer *w) {
  double any[WEND_COLUMNS] = {0};
  for (int c = 0; c < WEND_COLUMNS; c++)
    for (int32_t i = 0; w->particles->column[c] != NULL && i < w->particles->n; i++)
      if (w->particles->column[c][i] != 0) any[c] = 1;
  wend_team_max(w->team, WEND_COLUMNS, any);
  for (int c = 0; c < WEND_COLUMNS; c++) w->third[c] = any[c] != 0;
  w->third[WEND_Z] = false;
}

static wend_status put_particles(writer *w) {
  wend_status status;
  open_gas(w);
  put_offset(w);
  WEND_TRY(wend_agree(w->team));
  WEND_TRY(put_ids(w));
  for (int k = 0; wend_record_at(k) != NULL; k++)
    if (w->particles->column[wend_record_at(k)->column] != NULL)
      WEND_TRY(put_record(w, wend_record_at(k)));
done:
  return status;
}

static wend_status put_companion(writer *w) {
  wend_xdmf xdmf = {.path = w->hdf.path,
                    .iteration = w->facts->iteration,
                    .time = w->facts->time,
                    .total = w->block.total,
                    .dim = w->dim};
  for (int k = 0; wend_record_at(k) != NULL; k++)
    if (w->particles->column[wend_record_at(k)->column] != NULL)
      xdmf.components[k] = components(w, wend_record_at(k));
  return wend_xdmf_write(w->team, &xdmf);
}

wend_status wend_particle_file_write(wend_team *team, const char *path, const wend_units *units,
                                     const wend_particles *particles,
                                     const wend_file_facts *facts) {
  wend_status status;
  writer w = {.team = team,
              .units = units,
              .particles = particles,
              .facts = facts,
              .gas = -1,
              .dim = facts->domain.dim == 2 ? 2 : 3};
  WEND_TRY(wend_hdf_create(team, path, &w.hdf));
  w.block = wend_hdf_share(team, H5T_NATIVE_DOUBLE, particles->n);
  find_third(&w);
  put_root(&w);
  WEND_TRY(wend_agree(team));
  WEND_TRY(put_particles(&w));
  WEND_TRY(put_own(&w));
  if (w.gas >= 0) H5Gclose(w.gas);
  w.gas = -1;
  wend_hdf hdf = w.hdf;
  memset(&w.hdf, 0, sizeof w.hdf);
  WEND_TRY(wend_hdf_publish(&hdf));
  w.hdf.path = path;
  status = put_companion(&w);
  w.hdf.path = NULL;
done:
  if (w.gas >= 0) H5Gclose(w.gas);
  wend_hdf_close(&w.hdf);
  return status;
}
