/* SPDX-License-Identifier: LGPL-3.0-or-later
 * setup_scan.c: where each key of a YAML text stands.
 *
 * libcyaml gives lines in its log only, and for some errors those of the key before. So the
 * events of libyaml, on which it is built, are walked once: every key with its path and line.
 */
#include "setup_yaml.h"
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <yaml.h>

enum { DEPTH_MOST = 32, PATH_MOST = 512 };

/* A mapping or sequence that is open. */
typedef struct level {
  bool mapping;
  bool value_next; /* of a mapping: its key is known */
  size_t path;     /* length of the path of what is open */
} level;

typedef struct walk {
  wend_team *team;
  const char *file;
  wend_yaml_places *places;
  char path[PATH_MOST];
  level level[DEPTH_MOST];
  int depth, documents;
} walk;

static void add_place(walk *w, int line) {
  wend_yaml_places *p = w->places;
  wend_yaml_place *place = realloc(p->place, ((size_t)p->n + 1) * sizeof *place);
  char *path = malloc(strlen(w->path) + 1);
  if (place != NULL) p->place = place;
  if (place == NULL || path == NULL) {
    free(path);
    wend_fail(w->team, WEND_ERR_MEMORY, "%s: no memory for the setup", w->file);
    return;
  }
  strcpy(path, w->path);
  p->place[p->n++] = (wend_yaml_place){.path = path, .line = line};
}

static level *top(walk *w) { return w->depth > 0 ? &w->level[w->depth - 1] : NULL; }

/* A scalar is a key, or the value of the key before, or an entry of a list. */
static void scalar(walk *w, const char *text, int line) {
  level *here = top(w);
  if (here == NULL || !here->mapping) return;
  if (here->value_next) {
    if (w->places->n > 0) w->places->place[w->places->n - 1].scalar = true;
    here->value_next = false;
    return;
  }
  snprintf(w->path + here->path, PATH_MOST - here->path, "%s%s", here->path > 0 ? "." : "",
           text);
  here->value_next = true;
  add_place(w, line);
}

static void open_level(walk *w, bool mapping, int line) {
  level *here = top(w);
  if (here != NULL && here->mapping && !here->value_next)
    wend_fail(w->team, WEND_ERR_SETUP, "%s, line %d: a key must be a word", w->file, line);
  if (w->depth == DEPTH_MOST)
    wend_fail(w->team, WEND_ERR_SETUP, "%s, line %d: groups are nested too deeply", w->file,
              line);
  if (w->team->status != WEND_OK) return;
  if (here != NULL) here->value_next = false;
  w->level[w->depth++] = (level){.mapping = mapping, .path = strlen(w->path)};
}

static void close_level(walk *w) {
  if (w->depth > 0) w->depth--;
  level *here = top(w);
  w->path[here != NULL ? here->path : 0] = '\0';
}

static void take(walk *w, const yaml_event_t *event) {
  const int line = (int)event->start_mark.line + 1;
  level *here = top(w);
  switch (event->type) {
  case YAML_SCALAR_EVENT:
    scalar(w, (const char *)event->data.scalar.value, line);
    break;
  case YAML_MAPPING_START_EVENT:
    open_level(w, true, line);
    break;
  case YAML_SEQUENCE_START_EVENT:
    open_level(w, false, line);
    break;
  case YAML_MAPPING_END_EVENT:
  case YAML_SEQUENCE_END_EVENT:
    close_level(w);
    break;
  case YAML_ALIAS_EVENT:
    if (here != NULL && here->mapping && here->value_next) here->value_next = false;
    break;
  case YAML_DOCUMENT_START_EVENT:
    if (++w->documents > 1)
      wend_fail(w->team, WEND_ERR_SETUP,
                "%s, line %d: a second document starts here: one setup a file", w->file, line);
    break;
  default:
    break;
  }
}

wend_status wend_yaml_scan(wend_team *team, const char *file, const char *text,
                           wend_yaml_places *places) {
  memset(places, 0, sizeof *places);
  walk w = {.team = team, .file = file, .places = places};
  yaml_parser_t parser;
  if (!yaml_parser_initialize(&parser))
    return wend_fail(team, WEND_ERR_MEMORY, "%s: no memory for the setup", file);
  yaml_parser_set_input_string(&parser, (const unsigned char *)text, strlen(text));
  for (bool more = true; more && team->status == WEND_OK;) {
    yaml_event_t event;
    if (!yaml_parser_parse(&parser, &event)) {
      wend_fail(team, WEND_ERR_SETUP, "%s, line %d: this is no YAML: %s", file,
                (int)parser.problem_mark.line + 1,
                parser.problem != NULL ? parser.problem : "");
      break;
    }
    more = event.type != YAML_STREAM_END_EVENT;
    take(&w, &event);
    yaml_event_delete(&event);
  }
  yaml_parser_delete(&parser);
  return team->status;
}

void wend_yaml_places_reset(wend_yaml_places *places) {
  for (int k = 0; k < places->n; k++) free(places->place[k].path);
  free(places->place);
  memset(places, 0, sizeof *places);
}

const wend_yaml_place *wend_yaml_find(const wend_yaml_places *places, const char *path) {
  for (int k = 0; k < places->n; k++)
    if (strcmp(places->place[k].path, path) == 0) return &places->place[k];
  return NULL;
}

const wend_yaml_place *wend_yaml_find_last(const wend_yaml_places *places, const char *path) {
  for (int k = places->n; k-- > 0;)
    if (strcmp(places->place[k].path, path) == 0) return &places->place[k];
  return NULL;
}
