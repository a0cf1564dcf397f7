/* SPDX-License-Identifier: LGPL-3.0-or-later
 * particle_writer.h: what the parts of writing a particle file share. Private. */
#ifndef WEND_IO_PARTICLE_WRITER_H
#define WEND_IO_PARTICLE_WRITER_H

#include "hdf.h"
#include "particle_file.h"
#include "records.h"

typedef struct wend_particle_writer {
  wend_hdf hdf;
  wend_team *team;
  const wend_units *units;
  const wend_particles *particles;
  const wend_file_facts *facts;
  hid_t gas; /**< group of the species */
  int dim;
  wend_hdf_block block;     /**< this rank's share of the particles */
  bool have[WEND_COLUMNS];  /**< columns of the file: on all ranks the same */
  bool third[WEND_COLUMNS]; /**< in 2-D: this z column holds something but 0 */
} wend_particle_writer;

/** Writes unitSI of one component. Matched. */
void wend_particle_put_unit(wend_particle_writer *writer, hid_t object, wend_quantity quantity);
/** Writes what the standard asks of every record. Matched. */
void wend_particle_put_record_facts(wend_particle_writer *writer, hid_t object,
                                    wend_quantity quantity);
/** Writes the attributes of the root group. Collective. */
wend_status wend_particle_put_root(wend_particle_writer *writer);
/** Writes the group /wend: box, setup, version. Collective. */
wend_status wend_particle_put_own(wend_particle_writer *writer);
/** Writes particlePatches: boxes around runs of particles, the same on any number of ranks.
 * Collective. */
wend_status wend_particle_put_patches(wend_particle_writer *writer);

#endif
