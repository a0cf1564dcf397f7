/* SPDX-License-Identifier: LGPL-3.0-or-later
 * setup.h: what a run is asked to do, read from a YAML file through a schema. */
#ifndef WEND_IO_SETUP_H
#define WEND_IO_SETUP_H

#include "domain.h"
#include "settings.h"
#include "units.h"
#include <stdint.h>
#include <stdio.h>

typedef enum wend_law_kind {
  WEND_LAW_CONSTANT, /**< value */
  WEND_LAW_RECORD,   /**< the record of the particle file */
  WEND_LAW_POWER     /**< value (rho / density)^density_index (|B| / field)^field_index */
} wend_law_kind;

/** A coefficient of each particle. All values in run units. */
typedef struct wend_law {
  wend_law_kind kind;
  double value, density, field, density_index, field_index;
} wend_law;

typedef struct wend_setup {
  char *path;        /**< the setup file */
  char *text;        /**< its whole text */
  char *particles;   /**< input particle file, relative to the working directory or absolute */
  int iteration;     /**< the iteration of that file to start from; -1: its last */
  char *folder;      /**< where outputs go; made if missing */
  char *name;        /**< outputs are NAME_<n>.h5 */
  wend_units units;  /**< units of the run */
  bool domain_given; /**< else the box of the particle file is used */
  wend_domain domain;
  bool start_given;  /**< else the run starts at the time of the particle file */
  double start, end; /**< run times */
  double every;      /**< an output each so long; 0: none but the listed ones and the end */
  double *times;     /**< [n_times] further output times, ascending; NULL: none */
  int n_times;
  int checkpoint_steps; /**< a checkpoint each so many super-steps; 0: none */
  int steps;            /**< stop after so many super-steps; 0: no limit */
  wend_law kappa_par, kappa_perp;
  wend_settings settings;
} wend_setup;

/** Reads and checks a setup. Collective: rank 0 reads the file, all ranks return the same.
 *
 *  An unknown key, a wrong unit or an impossible value is WEND_ERR_SETUP, a file that cannot be
 * read WEND_ERR_FILE; the text names file, line and key. On failure *setup is reset. */
wend_status wend_setup_read(wend_team *team, const char *path, wend_setup *setup);
/** Frees what the setup holds and zeroes it. Local. */
void wend_setup_reset(wend_setup *setup);
/** Prints the reference of every key: name, unit, default, meaning. Local. */
void wend_setup_explain(FILE *out);
/** FNV-1a hash of the text, with which checkpoints recognise their setup. Local. */
uint64_t wend_setup_hash(const wend_setup *setup);

#endif
