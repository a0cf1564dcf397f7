/* SPDX-License-Identifier: LGPL-3.0-or-later
 * units.h: quantities as text ("3e28 cm^2/s"), through UDUNITS-2. */
#ifndef WEND_IO_UNITS_H
#define WEND_IO_UNITS_H

#include "team.h"

/** Powers of the seven SI base quantities: length, mass, time, current, temperature, amount,
 *  luminosity: the order of openPMD's unitDimension. */
typedef double wend_dimension[7];

/** The physical quantities that setups and particle files hold. */
typedef enum wend_quantity {
  WEND_Q_NUMBER,
  WEND_Q_LENGTH,
  WEND_Q_TIME,
  WEND_Q_MASS,
  WEND_Q_SPEED,
  WEND_Q_VOLUME,
  WEND_Q_DENSITY,        /**< mass a volume */
  WEND_Q_NUMBER_DENSITY, /**< number a volume */
  WEND_Q_FIELD,          /**< magnetic field */
  WEND_Q_DIFFUSIVITY,
  WEND_Q_ENERGY,
  WEND_Q_ENERGY_DENSITY,  /**< energy a volume */
  WEND_Q_SPECIFIC_ENERGY, /**< energy a mass */
  WEND_Q_POWER,           /**< energy a time */
  WEND_QUANTITIES
} wend_quantity;

typedef struct wend_quantity_facts {
  const char *name;         /**< plain words, for errors */
  wend_dimension dimension; /**< in SI, a magnetic field in tesla */
  const char *example;      /**< a value as users write it */
} wend_quantity_facts;

/** Name, dimension and example of a quantity. Local; lives for ever. */
const wend_quantity_facts *wend_quantity_find(wend_quantity quantity);

/** The units a run computes in: SI value of one run unit. The magnetic field is in Gaussian
 * units of the same system, B = sqrt(energy / volume), so that v_A = B / sqrt(4 pi rho) in run
 * units. */
typedef struct wend_units {
  double length, time, mass;
} wend_units;

/** kpc, Myr, Msun: the units of a run that names none. Local. */
wend_units wend_units_default(void);

/** SI value of one run unit of the given dimension; a current exponent counts as magnetic field
 *  (a tesla is 1e4 G, and a gauss is g^1/2 cm^-1/2 s^-1). */
double wend_units_scale(const wend_units *units, const wend_dimension dimension);

/** Energy of one run unit in erg. */
double wend_units_erg(const wend_units *units);

/** The units UDUNITS-2 knows, with astronomers' names added: pc, Msun, yr (Julian), G (gauss).
 */
typedef struct wend_unit_names wend_unit_names;

/** Reads the unit database (2 ms; UDUNITS-2 itself never frees some 6 kB of prefixes, so make
 * one for many texts). NULL on failure, which is recorded: UDUNITS-2 is not properly installed.
 * Local. */
wend_unit_names *wend_unit_names_create(wend_team *team);
/** Frees the database; NULL is allowed. Local. */
void wend_unit_names_destroy(wend_unit_names *names);

/** Reads "number unit" and converts it to run units. Local.
 *
 *  All units and SI prefixes of UDUNITS-2 are known, and pc, Msun, yr, G with prefixes. Only a
 * zero may come without a unit; numbers without dimension may not have one. what names the key
 * in the error, which is WEND_ERR_SETUP and shows the text and an example; *value is then
 * unchanged. */
wend_status wend_unit_names_parse(wend_team *team, const wend_unit_names *names,
                                  const wend_units *units, const wend_dimension dimension,
                                  const char *what, const char *text, double *value);

/** The same for a single text: reads the unit database (some ms) and frees it again. Local. */
wend_status wend_units_parse(wend_team *team, const wend_units *units,
                             const wend_dimension dimension, const char *what, const char *text,
                             double *value);

#endif
