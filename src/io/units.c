/* SPDX-License-Identifier: LGPL-3.0-or-later
 * units.c: quantities as text, through UDUNITS-2, and the units a run computes in.
 *
 * Length, time and mass of a run make a Gaussian system, in which B^2 / (8 pi) is an energy a
 * volume: one run unit of B is sqrt(mass / length) / time, and 1 g^1/2 cm^-1/2 s^-1 is one
 * gauss, 1e-4 T. In SI values that is 10^-3.5 sqrt(kg / m) / s, since B_SI = B_G sqrt(mu_0 / 4
 * pi) and mu_0 / 4 pi is 1e-7. */
#include "units.h"
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <udunits2.h>

static const wend_quantity_facts quantities[WEND_QUANTITIES] = {
    [WEND_Q_NUMBER] = {"a number", {0}, "0.5"},
    [WEND_Q_LENGTH] = {"a length", {1}, "1 kpc"},
    [WEND_Q_TIME] = {"a time", {0, 0, 1}, "10 Myr"},
    [WEND_Q_MASS] = {"a mass", {0, 1}, "1 Msun"},
    [WEND_Q_SPEED] = {"a speed", {1, 0, -1}, "100 km/s"},
    [WEND_Q_VOLUME] = {"a volume", {3}, "1 kpc^3"},
    [WEND_Q_DENSITY] = {"a mass density", {-3, 1}, "1e-24 g/cm^3"},
    [WEND_Q_NUMBER_DENSITY] = {"a number density", {-3}, "0.1 cm^-3"},
    [WEND_Q_FIELD] = {"a magnetic field", {0, 1, -2, -1}, "5 uG"},
    [WEND_Q_DIFFUSIVITY] = {"a diffusivity", {2, 0, -1}, "3e28 cm^2/s"},
    [WEND_Q_ENERGY] = {"an energy", {2, 1, -2}, "1e51 erg"},
    [WEND_Q_ENERGY_DENSITY] = {"an energy density", {-1, 1, -2}, "1e-12 erg/cm^3"},
    [WEND_Q_SPECIFIC_ENERGY] = {"a specific energy", {2, 0, -2}, "1e12 erg/g"},
    [WEND_Q_POWER] = {"a power", {2, 1, -3}, "1e40 erg/s"},
};

/* Names that UDUNITS-2 lacks or reads as something else. The parsec is 648000/pi au (IAU 2015
 * resolution B2); the solar mass is the nominal G Msun, 1.3271244e20 m^3/s^2 (IAU 2015
 * resolution B3), over G = 6.67430e-11 (CODATA 2018); the year is the Julian one (IAU), where
 * UDUNITS-2 has the tropical. */
static const struct {
  const char *symbol, *definition;
} astronomers[] = {
    {"pc", "3.0856775814913673e16 m"},
    {"parsec", "3.0856775814913673e16 m"},
    {"Msun", "1.988409870698051e30 kg"},
    {"M_sun", "1.988409870698051e30 kg"},
    {"yr", "31557600 s"},
    {"year", "31557600 s"},
    {"years", "31557600 s"},
    {"G", "1e-4 T"},
};

struct wend_unit_names {
  ut_system *system;
};

const wend_quantity_facts *wend_quantity_find(wend_quantity quantity) {
  return &quantities[quantity];
}

wend_units wend_units_default(void) {
  return (wend_units){
      .length = 3.0856775814913673e19, .time = 1e6 * 31557600.0, .mass = 1.988409870698051e30};
}

double wend_units_scale(const wend_units *units, const wend_dimension dimension) {
  const double tesla_root = 3.1622776601683794e-4; /* 10^-3.5 */
  const double *d = dimension;
  double scale = pow(units->length, d[0]) * pow(units->mass, d[1]) * pow(units->time, d[2]);
  if (d[3] != 0) { /* a current is a mass / time^2 / field */
    const double current = units->mass / (units->time * units->time);
    const double field = tesla_root * sqrt(units->mass / units->length) / units->time;
    scale *= pow(current / field, d[3]);
  }
  return scale;
}

double wend_units_erg(const wend_units *units) {
  return wend_units_scale(units, quantities[WEND_Q_ENERGY].dimension) * 1e7;
}

/* Names match in any case, symbols exactly; a symbol is looked up first, so that adding symbols
 * is enough. */
static bool add_astronomers(ut_system *system) {
  bool good = true;
  for (size_t k = 0; k < sizeof astronomers / sizeof astronomers[0]; k++) {
    ut_unit *unit = ut_parse(system, astronomers[k].definition, UT_UTF8);
    ut_unmap_symbol_to_unit(system, astronomers[k].symbol, UT_UTF8);
    ut_unmap_name_to_unit(system, astronomers[k].symbol, UT_UTF8);
    good = good && unit != NULL &&
           ut_map_symbol_to_unit(astronomers[k].symbol, UT_UTF8, unit) == UT_SUCCESS;
    ut_free(unit);
  }
  return good;
}

wend_unit_names *wend_unit_names_create(wend_team *team) {
  wend_unit_names *names = wend_allocate(team, 1, sizeof *names);
  if (names == NULL) return NULL;
  const ut_error_message_handler talk = ut_set_error_message_handler(ut_ignore);
  names->system = ut_read_xml(NULL);
  const bool good = names->system != NULL && add_astronomers(names->system);
  ut_set_error_message_handler(talk);
  if (good) return names;
  wend_unit_names_destroy(names);
  wend_fail(team, WEND_ERR_FILE,
            "the unit database cannot be read: install the data of UDUNITS-2, or set "
            "UDUNITS2_XML_PATH");
  return NULL;
}

