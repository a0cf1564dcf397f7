/* SPDX-License-Identifier: LGPL-3.0-or-later
 * particle_file.h: particle files in openPMD 1.1.0 (HDF5), read and written in parallel.
 *
 * Records of species `gas` are listed in records.c; values are SI through unitSI, magnetic
 * fields in tesla. What the standard has no place for is in the group /wend, which its readers
 * skip: /wend         attributes version, git; data set setup (one string): who wrote it, and
 * from what /wend/domain  attributes lower and upper (a number an axis), thickness, all times
 * unitSI (metres); boundary_x, boundary_y (, boundary_z): "periodic", "closed" or "open"
 * Another writer may give the box in the same way, or leave it to the setup. */
#ifndef WEND_IO_PARTICLE_FILE_H
#define WEND_IO_PARTICLE_FILE_H

#include "domain.h"
#include "particles.h"
#include "units.h"

/** What a particle file holds beside the particles. */
typedef struct wend_file_facts {
  int64_t iteration;  /**< the N of /data/N */
  double time, dt;    /**< run units */
  bool domain_given;  /**< box, boundaries and thickness are in the file */
  wend_domain domain; /**< only dim is set where they are not; written where domain_given */
  const char *setup;  /**< written: setup text; NULL: none */
} wend_file_facts;

/** Reads records of species `gas` of the last iteration into columns. Collective.
 *
 *  Positions are position + positionOffset. Any one of cosmicRayEnergy, cosmicRayEnergyDensity
 * (needs volume, or mass and massDensity) and cosmicRaySpecificEnergy (needs mass) may be
 * there: the result is in WEND_ENERGY as energy of the particle; where volumes are unknown
 * until neighbours are found, the density is left in WEND_ENERGY and *density is set. Every
 * known record that the file holds is read; needed: columns whose absence is an error that
 * names record and file. Without record id, particles are numbered in file order. Particles are
 * dealt out to ranks in blocks of equal length, in file order. In 2-D (position has x and y
 * only) z columns are 0. Bad values (NaN, negative mass, support or energy) are
 *  WEND_ERR_PARTICLES and name file, record and particle id; a file that breaks the standard
 * where it matters is WEND_ERR_FILE. On failure *particles is reset. timeOffset is not used. */
wend_status wend_particle_file_read(wend_team *team, const char *path, const wend_units *units,
                                    uint64_t needed, wend_particles *particles,
                                    wend_file_facts *facts, bool *density);

/** The same for one iteration of a file that may hold several; -1: the last. Collective. */
wend_status wend_particle_file_read_at(wend_team *team, const char *path, int64_t iteration,
                                       const wend_units *units, uint64_t needed,
                                       wend_particles *particles, wend_file_facts *facts,
                                       bool *density);

/** Brings positions into [lo, hi) on periodic axes, by one period at most, and checks that all
 * others lie in [lo, hi]. path: named in the error, with the particle id. Call it with the
 * domain of the run before the cut. Collective. */
wend_status wend_particle_file_place(wend_team *team, const char *path,
                                     const wend_domain *domain, wend_particles *particles);

/** Writes all columns present, in rank order, and an XDMF companion for ParaView. Collective.
 *
 *  Written to path.part and renamed: an existing file is replaced only by a whole one. The
 * bytes of every data set do not depend on the number of ranks. The companion has the name of
 * the file with .xmf in place of .h5. The file says that it belongs to a series (fileBased) if
 * its name ends in _<iteration>.h5, else it is groupBased. In 2-D, z components are left out
 * unless one is not 0 (never of position). The attribute date is the time of day, or
 * SOURCE_DATE_EPOCH (seconds) if the environment has it. */
wend_status wend_particle_file_write(wend_team *team, const char *path, const wend_units *units,
                                     const wend_particles *particles,
                                     const wend_file_facts *facts);

#endif
