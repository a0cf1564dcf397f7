/* SPDX-License-Identifier: LGPL-3.0-or-later
 * run.h: a run of the main job, from a setup and a particle file to the end time.
 *
 * Phases, in order: begin, read particles and build (or restore: run_state.h), and then steps
 * with outputs, books and checkpoints; reset at the end, also after a failure. */
#ifndef WEND_IO_RUN_H
#define WEND_IO_RUN_H

#include "march.h"
#include "output_times.h"
#include "particles.h"
#include "setup.h"

/** Where the volumes of a run come from. */
typedef enum wend_volume_origin {
  WEND_VOLUME_RECORD, /**< record volume of the particle file */
  WEND_VOLUME_MASS,   /**< mass over mass density of the particle file */
  WEND_VOLUME_KERNEL  /**< kernel sum */
} wend_volume_origin;

typedef struct wend_run {
  wend_setup setup;
  wend_domain domain;
  double start;           /**< run time at which the run starts, or started */
  int64_t total;          /**< particles of all ranks */
  uint64_t file_records;  /**< bits of the columns that the particle file held */
  bool energy_is_density; /**< WEND_ENERGY holds energy a volume, until volumes are known */
  wend_volume_origin volumes;
  wend_particles particles;
  wend_geometry geometry;
  wend_transport transport;
  wend_march march;
  wend_output_cursor outputs;
  double imbalance; /**< largest over mean of the ranks' pairs, as cut in the end */
} wend_run;

/** Reads the setup of a run. Collective. */
wend_status wend_run_begin(wend_team *team, const char *path, wend_run *run);
/** Reads the particles that the setup names, and checks that they fit it. Collective. */
wend_status wend_run_read_particles(wend_team *team, wend_run *run);

/** Cuts the particles and builds geometry, transport and march from the start. Collective.
 *
 *  Ranks first get equal numbers of particles; where their pairs then differ by more than a few
 * per cent they are cut again by pairs. Supports and volumes that were used are columns
 * afterwards. */
wend_status wend_run_build(wend_team *team, wend_run *run);

/** Makes the folder of the outputs, with those above it, and checks that files can be made
 * there and that the particle file is none of those that the outputs replace. Collective. */
wend_status wend_run_make_folder(wend_team *team, const wend_run *run);
/** Writes the next output file and moves the cursor past the present time. Collective. */
wend_status wend_run_write_output(wend_team *team, wend_run *run);
/** Removes output files number `from` and above, whole and half-written. Collective.
 *  *removed receives their number; NULL: not wanted. */
wend_status wend_run_drop_outputs(wend_team *team, const wend_run *run, int64_t from,
                                  int64_t *removed);
/** Writes FOLDER/NAME and the formatted tail to text. WEND_ERR_ARGUMENT, recorded, where it is
 * too long. Local. */
wend_status wend_run_path(wend_team *team, const wend_run *run, size_t size, char *text,
                          const char *tail, ...) __attribute__((format(printf, 5, 6)));

/** Writes FOLDER/NAME_run.log, what a reader needs to cite and to repeat the run: versions,
 * setup, machine, ranks, date. A resumed run adds to it. Collective. */
wend_status wend_run_write_log(wend_team *team, const wend_run *run, bool resumed);

/** Frees all of it. Local. */
void wend_run_reset(wend_run *run);

#endif