void wend_unit_names_destroy(wend_unit_names *names) {
  if (names == NULL) return;
  ut_free_system(names->system);
  free(names);
}

/* The SI unit of a dimension, as text that UDUNITS-2 reads. */
static void si_unit(const wend_dimension dimension, size_t size, char *text) {
  static const char *const base[7] = {"m", "kg", "s", "A", "K", "mol", "cd"};
  size_t used = 0;
  for (int k = 0; k < 7; k++)
    if (dimension[k] != 0 && used < size)
      used += (size_t)snprintf(text + used, size - used, "%s%s^%d", used > 0 ? " " : "",
                               base[k], (int)dimension[k]);
  if (used == 0) snprintf(text, size, "1");
}

/* SI value of one `unit`; 0 where the unit is unknown, -1 where it measures something else. A
 * scale with another zero (degree Celsius, a date) or a logarithm (decibel) is no plain unit.
 */
static double si_value(const ut_system *system, const char *unit,
                       const wend_dimension dimension) {
  char si[96];
  si_unit(dimension, sizeof si, si);
  double factor = 0;
  const ut_error_message_handler talk = ut_set_error_message_handler(ut_ignore);
  ut_unit *from = ut_parse(system, unit, UT_UTF8);
  ut_unit *to = ut_parse(system, si, UT_UTF8);
  if (from != NULL && to != NULL) {
    cv_converter *converter = ut_get_converter(from, to);
    const double zero = converter != NULL ? cv_convert_double(converter, 0) : NAN;
    const double one = converter != NULL ? cv_convert_double(converter, 1) : NAN;
    const double two = converter != NULL ? cv_convert_double(converter, 2) : NAN;
    factor = zero == 0 && one > 0 && fabs(two - 2 * one) <= 1e-12 * two ? one : -1;
    cv_free(converter);
  }
  ut_free(from);
  ut_free(to);
  ut_set_error_message_handler(talk);
  return factor;
}

/* What to write instead: the example of the quantity with this dimension, or of the SI unit. */
static void explain(const wend_dimension dimension, size_t size, char *text) {
  for (int q = 0; q < WEND_QUANTITIES; q++) {
    if (memcmp(quantities[q].dimension, dimension, sizeof(wend_dimension)) != 0) continue;
    snprintf(text, size, "write %s, for example %s", quantities[q].name, quantities[q].example);
    return;
  }
  char si[96];
  si_unit(dimension, sizeof si, si);
  snprintf(text, size, "write a quantity, for example 1 %s", si);
}

wend_status wend_unit_names_parse(wend_team *team, const wend_unit_names *names,
                                  const wend_units *units, const wend_dimension dimension,
                                  const char *what, const char *text, double *value) {
  static const wend_dimension none = {0};
  const bool plain = memcmp(dimension, none, sizeof none) == 0;
  char hint[192];
  explain(dimension, sizeof hint, hint);
  char *unit;
  const double number = strtod(text, &unit);
  const bool read = unit != text && isfinite(number);
  unit += strspn(unit, " \t");
  if (!read)
    return wend_fail(team, WEND_ERR_SETUP, "%s: \"%s\" does not start with a finite number: %s",
                     what, text, hint);
  if (plain && *unit != '\0')
    return wend_fail(team, WEND_ERR_SETUP, "%s: \"%s\" has a unit or a stray letter: %s", what,
                     text, hint);
  if (!plain && *unit == '\0' && number != 0)
    return wend_fail(team, WEND_ERR_SETUP, "%s: \"%s\" has no unit: %s", what, text, hint);
  if (*unit == '\0') {
    *value = number;
    return WEND_OK;
  }
  const bool second_number =
      strchr("+-.0123456789", *unit) != NULL && strncmp(unit, "1/", 2) != 0;
  const double si = second_number ? 0 : si_value(names->system, unit, dimension);
  if (si == 0)
    return wend_fail(team, WEND_ERR_SETUP, "%s: \"%s\": unit \"%s\" is unknown: %s", what, text,
                     unit, hint);
  if (si < 0)
    return wend_fail(team, WEND_ERR_SETUP,
                     "%s: \"%s\": unit \"%s\" measures something else: %s", what, text, unit,
                     hint);
  /* The quotient first: a value in the run's own unit keeps its bits. */
  const double converted = number * (si / wend_units_scale(units, dimension));
  if (!isfinite(converted) || (converted == 0 && number != 0))
    return wend_fail(team, WEND_ERR_SETUP, "%s: \"%s\" is out of range in the units of the run",
                     what, text);
  *value = converted;
  return WEND_OK;
}

wend_status wend_units_parse(wend_team *team, const wend_units *units,
                             const wend_dimension dimension, const char *what, const char *text,
                             double *value) {
  wend_unit_names *names = wend_unit_names_create(team);
  const wend_status status =
      names == NULL ? team->status
                    : wend_unit_names_parse(team, names, units, dimension, what, text, value);
  wend_unit_names_destroy(names);
  return status;
}
