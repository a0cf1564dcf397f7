/* SPDX-License-Identifier: LGPL-3.0-or-later
 * setup_values.h: from the text of each key to values in a wend_setup. Private. */
#ifndef WEND_IO_SETUP_VALUES_H
#define WEND_IO_SETUP_VALUES_H

#include "setup.h"
#include "setup_yaml.h"

/** What the steps of understanding a setup share. */
typedef struct wend_setup_reader {
  wend_team *team;
  wend_setup *setup;
  const wend_unit_names *names;
  wend_yaml_places places;
  wend_yaml_value *value; /* [wend_key_count()] */
} wend_setup_reader;

/** Records "FILE, line N: PATH: ..." as WEND_ERR_SETUP; without a line where the key is not in
 * the text. */
wend_status wend_setup_fail(wend_setup_reader *reader, const char *path, const char *format,
                            ...) __attribute__((format(printf, 3, 4)));

/** Is the key, or for a group any key of it, in the text? */
bool wend_setup_given(const wend_setup_reader *reader, const char *path);

/** Stores every key of the table, given or by default, in the setup; those marked
 * WEND_KEY_ELSEWHERE are checked only. Quantities are in run units: units.* come first. */
void wend_setup_store(wend_setup_reader *reader);

/** One quantity of a key, in run units; problems are recorded. */
double wend_setup_quantity(wend_setup_reader *reader, const char *path, const char *text);
/** A switch that is stored elsewhere. */
bool wend_setup_switch(wend_setup_reader *reader, const char *path);

/** Understands domain.*. */
void wend_setup_domain(wend_setup_reader *reader);
/** Understands diffusion.*. */
void wend_setup_diffusion(wend_setup_reader *reader);

#endif
