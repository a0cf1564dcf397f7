/* SPDX-License-Identifier: LGPL-3.0-or-later
 * particles.h: the table of particles a rank owns, one column a quantity.
 *
 * Values are in the run's own units (units.h of the file layer); the library attaches no unit
 * to them. A column that is absent is NULL. */
#ifndef WEND_SRC_PARTICLES_H
#define WEND_SRC_PARTICLES_H

#include "team.h"
#include <stdint.h>

typedef enum wend_column {
  WEND_X, /**< position; z is 0 in 2-D */
  WEND_Y,
  WEND_Z,
  WEND_BX, /**< magnetic field */
  WEND_BY,
  WEND_BZ,
  WEND_VX, /**< velocity: carried along, not used by static transport */
  WEND_VY,
  WEND_VZ,
  WEND_MASS,
  WEND_DENSITY, /**< mass density */
  WEND_SUPPORT, /**< support radius H */
  WEND_VOLUME,
  WEND_ENERGY,    /**< CR energy of the particle, E */
  WEND_INTERNAL,  /**< specific internal energy of the gas */
  WEND_KPAR,      /**< parallel diffusivity */
  WEND_KPERP,     /**< perpendicular diffusivity */
  WEND_IONISED,   /**< ionised fraction */
  WEND_ELECTRONS, /**< free electrons a volume */
  WEND_SOURCE,    /**< CR energy injected a time */
  WEND_COLUMNS
} wend_column;

typedef struct wend_particles {
  int32_t n;                    /**< particles on this rank */
  uint64_t *id;                 /**< [n] unique over all ranks */
  uint64_t *key;                /**< [n] Hilbert key; valid after the cut */
  double *column[WEND_COLUMNS]; /**< [n] each, or NULL */
} wend_particles;

/** Allocates n particles with id, key and the columns in `mask` (bit c for column c). Local. */
wend_status wend_particles_init(wend_team *team, wend_particles *particles, int32_t n,
                                uint64_t mask);
/** Adds one column, zeroed, unless it is there. Local. */
wend_status wend_particles_add(wend_team *team, wend_particles *particles, wend_column column);
/** Frees all columns and zeroes the struct. Local. */
void wend_particles_reset(wend_particles *particles);
/** Bits of the columns present. Local. */
uint64_t wend_particles_mask(const wend_particles *particles);

#endif
