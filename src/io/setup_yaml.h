/* SPDX-License-Identifier: LGPL-3.0-or-later
 * setup_yaml.h: from the text of a setup to the text of each key, with line numbers. Private.
 */
#ifndef WEND_IO_SETUP_YAML_H
#define WEND_IO_SETUP_YAML_H

#include "team.h"
#include <stdint.h>

/** A key as it stands in the text. */
typedef struct wend_yaml_place {
  char *path;  /**< groups and key, joined by points */
  int line;    /**< of the key, from 1 */
  bool scalar; /**< its value is a scalar, not a group or list */
} wend_yaml_place;

/** All keys of a text, in order. */
typedef struct wend_yaml_places {
  int n;
  wend_yaml_place *place;
} wend_yaml_places;

/** Finds all keys; text that is no YAML is WEND_ERR_SETUP with its line. file names it in
 * errors. Local. */
wend_status wend_yaml_scan(wend_team *team, const char *file, const char *text,
                           wend_yaml_places *places);
void wend_yaml_places_reset(wend_yaml_places *places);
/** Finds the first, or the last, place of a path; NULL where it is not in the text. Local. */
const wend_yaml_place *wend_yaml_find(const wend_yaml_places *places, const char *path);
const wend_yaml_place *wend_yaml_find_last(const wend_yaml_places *places, const char *path);

/** The text of each key of the table; the members are what libcyaml fills. */
typedef struct wend_yaml_value {
  char *scalar;   /**< NULL: not given */
  char **item;    /**< entries of a list */
  uint32_t items; /**< their number */
} wend_yaml_value;

/** Loads the text through the schema that the table of keys makes. Local.
 *  value [wend_key_count()] of the result, freed with wend_yaml_values_free. */
wend_status wend_yaml_load(wend_team *team, const char *file, const char *text,
                           const wend_yaml_places *places, wend_yaml_value **value);
void wend_yaml_values_free(wend_yaml_value *value);

#endif
