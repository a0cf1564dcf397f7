/* SPDX-License-Identifier: LGPL-3.0-or-later
 * hdf_attributes.c: groups and attributes of HDF5 files, with checked calls. */
#include "hdf.h"
#include <stdio.h>
#include <string.h>

hid_t wend_hdf_group(wend_hdf *hdf, hid_t parent, const char *name) {
  if (hdf->team->status != WEND_OK) return -1;
  const hid_t group = H5Gcreate2(parent, name, H5P_DEFAULT, H5P_DEFAULT, H5P_DEFAULT);
  if (group < 0) wend_hdf_fail(hdf, "cannot make group", name);
  return group;
}

static void put(wend_hdf *hdf, hid_t object, const char *name, hid_t type, hid_t space,
                const void *value) {
  const hid_t attribute = H5Acreate2(object, name, type, space, H5P_DEFAULT, H5P_DEFAULT);
  if (attribute < 0 || H5Awrite(attribute, type, value) < 0)
    wend_hdf_fail(hdf, "cannot write attribute", name);
  if (attribute >= 0) H5Aclose(attribute);
  H5Sclose(space);
}

void wend_hdf_put_text(wend_hdf *hdf, hid_t object, const char *name, const char *text) {
  if (hdf->team->status != WEND_OK) return;
  const hid_t type = H5Tcopy(H5T_C_S1);
  const size_t length = strlen(text);
  H5Tset_size(type, length > 0 ? length : 1);
  H5Tset_strpad(type, H5T_STR_NULLPAD);
  put(hdf, object, name, type, H5Screate(H5S_SCALAR), text);
  H5Tclose(type);
}

void wend_hdf_put(wend_hdf *hdf, hid_t object, const char *name, hid_t type, int n,
                  const void *value) {
  if (hdf->team->status != WEND_OK) return;
  const hsize_t length = (hsize_t)n;
  put(hdf, object, name, type,
      n == 0 ? H5Screate(H5S_SCALAR) : H5Screate_simple(1, &length, NULL), value);
}

/* HDF5 answers for the last link of a path only if all before it are there. */
bool wend_hdf_has(wend_hdf *hdf, hid_t parent, const char *path) {
  if (hdf->team->status != WEND_OK) return false;
  char head[512];
  for (size_t end = strcspn(path, "/");; end += 1 + strcspn(path + end + 1, "/")) {
    snprintf(head, sizeof head, "%.*s", (int)end, path);
    if (end > 0 && H5Lexists(parent, head, H5P_DEFAULT) <= 0) return false;
    if (path[end] == '\0') return true;
  }
}

/* Opens an attribute if it is there; *items receives its number of values. */
static hid_t open_attribute(hid_t object, const char *name, int64_t *items) {
  if (H5Aexists(object, name) <= 0) return -1;
  const hid_t attribute = H5Aopen(object, name, H5P_DEFAULT);
  const hid_t space = attribute >= 0 ? H5Aget_space(attribute) : -1;
  *items = space >= 0 ? (int64_t)H5Sget_simple_extent_npoints(space) : 0;
  if (space >= 0) H5Sclose(space);
  return attribute;
}

static bool get_variable_text(hid_t attribute, hid_t type, size_t size, char *text) {
  char *value = NULL;
  const hid_t memory = H5Tcopy(H5T_C_S1);
  H5Tset_size(memory, H5T_VARIABLE);
  H5Tset_cset(memory, H5Tget_cset(type));
  const bool good = H5Aread(attribute, memory, &value) >= 0 && value != NULL;
  if (good) snprintf(text, size, "%s", value);
  if (value != NULL) H5free_memory(value);
  H5Tclose(memory);
  return good;
}

static bool get_fixed_text(hid_t attribute, hid_t type, size_t size, char *text) {
  const hid_t memory = H5Tcopy(H5T_C_S1);
  H5Tset_size(memory, size);
  H5Tset_strpad(memory, H5T_STR_NULLTERM);
  H5Tset_cset(memory, H5Tget_cset(type));
  const bool good = H5Aread(attribute, memory, text) >= 0;
  H5Tclose(memory);
  return good;
}

bool wend_hdf_get_text(wend_hdf *hdf, hid_t object, const char *name, size_t size, char *text) {
  if (hdf->team->status != WEND_OK) return false;
  int64_t items = 0;
  const hid_t attribute = open_attribute(object, name, &items);
  if (attribute < 0) return false;
  const hid_t type = H5Aget_type(attribute);
  bool good = items == 1 && H5Tget_class(type) == H5T_STRING;
  if (good)
    good = H5Tis_variable_str(type) > 0 ? get_variable_text(attribute, type, size, text)
                                        : get_fixed_text(attribute, type, size, text);
  H5Tclose(type);
  H5Aclose(attribute);
  return good;
}

bool wend_hdf_get(wend_hdf *hdf, hid_t object, const char *name, hid_t type, int n,
                  void *value) {
  if (hdf->team->status != WEND_OK) return false;
  int64_t items = 0;
  const hid_t attribute = open_attribute(object, name, &items);
  if (attribute < 0) return false;
  const hid_t kind = H5Aget_type(attribute);
  const H5T_class_t class = H5Tget_class(kind);
  const bool good = items == n && (class == H5T_INTEGER || class == H5T_FLOAT) &&
                    H5Aread(attribute, type, value) >= 0;
  H5Tclose(kind);
  H5Aclose(attribute);
  return good;
}
