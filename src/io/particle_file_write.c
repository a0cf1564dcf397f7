/* SPDX-License-Identifier: LGPL-3.0-or-later
 * particle_file_write.c: writes particles as openPMD 1.1.0. */
#include "particle_writer.h"
#include "xdmf.h"
#include <inttypes.h>
#include <stdio.h>

static const char *const axis_name[3] = {"x", "y", "z"};

void wend_particle_put_unit(wend_particle_writer *w, hid_t object, wend_quantity quantity) {
  const double scale = wend_units_scale(w->units, wend_quantity_find(quantity)->dimension);
  wend_hdf_put(&w->hdf, object, "unitSI", H5T_NATIVE_DOUBLE, 0, &scale);
}

void wend_particle_put_record_facts(wend_particle_writer *w, hid_t object,
                                    wend_quantity quantity) {
  const double offset = 0;
  wend_hdf_put(&w->hdf, object, "unitDimension", H5T_NATIVE_DOUBLE, 7,
               wend_quantity_find(quantity)->dimension);
  wend_hdf_put(&w->hdf, object, "timeOffset", H5T_NATIVE_DOUBLE, 0, &offset);
}

/* Components of a record in this file: in 2-D the third only where it says something. */
static int components(const wend_particle_writer *w, const wend_record *record) {
  if (record->components == 1) return 1;
  if (w->dim == 3) return 3;
  return w->third[record->column + 2] ? 3 : 2;
}

static wend_status put_component(wend_particle_writer *w, hid_t parent, const char *name,
                                 wend_quantity quantity, const double *column, bool scalar) {
  hid_t set = -1;
  const wend_status status = wend_hdf_write(&w->hdf, parent, name, &w->block, column, &set);
  if (set < 0) return status;
  wend_particle_put_unit(w, set, quantity);
  if (scalar) wend_particle_put_record_facts(w, set, quantity);
  H5Dclose(set);
  return status;
}

static wend_status put_record(wend_particle_writer *w, const wend_record *record) {
  wend_status status = WEND_OK;
  double *const *column = &w->particles->column[record->column];
  if (record->components == 1)
    return put_component(w, w->gas, record->name, record->quantity, column[0], true);
  const hid_t group = wend_hdf_group(&w->hdf, w->gas, record->name);
  wend_particle_put_record_facts(w, group, record->quantity);
  for (int a = 0; a < components(w, record); a++)
    WEND_TRY(put_component(w, group, axis_name[a], record->quantity, column[a], false));
done:
  if (group >= 0) H5Gclose(group);
  return status;
}

/* A constant component of value 0. */
static void put_offset(wend_particle_writer *w) {
  const double zero = 0;
  const uint64_t shape = (uint64_t)w->block.total;
  const hid_t group = wend_hdf_group(&w->hdf, w->gas, "positionOffset");
  wend_particle_put_record_facts(w, group, WEND_Q_LENGTH);
  for (int a = 0; a < w->dim; a++) {
    const hid_t axis = wend_hdf_group(&w->hdf, group, axis_name[a]);
    wend_hdf_put(&w->hdf, axis, "value", H5T_NATIVE_DOUBLE, 0, &zero);
    wend_hdf_put(&w->hdf, axis, "shape", H5T_NATIVE_UINT64, 1, &shape);
    wend_particle_put_unit(w, axis, WEND_Q_LENGTH);
    if (axis >= 0) H5Gclose(axis);
  }
  if (group >= 0) H5Gclose(group);
}

static wend_status put_ids(wend_particle_writer *w) {
  const double one = 1;
  wend_hdf_block block = w->block;
  hid_t set = -1;
  block.type = H5T_NATIVE_UINT64;
  const wend_status status =
      wend_hdf_write(&w->hdf, w->gas, "id", &block, w->particles->id, &set);
  if (set < 0) return status;
  wend_hdf_put(&w->hdf, set, "unitSI", H5T_NATIVE_DOUBLE, 0, &one);
  wend_particle_put_record_facts(w, set, WEND_Q_NUMBER);
  H5Dclose(set);
  return status;
}

/* /data/N with its time, down to the species. */
static void open_gas(wend_particle_writer *w) {
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

/* A rank without particles may lack columns that others have; one with particles may not. */
static void compare_columns(wend_particle_writer *w) {
  double any[2 * WEND_COLUMNS] = {0};
  for (int c = 0; c < WEND_COLUMNS; c++) {
    const double *column = w->particles->column[c];
    any[c] = column != NULL;
    for (int32_t i = 0; column != NULL && i < w->particles->n; i++)
      if (column[i] != 0) any[WEND_COLUMNS + c] = 1;
  }
  wend_team_max(w->team, 2 * WEND_COLUMNS, any);
  for (int c = 0; c < WEND_COLUMNS; c++) {
    w->have[c] = any[c] != 0;
    w->third[c] = any[WEND_COLUMNS + c] != 0;
    if (w->have[c] && w->particles->column[c] == NULL && w->particles->n > 0)
      wend_fail(w->team, WEND_ERR_ARGUMENT,
                "%s: rank %d lacks a column of record %s that others have", w->hdf.path,
                w->team->rank, wend_record_of((wend_column)c)->name);
  }
  w->third[WEND_Z] = false;
  for (int a = 0; a < w->dim; a++)
    if (!w->have[WEND_X + a])
      wend_fail(w->team, WEND_ERR_ARGUMENT, "%s: particles without positions cannot be written",
                w->hdf.path);
}

static wend_status put_particles(wend_particle_writer *w) {
  wend_status status;
  open_gas(w);
  put_offset(w);
  WEND_TRY(wend_agree(w->team));
  WEND_TRY(put_ids(w));
  for (int k = 0; wend_record_at(k) != NULL; k++)
    if (w->have[wend_record_at(k)->column]) WEND_TRY(put_record(w, wend_record_at(k)));
  WEND_TRY(wend_particle_put_patches(w));
done:
  return status;
}

static wend_status put_companion(wend_particle_writer *w, const char *path) {
  wend_xdmf xdmf = {.path = path,
                    .iteration = w->facts->iteration,
                    .time = w->facts->time,
                    .total = w->block.total,
                    .dim = w->dim};
  for (int k = 0; wend_record_at(k) != NULL; k++)
    if (w->have[wend_record_at(k)->column])
      xdmf.components[k] = components(w, wend_record_at(k));
  return wend_xdmf_write(w->team, &xdmf);
}

wend_status wend_particle_file_write(wend_team *team, const char *path, const wend_units *units,
                                     const wend_particles *particles,
                                     const wend_file_facts *facts) {
  wend_status status;
  wend_particle_writer w = {.team = team,
                            .units = units,
                            .particles = particles,
                            .facts = facts,
                            .gas = -1,
                            .dim = facts->domain.dim == 2 ? 2 : 3};
  WEND_TRY(wend_hdf_create(team, path, &w.hdf));
  w.block = wend_hdf_share(team, H5T_NATIVE_DOUBLE, particles->n);
  compare_columns(&w);
  WEND_TRY(wend_agree(team));
  WEND_TRY(wend_particle_put_root(&w));
  WEND_TRY(put_particles(&w));
  WEND_TRY(wend_particle_put_own(&w));
  H5Gclose(w.gas);
  w.gas = -1;
  WEND_TRY(wend_hdf_publish(&w.hdf));
  WEND_TRY(put_companion(&w, path));
done:
  if (w.gas >= 0) H5Gclose(w.gas);
  wend_hdf_close(&w.hdf);
  return status;
}
