/* SPDX-License-Identifier: LGPL-3.0-or-later
 * particle_records.c: reads the records of a species.
 *
 * A component is a data set, or an empty group whose attributes `value` and `shape` stand for a
 * constant one. A value in SI is stored value x unitSI; it is divided by the SI value of a run
 * unit, both combined first so that a file written in the units of the run is read back to the
 * bit. */
#include "particle_reader.h"
#include <inttypes.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum { NAME_MOST = 256 };

/* One component, data set or constant. */
typedef struct component {
  hid_t object;
  bool constant;
  double value;
  bool unit_given; /* ids need none */
  double unit_si;
  int64_t length;
} component;

static const char *const axis_name[3] = {"x", "y", "z"};

void wend_record_complain(wend_particle_reader *reader, const char *record, const char *what) {
  wend_fail(reader->team, WEND_ERR_FILE, "%s: record gas/%s %s", reader->hdf.path, record,
            what);
}

static void component_path(const wend_record *record, int axis, size_t size, char *path) {
  if (record->components == 1)
    snprintf(path, size, "%s", record->name);
  else
    snprintf(path, size, "%s/%s", record->name, axis_name[axis]);
}

static bool numeric(hid_t set) {
  const hid_t type = H5Dget_type(set);
  const H5T_class_t class = H5Tget_class(type);
  H5Tclose(type);
  return class == H5T_INTEGER || class == H5T_FLOAT;
}

static void open_constant(wend_particle_reader *r, const char *path, component *c) {
  uint64_t shape = 0;
  c->constant = true;
  if (!wend_hdf_get(&r->hdf, c->object, "shape", H5T_NATIVE_UINT64, 1, &shape) ||
      !wend_hdf_get(&r->hdf, c->object, "value", H5T_NATIVE_DOUBLE, 1, &c->value))
    wend_record_complain(
        r, path, "is a group without the attributes value and shape of a constant component");
  c->length = (int64_t)shape;
}

/* Matched. A failure leaves object at -1 or open for close_component. */
static void open_component(wend_particle_reader *r, const char *path, component *c) {
  *c = (component){.object = -1, .unit_si = 1};
  if (!wend_hdf_has(&r->hdf, r->gas, path)) {
    wend_record_complain(r, path, "is missing");
    return;
  }
  c->object = H5Oopen(r->gas, path, H5P_DEFAULT);
  if (c->object < 0) {
    wend_hdf_fail(&r->hdf, "cannot open record", path);
  } else if (H5Iget_type(c->object) == H5I_GROUP) {
    open_constant(r, path, c);
  } else if (H5Iget_type(c->object) != H5I_DATASET || !numeric(c->object)) {
    wend_record_complain(r, path, "holds no numbers");
  } else {
    c->length = wend_hdf_length(c->object);
    if (c->length < 0) wend_record_complain(r, path, "has more than one dimension");
  }
  c->unit_given = wend_hdf_get(&r->hdf, c->object, "unitSI", H5T_NATIVE_DOUBLE, 1, &c->unit_si);
  if (r->team->status == WEND_OK && c->length != r->block.total && r->block.total >= 0)
    wend_record_complain(r, path, "has another length than position/x");
}

static void close_component(component *c) {
  if (c->object >= 0) H5Oclose(c->object);
  c->object = -1;
}

/* Adds factor x the component to, or stores it in, column [n]. Collective. */
static wend_status take_component(wend_particle_reader *r, const char *path,
                                  wend_quantity quantity, bool add, double *column) {
  wend_status status;
  component c;
  double *stored = NULL;
  const int64_t n = r->block.n;
  open_component(r, path, &c);
  if (r->team->status == WEND_OK && !(c.unit_given && isfinite(c.unit_si)))
    wend_record_complain(r, path, "has no unitSI");
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
static void check_dimension(wend_particle_reader *r, const wend_record *record) {
  const double *expected = wend_quantity_find(record->quantity)->dimension;
  double found[7] = {0};
  const hid_t object = H5Oopen(r->gas, record->name, H5P_DEFAULT);
  if (object < 0)
    wend_hdf_fail(&r->hdf, "cannot open record", record->name);
  else if (!wend_hdf_get(&r->hdf, object, "unitDimension", H5T_NATIVE_DOUBLE, 7, found))
    wend_record_complain(r, record->name, "has no unitDimension of 7 numbers");
  for (int k = 0; k < 7 && r->team->status == WEND_OK; k++)
    if (!(fabs(found[k] - expected[k]) < 1e-6))
      wend_record_complain(r, record->name, "has another unitDimension than expected");
  if (object >= 0) H5Oclose(object);
}

static void check_values(wend_particle_reader *r, const wend_record *record, const char *path,
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

wend_status wend_record_take(wend_particle_reader *r, const wend_record *record) {
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

wend_status wend_record_take_ids(wend_particle_reader *r) {
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
  if (!whole) wend_record_complain(r, "id", "must be a data set of whole numbers");
  WEND_TRY(wend_agree(r->team));
  block.type = sign ? H5T_NATIVE_INT64 : H5T_NATIVE_UINT64;
  WEND_TRY(wend_hdf_read(&r->hdf, c.object, &block, id));
  for (int64_t i = 0; i < block.n && sign; i++)
    if (id[i] > INT64_MAX) wend_record_complain(r, "id", "holds a negative number");
  WEND_TRY(wend_agree(r->team));
done:
  close_component(&c);
  return status;
}

int64_t wend_record_count(wend_particle_reader *reader) {
  component x;
  reader->block.total = -1;
  open_component(reader, "position/x", &x);
  close_component(&x);
  return x.length;
}
