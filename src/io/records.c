/* SPDX-License-Identifier: LGPL-3.0-or-later
 * records.c: which record of a particle file goes with which column. */
#include "records.h"
#include <math.h>

static const wend_record records[] = {
    {"position", WEND_X, 3, WEND_Q_LENGTH, WEND_RANGE_ANY},
    {"magneticField", WEND_BX, 3, WEND_Q_FIELD, WEND_RANGE_ANY},
    {"velocity", WEND_VX, 3, WEND_Q_SPEED, WEND_RANGE_ANY},
    {"mass", WEND_MASS, 1, WEND_Q_MASS, WEND_RANGE_POSITIVE},
    {"massDensity", WEND_DENSITY, 1, WEND_Q_DENSITY, WEND_RANGE_POSITIVE},
    {"supportRadius", WEND_SUPPORT, 1, WEND_Q_LENGTH, WEND_RANGE_POSITIVE},
    {"volume", WEND_VOLUME, 1, WEND_Q_VOLUME, WEND_RANGE_POSITIVE},
    {"cosmicRayEnergy", WEND_ENERGY, 1, WEND_Q_ENERGY, WEND_RANGE_NOT_NEGATIVE},
    {"specificInternalEnergy", WEND_INTERNAL, 1, WEND_Q_SPECIFIC_ENERGY,
     WEND_RANGE_NOT_NEGATIVE},
    {"parallelDiffusivity", WEND_KPAR, 1, WEND_Q_DIFFUSIVITY, WEND_RANGE_NOT_NEGATIVE},
    {"perpendicularDiffusivity", WEND_KPERP, 1, WEND_Q_DIFFUSIVITY, WEND_RANGE_NOT_NEGATIVE},
    {"ionisedFraction", WEND_IONISED, 1, WEND_Q_NUMBER, WEND_RANGE_SHARE},
    {"electronNumberDensity", WEND_ELECTRONS, 1, WEND_Q_NUMBER_DENSITY,
     WEND_RANGE_NOT_NEGATIVE},
    {"cosmicRaySource", WEND_SOURCE, 1, WEND_Q_POWER, WEND_RANGE_NOT_NEGATIVE},
};

static const wend_record energy_density = {"cosmicRayEnergyDensity", WEND_ENERGY, 1,
                                           WEND_Q_ENERGY_DENSITY, WEND_RANGE_NOT_NEGATIVE};
static const wend_record specific_energy = {"cosmicRaySpecificEnergy", WEND_ENERGY, 1,
                                            WEND_Q_SPECIFIC_ENERGY, WEND_RANGE_NOT_NEGATIVE};

const wend_record *wend_record_at(int k) {
  return k >= 0 && k < (int)(sizeof records / sizeof records[0]) ? &records[k] : NULL;
}

const wend_record *wend_record_of(wend_column column) {
  for (int k = 0; wend_record_at(k) != NULL; k++)
    if (column >= records[k].column &&
        (int)column < (int)records[k].column + records[k].components)
      return &records[k];
  return NULL;
}

const wend_record *wend_record_energy_density(void) { return &energy_density; }

const wend_record *wend_record_specific_energy(void) { return &specific_energy; }

const char *wend_range_text(wend_range range) {
  static const char *const text[] = {"finite", "greater than 0", "0 or greater",
                                     "between 0 and 1"};
  return text[range];
}

bool wend_range_holds(wend_range range, double value) {
  if (!isfinite(value)) return false;
  switch (range) {
  case WEND_RANGE_ANY:
    return true;
  case WEND_RANGE_POSITIVE:
    return value > 0;
  case WEND_RANGE_NOT_NEGATIVE:
    return value >= 0;
  case WEND_RANGE_SHARE:
    return value >= 0 && value <= 1;
  }
  return false;
}
