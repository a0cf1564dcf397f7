/* SPDX-License-Identifier: LGPL-3.0-or-later
 * particle_reader.h: what the parts of reading a particle file share. Private. */
#ifndef WEND_IO_PARTICLE_READER_H
#define WEND_IO_PARTICLE_READER_H

#include "hdf.h"
#include "records.h"

typedef struct wend_particle_reader {
  wend_hdf hdf;
  wend_team *team;
  const wend_units *units;
  wend_particles *particles;
  hid_t gas; /**< group of the species */
  int dim;
  wend_hdf_block block; /**< this rank's share of the particles */
} wend_particle_reader;

/** Records "path: record gas/RECORD WHAT" as WEND_ERR_FILE. Local. */
void wend_record_complain(wend_particle_reader *reader, const char *record, const char *what);

/** Number of particles by component position/x; a failure is recorded. Matched. */
int64_t wend_record_count(wend_particle_reader *reader);
/** Reads ids, or numbers particles in file order where there are none. Collective. */
wend_status wend_record_take_ids(wend_particle_reader *reader);
/** Reads all components of a record into its columns, made if absent, and checks them.
 * Collective. */
wend_status wend_record_take(wend_particle_reader *reader, const wend_record *record);

#endif
