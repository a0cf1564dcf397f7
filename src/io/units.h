/* SPDX-License-Identifier: LGPL-3.0-or-later
 * units.h: quantities as text ("3e28 cm^2/s"), through UDUNITS-2. */
#ifndef WEND_IO_UNITS_H
#define WEND_IO_UNITS_H

#include "team.h"

/** Powers of the seven SI base quantities: length, mass, time, current, temperature, amount,
 *  luminosity: the order of openPMD's unitDimension. */
typedef double wend_dimension[7];

/** The units a run computes in: SI value of one run unit. The magnetic field is in Gaussian units of the
 *  same system, B = sqrt(energy / volume), so that v_A = B / sqrt(4 pi rho) in run units. */
typedef struct wend_units {
  double length, time, mass;
} wend_units;

/** SI value of one run unit of the given dimension; a current exponent counts as magnetic field
 *  (a tesla is 1e4 G, and a gauss is g^1/2 cm^-1/2 s^-1). */
double wend_units_scale(const wend_units *units, const wend_dimension dimension);

/** Energy of one run unit in erg. */
double wend_units_erg(const wend_units *units);

/** Reads "number unit" and converts it to run units. Astronomers' names that UDUNITS-2 lacks (pc, Msun,
 *  Myr, G for gauss...) are known. what names the key in the error. Local. */
wend_status wend_units_parse(wend_team *team, const wend_units *units, const wend_dimension dimension,
                             const char *what, const char *text, double *value);

#endif
