/* SPDX-License-Identifier: LGPL-3.0-or-later
 * setup_yaml.c: makes a libcyaml schema from the table of keys and loads a setup through it.
 *
 * Every key is loaded as text, units and all; values are understood in setup.c. A key that may
 * stand for a whole group (a diffusivity: a value, or a law) is a scalar in the schema where it
 * is one in the text. */
#include "setup_yaml.h"
#include "setup_keys.h"
#include <cyaml/cyaml.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum { NAME_MOST = 64 };

static const cyaml_schema_value_t item_schema = {
    CYAML_VALUE_STRING(CYAML_FLAG_POINTER, char *, 0, CYAML_UNLIMITED)};

/* A schema under construction: a pool of fields and of key names, two a row of the table at
 * most. */
typedef struct schema {
  int keys;
  int fields, names; /* used */
  cyaml_schema_field_t *field;
  char (*name)[NAME_MOST];
  const wend_yaml_places *places;
} schema;

/* What libcyaml said: the first complaint, and the path its backtrace gives, innermost first.
 */
typedef struct complaint {
  char text[256], path[256];
  int line;
} complaint;

static cyaml_schema_field_t leaf(const wend_key *key, int k) {
  cyaml_schema_field_t field = {
      .data_offset =
          (uint32_t)((size_t)k * sizeof(wend_yaml_value) + offsetof(wend_yaml_value, scalar)),
      .value = {CYAML_VALUE_STRING(CYAML_FLAG_POINTER | CYAML_FLAG_OPTIONAL, char *, 0,
                                   CYAML_UNLIMITED)}};
  if (key->kind != WEND_KEY_LIST && key->kind != WEND_KEY_NAMES) return field;
  const size_t base = (size_t)k * sizeof(wend_yaml_value);
  field.data_offset = (uint32_t)(base + offsetof(wend_yaml_value, item));
  field.count_offset = (uint32_t)(base + offsetof(wend_yaml_value, items));
  field.count_size = sizeof(uint32_t);
  field.value =
      (cyaml_schema_value_t){.type = CYAML_SEQUENCE,
                             .flags = CYAML_FLAG_POINTER | CYAML_FLAG_OPTIONAL,
                             .data_size = sizeof(char *),
                             .sequence = {.entry = &item_schema, .max = CYAML_UNLIMITED}};
  return field;
}

/* Does row k open a new entry of the group `prefix`? Its name (up to the next point) goes to
 * name. */
static bool opens(int k, const char *prefix, size_t length, char *name) {
  const char *path = wend_key_at(k)->path;
  if (strncmp(path, prefix, length) != 0) return false;
  const size_t word = strcspn(path + length, ".");
  if (word == 0 || word >= NAME_MOST) return false;
  for (int e = 0; e < k; e++) {
    const char *earlier = wend_key_at(e)->path;
    if (strncmp(earlier, path, length + word) == 0 &&
        strchr(".", earlier[length + word]) != NULL)
      return false;
  }
  snprintf(name, NAME_MOST, "%.*s", (int)word, path + length);
  return true;
}

/* Fields of the group with this prefix ("" or ending in a point), ended by an empty one.
 * Entries lie side by side, so a group takes its place in the pool before its subgroups do. */
static const cyaml_schema_field_t *group(schema *s, const char *prefix) {
  const size_t length = strlen(prefix);
  const int first = s->fields;
  char name[NAME_MOST];
  int entries = 0;
  for (int k = 0; k < s->keys; k++) entries += opens(k, prefix, length, name);
  s->fields += entries + 1;
  for (int k = 0, f = first; k < s->keys; k++) {
    if (!opens(k, prefix, length, name)) continue;
    char path[256];
    snprintf(path, sizeof path, "%s%s", prefix, name);
    const int row = wend_key_find(path);
    const wend_yaml_place *place = wend_yaml_find(s->places, path);
    const bool plain = row >= 0 && (wend_key_at(row)->kind != WEND_KEY_LAW ||
                                    (place != NULL && place->scalar));
    strcpy(s->name[s->names], name);
    const char *key = s->name[s->names++];
    if (plain) {
      s->field[f] = leaf(wend_key_at(row), row);
    } else {
      strcat(path, ".");
      s->field[f].value = (cyaml_schema_value_t){
          .type = CYAML_MAPPING,
          .flags = CYAML_FLAG_OPTIONAL,
          .data_size = (uint32_t)((size_t)s->keys * sizeof(wend_yaml_value)),
          .mapping = {.fields = group(s, path)}};
    }
    s->field[f++].key = key;
  }
  return &s->field[first];
}

