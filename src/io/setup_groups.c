/* SPDX-License-Identifier: LGPL-3.0-or-later
 * setup_groups.c: the groups of a setup whose keys make sense only together: domain and
 * diffusion. */
#include "box.h"
#include "setup_keys.h"
#include "setup_values.h"
#include <stdio.h>
#include <string.h>

static const wend_yaml_value *value_at(const wend_setup_reader *reader, const char *path) {
  return &reader->value[wend_key_find(path)];
}

static void corner(wend_setup_reader *reader, const char *path, int dim, double *place) {
  const wend_yaml_value *list = value_at(reader, path);
  if (!wend_setup_given(reader, path))
    wend_setup_fail(reader, "domain", "%s is missing: lower and upper corner belong together",
                    path);
  else if ((int)list->items != dim)
    wend_setup_fail(reader, path, "has %u entries for %d axes", list->items, dim);
  else
    for (int a = 0; a < dim; a++) place[a] = wend_setup_quantity(reader, path, list->item[a]);
}

static void boundaries(wend_setup_reader *reader, int dim, wend_boundary *boundary) {
  const char *path = "domain.boundaries";
  const wend_yaml_value *list = value_at(reader, path);
  if (!wend_setup_given(reader, path)) return;
  if ((int)list->items != dim)
    wend_setup_fail(reader, path, "has %u entries for %d axes", list->items, dim);
  for (int a = 0; a < dim && reader->team->status == WEND_OK; a++) {
    const int found = wend_boundary_find(list->item[a]);
    if (found < 0)
      wend_setup_fail(reader, path, "\"%s\" is unknown; known: periodic, closed, open",
                      list->item[a]);
    else
      boundary[a] = (wend_boundary)found;
  }
}

void wend_setup_domain(wend_setup_reader *reader) {
  wend_setup *setup = reader->setup;
  if (!wend_setup_given(reader, "domain")) return;
  const int listed = (int)value_at(reader, "domain.lower")->items;
  const int dim = setup->domain.dim != 0 ? setup->domain.dim : listed;
  double lo[3] = {0}, hi[3] = {0};
  wend_boundary boundary[3] = {WEND_BOUNDARY_PERIODIC};
  if (wend_setup_given(reader, "domain.lower") && dim != 2 && dim != 3)
    wend_setup_fail(reader, "domain.lower", "has %d entries: a run has 2 or 3 axes", dim);
  if (reader->team->status == WEND_OK) corner(reader, "domain.lower", dim, lo);
  if (reader->team->status == WEND_OK) corner(reader, "domain.upper", dim, hi);
  if (reader->team->status == WEND_OK) boundaries(reader, dim, boundary);
  for (int a = 0; a < dim && reader->team->status == WEND_OK; a++)
    if (!(lo[a] < hi[a]))
      wend_setup_fail(reader, "domain.upper", "\"%s\" is not above \"%s\" of domain.lower",
                      value_at(reader, "domain.upper")->item[a],
                      value_at(reader, "domain.lower")->item[a]);
  if (dim == 3 && wend_setup_given(reader, "domain.thickness"))
    wend_setup_fail(reader, "domain.thickness", "belongs to 2-D runs only");
  if (reader->team->status != WEND_OK) return;
  const double thickness = setup->domain.thickness > 0 ? setup->domain.thickness : 1;
  setup->domain = wend_box_make(dim, lo, hi, boundary, thickness);
  setup->domain_given = true;
}

/* A law is given by exactly one of: the short form, constant, record, power. */
static int forms_given(wend_setup_reader *reader, const char *path, bool given[4]) {
  static const char *const form[4] = {"", ".constant", ".record", ".power"};
  char key[128];
  const wend_yaml_place *place = wend_yaml_find(&reader->places, path);
  given[0] = place == NULL || place->scalar;
  int n = given[0];
  for (int f = 1; f < 4; f++) {
    snprintf(key, sizeof key, "%s%s", path, form[f]);
    given[f] = wend_setup_given(reader, key);
    n += given[f];
  }
  return n;
}

static void short_form(wend_setup_reader *reader, const char *path, wend_law *law) {
  const int k = wend_key_find(path);
  const char *text = reader->value[k].scalar;
  if (text == NULL) text = wend_key_fallback(wend_key_at(k));
  law->kind = strcmp(text, "record") == 0 ? WEND_LAW_RECORD : WEND_LAW_CONSTANT;
  if (law->kind == WEND_LAW_RECORD) return;
  law->value = wend_setup_quantity(reader, path, text);
  if (law->value < 0) wend_setup_fail(reader, path, "\"%s\" must not be less than 0", text);
}

static void power_form(wend_setup_reader *reader, const char *path, wend_law *law) {
  law->kind = WEND_LAW_POWER;
  char group[96], at[128], density[128], field[128];
  snprintf(group, sizeof group, "%s.power", path);
  snprintf(at, sizeof at, "%s.at", group);
  snprintf(density, sizeof density, "%s.density", group);
  snprintf(field, sizeof field, "%s.field", group);
  if (!wend_setup_given(reader, at))
    wend_setup_fail(reader, group, "needs the key at, the diffusivity that the law scales");
  if (law->density_index != 0 && !wend_setup_given(reader, density))
    wend_setup_fail(reader, group, "needs the key density, at which the law equals at");
  if (law->field_index != 0 && !wend_setup_given(reader, field))
    wend_setup_fail(reader, group, "needs the key field, at which the law equals at");
  if (law->density_index == 0 && law->field_index == 0)
    wend_setup_fail(reader, group,
                    "varies with nothing: give density_index or field_index, or use constant");
}

static void understand_law(wend_setup_reader *reader, const char *path, wend_law *law) {
  char record[128];
  bool given[4];
  snprintf(record, sizeof record, "%s.record", path);
  if (forms_given(reader, path, given) != 1) {
    wend_setup_fail(reader, path, "needs exactly one of constant, record, power");
  } else if (given[0]) {
    short_form(reader, path, law);
  } else if (given[1]) {
    law->kind = WEND_LAW_CONSTANT;
  } else if (given[2]) {
    law->kind = WEND_LAW_RECORD;
    if (!wend_setup_switch(reader, record))
      wend_setup_fail(reader, record,
                      "no says nothing: leave it out, or give constant or power");
  } else {
    power_form(reader, path, law);
  }
}

void wend_setup_diffusion(wend_setup_reader *reader) {
  wend_setup *setup = reader->setup;
  understand_law(reader, "diffusion.parallel", &setup->kappa_par);
  if (reader->team->status == WEND_OK)
    understand_law(reader, "diffusion.perpendicular", &setup->kappa_perp);
  const char *text = value_at(reader, "diffusion.unmagnetised")->scalar;
  setup->settings.isotropic_unmagnetised = text == NULL || strcmp(text, "none") != 0;
}
