/* SPDX-License-Identifier: LGPL-3.0-or-later
 * particle_file.h: particle files in openPMD 1.1.0 (HDF5), read and written in parallel. */
#ifndef WEND_IO_PARTICLE_FILE_H
#define WEND_IO_PARTICLE_FILE_H

#include "domain.h"
#include "particles.h"
#include "units.h"

/** What a particle file holds beside the particles. */
typedef struct wend_file_facts {
  int64_t iteration; /**< the N of /data/N */
  double time, dt;   /**< run units */
  bool domain_given; /**< box, boundaries and thickness were in the file */
  wend_domain domain;
  const char *setup; /**< written: setup text; NULL: none */
} wend_file_facts;

/** Reads records of species `gas` into columns. Collective.
 *
 *  Positions are position + positionOffset. Any one of cosmicRayEnergy, cosmicRayEnergyDensity
 * (needs volume, or mass and massDensity) and cosmicRaySpecificEnergy (needs mass) may be
 * there: the result is in WEND_ENERGY as energy of the particle; where volumes are unknown
 * until neighbours are found, the density is left in WEND_ENERGY and *density is set. needed:
 * columns whose absence is an error that names record and file. Particles are dealt out to
 * ranks in blocks of equal length, in file order. Bad values (NaN, negative mass, support or
 * energy) are errors that name file, record and particle id. */
wend_status wend_particle_file_read(wend_team *team, const char *path, const wend_units *units,
                                    uint64_t needed, wend_particles *particles,
                                    wend_file_facts *facts, bool *density);

/** Writes all columns present, canonical order, and the XDMF companion path.xmf. Collective.
 *
 *  Written to path.part and renamed: an existing file is replaced only by a whole one. The
 * bytes of every data set do not depend on the number of ranks. */
wend_status wend_particle_file_write(wend_team *team, const char *path, const wend_units *units,
                                     const wend_particles *particles,
                                     const wend_file_facts *facts);

#endif
