/* SPDX-License-Identifier: LGPL-3.0-or-later
 * setup_values.c: understands the text of each key: numbers, quantities, names, switches. */
#include "setup_values.h"
#include "setup_keys.h"
#include <math.h>
#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

/* "FILE, line N: PATH", with which every complaint about a key begins. */
static void locate(const wend_setup_reader *reader, const char *path, size_t size, char *text) {
  const wend_yaml_place *place = wend_yaml_find(&reader->places, path);
  if (place != NULL)
    snprintf(text, size, "%s, line %d: %s", reader->setup->path, place->line, path);
  else
    snprintf(text, size, "%s: %s", reader->setup->path, path);
}

wend_status wend_setup_fail(wend_setup_reader *reader, const char *path, const char *format,
                            ...) {
  char where[WEND_TEXT_LENGTH], what[WEND_TEXT_LENGTH];
  locate(reader, path, sizeof where, where);
  va_list arguments;
  va_start(arguments, format);
  vsnprintf(what, sizeof what, format, arguments);
  va_end(arguments);
  return wend_fail(reader->team, WEND_ERR_SETUP, "%s: %s", where, what);
}

bool wend_setup_given(const wend_setup_reader *reader, const char *path) {
  return wend_yaml_find(&reader->places, path) != NULL;
}

double wend_setup_quantity(wend_setup_reader *reader, const char *path, const char *text) {
  const wend_key *key = wend_key_at(wend_key_find(path));
  char where[WEND_TEXT_LENGTH];
  locate(reader, path, sizeof where, where);
  double value = 0;
  wend_unit_names_parse(reader->team, reader->names, &reader->setup->units,
                        wend_quantity_find(key->quantity)->dimension, where, text, &value);
  return value;
}

static void check_range(wend_setup_reader *reader, const wend_key *key, const char *text,
                        double value) {
  if (key->positive && !(value > 0))
    wend_setup_fail(reader, key->path, "\"%s\" must be greater than 0", text);
  else if (!(value >= key->least))
    wend_setup_fail(reader, key->path, "\"%s\" must not be less than %g", text, key->least);
  else if (!(value <= key->most))
    wend_setup_fail(reader, key->path, "\"%s\" must not be more than %g", text, key->most);
}

static int count_of(wend_setup_reader *reader, const wend_key *key, const char *text) {
  char *rest;
  const double value = strtod(text, &rest);
  if (rest == text || *rest != '\0' || !isfinite(value) || value != floor(value))
    wend_setup_fail(reader, key->path, "\"%s\" is no whole number", text);
  else
    check_range(reader, key, text, value);
  return reader->team->status == WEND_OK ? (int)value : 0;
}

static double quantity_of(wend_setup_reader *reader, const wend_key *key, const char *text) {
  const double value = wend_setup_quantity(reader, key->path, text);
  if (reader->team->status == WEND_OK) check_range(reader, key, text, value);
  return value;
}

static bool switch_of(wend_setup_reader *reader, const char *path, const char *text) {
  static const char *const yes[] = {"yes", "true", "on"}, *const no[] = {"no", "false", "off"};
  for (int k = 0; k < 3; k++) {
    if (strcmp(text, yes[k]) == 0) return true;
    if (strcmp(text, no[k]) == 0) return false;
  }
  wend_setup_fail(reader, path, "\"%s\" must be yes or no", text);
  return false;
}

bool wend_setup_switch(wend_setup_reader *reader, const char *path) {
  const int k = wend_key_find(path);
  const char *text = reader->value[k].scalar;
  return switch_of(reader, path, text != NULL ? text : wend_key_fallback(wend_key_at(k)));
}

static const char *name_of(wend_setup_reader *reader, const wend_key *key, const char *text) {
  char list[256] = "";
  size_t used = 0;
  for (int n = 0; key->names(n) != NULL; n++) {
    if (strcmp(key->names(n), text) == 0) return key->names(n);
    if (used < sizeof list)
      used += (size_t)snprintf(list + used, sizeof list - used, "%s%s", n > 0 ? ", " : "",
                               key->names(n));
  }
  wend_setup_fail(reader, key->path, "\"%s\" is unknown; known: %s", text, list);
  return NULL;
}

static char *text_of(wend_setup_reader *reader, const wend_key *key, const char *text) {
  if (text[0] == '\0') wend_setup_fail(reader, key->path, "is empty");
  char *copy = wend_allocate(reader->team, (int64_t)strlen(text) + 1, 1);
  if (copy != NULL) strcpy(copy, text);
  return copy;
}

/* Where the key is stored elsewhere the value is understood, and so checked, all the same. */
static void store_scalar(wend_setup_reader *reader, const wend_key *key, const char *text) {
  union {
    char *text;
    const char *name;
    bool on;
    int count;
    double number;
  } value;
  size_t size = 0;
  switch (key->kind) {
  case WEND_KEY_TEXT:
    value.text = text_of(reader, key, text);
    size = sizeof value.text;
    break;
  case WEND_KEY_NAME:
    value.name = name_of(reader, key, text);
    size = sizeof value.name;
    break;
  case WEND_KEY_SWITCH:
    value.on = switch_of(reader, key->path, text);
    size = sizeof value.on;
    break;
  case WEND_KEY_COUNT:
    value.count = count_of(reader, key, text);
    size = sizeof value.count;
    break;
  case WEND_KEY_QUANTITY:
    value.number = quantity_of(reader, key, text);
    size = sizeof value.number;
    break;
  default:
    break;
  }
  if (key->offset != WEND_KEY_ELSEWHERE)
    memcpy((char *)reader->setup + key->offset, &value, size);
}

static void store_if_any(wend_setup_reader *reader, int k) {
  const wend_key *key = wend_key_at(k);
  const char *given = reader->value[k].scalar, *fallback = wend_key_fallback(key);
  if (given != NULL && given[0] == '\0') wend_setup_fail(reader, key->path, "has no value");
  if (given == NULL && wend_setup_given(reader, key->path) && key->kind <= WEND_KEY_QUANTITY)
    wend_setup_fail(reader, key->path, "has no value");
  if (given == NULL && key->fallback != NULL && strcmp(key->fallback, "(required)") == 0)
    wend_setup_fail(reader, key->path, "is missing: %s", key->meaning);
  if (reader->team->status == WEND_OK && (given != NULL || fallback != NULL))
    store_scalar(reader, key, given != NULL ? given : fallback);
}

static bool is_unit(int k) { return strncmp(wend_key_at(k)->path, "units.", 6) == 0; }

/* The units themselves are understood in SI, each on its own. */
static wend_units read_units(wend_setup_reader *reader) {
  wend_units si = {1, 1, 1}, units = si;
  for (int k = 0; k < wend_key_count(); k++) {
    if (!is_unit(k)) continue;
    reader->setup->units = si;
    store_if_any(reader, k);
    const size_t offset = wend_key_at(k)->offset;
    memcpy((char *)&units + (offset - offsetof(wend_setup, units)),
           (const char *)reader->setup + offset, sizeof(double));
  }
  return units;
}

void wend_setup_store(wend_setup_reader *reader) {
  reader->setup->units = read_units(reader);
  for (int k = 0; k < wend_key_count(); k++)
    if (!is_unit(k)) store_if_any(reader, k);
}