static void listen(cyaml_log_t level, void *context, const char *format, va_list arguments) {
  complaint *c = context;
  char text[256], name[128];
  int line = 0;
  vsnprintf(text, sizeof text, format, arguments);
  if (level < CYAML_LOG_ERROR) return;
  if (sscanf(text, " in mapping field '%127[^']' (line: %d", name, &line) == 2) {
    char inner[256];
    strcpy(inner, c->path);
    if (snprintf(c->path, sizeof c->path, "%s%s%s", name, inner[0] ? "." : "", inner) < 0)
      c->path[0] = '\0';
    if (c->line == 0) c->line = line;
  } else if (c->text[0] == '\0' && sscanf(text, "Load: %255[^\n]", c->text) == 1) {
    c->line = 0;
  }
}

/* The first key of the text that is neither a key nor a group of the table. */
static const wend_yaml_place *first_unknown(const wend_yaml_places *places) {
  for (int p = 0; p < places->n; p++) {
    const char *path = places->place[p].path;
    const size_t length = strlen(path);
    bool known = false;
    for (int k = 0; k < wend_key_count(); k++) {
      const char *key = wend_key_at(k)->path;
      known = known ||
              (strncmp(key, path, length) == 0 && (key[length] == '\0' || key[length] == '.'));
    }
    if (!known) return &places->place[p];
  }
  return NULL;
}

/* What may stand where an unknown key stands: the entries of its group. */
static void list_entries(const char *path, size_t size, char *list) {
  const char *point = strrchr(path, '.');
  const size_t length = point != NULL ? (size_t)(point - path) + 1 : 0;
  char name[NAME_MOST];
  size_t used = 0;
  list[0] = '\0';
  for (int k = 0; k < wend_key_count(); k++)
    if (opens(k, path, length, name) && used < size)
      used += (size_t)snprintf(list + used, size - used, "%s%s", used > 0 ? ", " : "", name);
}

static const char *wanted(const complaint *c) {
  if (strstr(c->text, "already seen") != NULL) return "is given twice";
  if (strstr(c->text, "Expecting STRING") != NULL) return "must be a single value";
  if (strstr(c->text, "Expecting SEQUENCE") != NULL) return "must be a list: [a, b, ...]";
  if (strstr(c->text, "Expecting MAPPING") != NULL) return "must be a group of keys";
  return c->text;
}

static wend_status report(wend_team *team, const char *file, const wend_yaml_places *places,
                          const complaint *c) {
  const wend_yaml_place *unknown = first_unknown(places);
  if (unknown != NULL) {
    char list[512];
    list_entries(unknown->path, sizeof list, list);
    return wend_fail(team, WEND_ERR_SETUP, "%s, line %d: key %s is unknown; known here: %s",
                     file, unknown->line, unknown->path, list[0] != '\0' ? list : "none");
  }
  const wend_yaml_place *place = wend_yaml_find_last(places, c->path);
  return wend_fail(team, WEND_ERR_SETUP, "%s, line %d: %s %s", file,
                   place != NULL ? place->line : c->line, c->path[0] ? c->path : "the setup",
                   wanted(c));
}

static const cyaml_config_t quiet = {.mem_fn = cyaml_mem};

wend_status wend_yaml_load(wend_team *team, const char *file, const char *text,
                           const wend_yaml_places *places, wend_yaml_value **value) {
  *value = NULL;
  schema s = {.keys = wend_key_count(), .places = places};
  s.field = wend_allocate(team, 4 * (int64_t)s.keys, sizeof *s.field);
  s.name = wend_allocate(team, 4 * (int64_t)s.keys, sizeof *s.name);
  void *loaded = NULL;
  if (team->status != WEND_OK) goto done;
  const cyaml_schema_value_t root = {.type = CYAML_MAPPING,
                                     .flags = CYAML_FLAG_POINTER,
                                     .data_size =
                                         (uint32_t)((size_t)s.keys * sizeof(wend_yaml_value)),
                                     .mapping = {.fields = group(&s, "")}};
  complaint heard = {.line = 0};
  cyaml_config_t config = quiet;
  config.log_fn = listen;
  config.log_ctx = &heard;
  config.log_level = CYAML_LOG_WARNING;
  const cyaml_err_t err =
      cyaml_load_data((const uint8_t *)text, strlen(text), &config, &root, &loaded, NULL);
  if (err != CYAML_OK) {
    report(team, file, places, &heard);
  } else if (loaded == NULL) {
    wend_fail(team, WEND_ERR_SETUP, "%s is empty: particles and time.end are needed at least",
              file);
  } else {
    *value = loaded; /* the schema's top is an array of them, from realloc */
  }
done:
  free(s.name);
  free(s.field);
  return team->status;
}

void wend_yaml_values_free(wend_yaml_value *value) {
  for (int k = 0; value != NULL && k < wend_key_count(); k++) {
    free(value[k].scalar);
    for (uint32_t i = 0; i < value[k].items; i++) free(value[k].item[i]);
    free(value[k].item);
  }
  free(value);
}
