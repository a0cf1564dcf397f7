/* SPDX-License-Identifier: GPL-3.0-or-later
 * check_units.c: quantities with units against GSL's constants and sums done by hand in cgs. */
#include "units.h"

#include <check.h>
#include <gsl/gsl_const_mksa.h>
#include <math.h>
#include <string.h>

static wend_team team;
static wend_unit_names *names;

static const double *dimension(wend_quantity quantity) {
  return wend_quantity_find(quantity)->dimension;
}

static double parse(const wend_units *units, wend_quantity quantity, const char *text) {
  double value = NAN;
  team.status = WEND_OK;
  wend_unit_names_parse(&team, names, units, dimension(quantity), "key", text, &value);
  return value;
}

static const wend_units si = {1, 1, 1};

/* 648000/pi astronomical units (IAU 2015 resolution B2) of 149597870700 m (IAU 2012 B2). */
#define PARSEC (648000 / M_PI * 149597870700.0)

typedef struct known {
  wend_quantity quantity;
  const char *text;
  double value;     /* SI */
  double tolerance; /* relative */
} known;

/* 2e-15: a few roundings. GSL 2.7 has the parsec to 5e-11 and an older G and solar mass. */
static const known values[] = {
    {WEND_Q_LENGTH, "1 pc", PARSEC, 2e-15},
    {WEND_Q_LENGTH, "2.5 kpc", 2500 * PARSEC, 2e-15},
    {WEND_Q_LENGTH, "1 Mpc", 1e6 * PARSEC, 2e-15},
    {WEND_Q_LENGTH, "1 pc", GSL_CONST_MKSA_PARSEC, 1e-10},
    {WEND_Q_LENGTH, "-1 parsec", -PARSEC, 2e-15},
    {WEND_Q_LENGTH, "3 cm", 0.03, 2e-15},
    {WEND_Q_LENGTH, "3km", 3000, 2e-15},
    {WEND_Q_TIME, "1 yr", 365.25 * GSL_CONST_MKSA_DAY,
     2e-15}, /* Julian, not UDUNITS' tropical */
    {WEND_Q_TIME, "1 year", 365.25 * GSL_CONST_MKSA_DAY, 2e-15},
    {WEND_Q_TIME, "2 years", 2 * 365.25 * GSL_CONST_MKSA_DAY, 2e-15},
    {WEND_Q_TIME, "10 Myr", 1e7 * 365.25 * GSL_CONST_MKSA_DAY, 2e-15},
    {WEND_Q_TIME, "1 Gyr", 1e9 * 365.25 * GSL_CONST_MKSA_DAY, 2e-15},
    {WEND_Q_TIME, "1 kyr", 1e3 * 365.25 * GSL_CONST_MKSA_DAY, 2e-15},
    {WEND_Q_TIME, "1 hour", GSL_CONST_MKSA_HOUR, 2e-15},
    {WEND_Q_MASS, "1 g", 1e-3, 2e-15},
    /* IAU 2015 G Msun over GSL's older G: 3e-4 apart */
    {WEND_Q_MASS, "1 Msun", 1.3271244e20 / GSL_CONST_MKSA_GRAVITATIONAL_CONSTANT, 3e-4},
    {WEND_Q_DENSITY, "1e-24 g/cm^3", 1e-21, 2e-15},
    {WEND_Q_DENSITY, "1e-24 g cm^-3", 1e-21, 2e-15},
    {WEND_Q_DENSITY, "1e-24 g/cm³", 1e-21, 2e-15},
    {WEND_Q_NUMBER_DENSITY, "0.1 cm^-3", 1e5, 2e-15},
    {WEND_Q_NUMBER_DENSITY, "0.1 1/cm^3", 1e5, 2e-15},
    {WEND_Q_DIFFUSIVITY, "3e28 cm^2/s", 3e24, 2e-15},
    {WEND_Q_SPEED, "100 km/s", 1e5, 2e-15},
    {WEND_Q_ENERGY, "1e51 erg", 1e44, 2e-15},
    {WEND_Q_ENERGY, "1 J", 1, 0},
    {WEND_Q_ENERGY, "1 GeV", 1e9 * GSL_CONST_MKSA_ELECTRON_VOLT,
     1e-6}, /* UDUNITS: CODATA 1986 */
    {WEND_Q_ENERGY_DENSITY, "1 erg/cm^3", 0.1, 2e-15},
    {WEND_Q_SPECIFIC_ENERGY, "1 erg/g", 1e-4, 2e-15},
    {WEND_Q_POWER, "1e40 erg/s", 1e33, 2e-15},
    {WEND_Q_NUMBER, "0.5", 0.5, 0},
    {WEND_Q_NUMBER, "1e-300", 1e-300, 0},
};

START_TEST(texts_have_their_value) {
  const known *k = &values[_i];
  const double value = parse(&si, k->quantity, k->text);
  ck_assert_msg(team.status == WEND_OK, "%s: %s", k->text, team.text);
  ck_assert_msg(fabs(value - k->value) <= k->tolerance * fabs(k->value),
                "%s is %.17g, not %.17g", k->text, value, k->value);
}
END_TEST

/* Tesla in, run units out: with SI units the run unit of B is 10^-3.5 T. */
START_TEST(gauss_is_no_prefix_and_no_galileo) {
  static const struct {
    const char *text;
    double tesla;
  } field[] = {{"1 G", 1e-4},    {"5 uG", 5e-10}, {"5 μG", 5e-10},
               {"5 µG", 5e-10},  {"1 nG", 1e-13}, {"1 mG", 1e-7},
               {"1 kG", 0.1},    {"1 MG", 100},   {"1 gauss", GSL_CONST_MKSA_GAUSS},
               {"2 tesla", 2.0}, {"2 T", 2.0},    {"3 nT", 3e-9}};
  for (size_t k = 0; k < sizeof field / sizeof field[0]; k++) {
    const double value = parse(&si, WEND_Q_FIELD, field[k].text);
    ck_assert_msg(team.status == WEND_OK, "%s: %s", field[k].text, team.text);
    /* a few roundings of the root */
    ck_assert_double_eq_tol(value * sqrt(1e-7) / field[k].tesla, 1, 1e-15 * 8);
  }
}
END_TEST

/* B is Gaussian: B^2 / (8 pi) is an energy density of the run, and v_A = B / sqrt(4 pi rho). */
START_TEST(alfven_speed_in_run_units_is_that_in_cgs) {
  static const wend_units choices[] = {
      {1, 1, 1}, {3.1e19, 3.2e13, 2e30}, {0.01, 1, 0.001}, {7, 11, 13}};
  const wend_units *units = &choices[_i];
  const double b = parse(units, WEND_Q_FIELD, "5 uG"),
               rho = parse(units, WEND_Q_DENSITY, "2e-24 g/cm^3");
  const double speed = b / sqrt(4 * M_PI * rho) * units->length / units->time; /* m/s */
  const double cgs = 5e-6 / sqrt(4 * M_PI * 2e-24);                            /* cm/s */
  ck_assert_double_eq_tol(speed / (0.01 * cgs), 1, 1e-14);
  const double pressure =
      b * b / (8 * M_PI) * wend_units_scale(units, dimension(WEND_Q_ENERGY_DENSITY));
  ck_assert_double_eq_tol(pressure / (0.1 * 25e-12 / (8 * M_PI)), 1, 1e-14);
}
END_TEST

/* A value in the very units of the run keeps its bits; so do output files that are read again.
 */
START_TEST(own_units_convert_exactly) {
  const wend_units run = wend_units_default();
  ck_assert_double_eq(parse(&run, WEND_Q_LENGTH, "0.1 kpc"), 0.1);
  ck_assert_double_eq(parse(&run, WEND_Q_TIME, "0.3 Myr"), 0.3);
  ck_assert_double_eq(parse(&run, WEND_Q_MASS, "0.7 Msun"), 0.7);
  ck_assert_double_eq(wend_units_erg(&si), 1e7);
  for (int q = 0; q < WEND_QUANTITIES; q++)
    ck_assert(wend_units_scale(&si, wend_quantity_find((wend_quantity)q)->dimension) > 0);
}
END_TEST

START_TEST(examples_are_understood) {
  for (int q = 0; q < WEND_QUANTITIES; q++) {
    parse(&si, (wend_quantity)q, wend_quantity_find((wend_quantity)q)->example);
    ck_assert_msg(team.status == WEND_OK, "%s", team.text);
  }
}
END_TEST

static const struct {
  wend_quantity quantity;
  const char *text, *word;
} wrong[] = {
    {WEND_Q_LENGTH, "3", "has no unit"},
    {WEND_Q_TIME, "1e3 ", "has no unit"},
    {WEND_Q_LENGTH, "", "finite number"},
    {WEND_Q_LENGTH, "kpc", "finite number"},
    {WEND_Q_LENGTH, "nan kpc", "finite number"},
    {WEND_Q_LENGTH, "inf kpc", "finite number"},
    {WEND_Q_LENGTH, "1e400 kpc", "finite number"},
    {WEND_Q_LENGTH, "1 bogus", "\"bogus\" is unknown"},
    {WEND_Q_LENGTH, "1 kpc kpc", "something else"},
    {WEND_Q_LENGTH, "1 Myr", "something else"},
    {WEND_Q_LENGTH, "1 2 kpc", "is unknown"},
    {WEND_Q_LENGTH, "1 -kpc", "is unknown"},
    {WEND_Q_LENGTH, "1,5 kpc", "unknown"},
    {WEND_Q_TIME, "5 seconds since 1970-01-01", "something else"},
    {WEND_Q_FIELD, "1 Gal", "something else"},
    {WEND_Q_FIELD, "1 g", "something else"},
    {WEND_Q_DIFFUSIVITY, "3e28", "3e28 cm^2/s"},
    {WEND_Q_DIFFUSIVITY, "3e28 cm^2", "3e28 cm^2/s"},
    {WEND_Q_POWER, "1 lg(re 1 mW)", "something else"},
    {WEND_Q_NUMBER, "1 kpc", "stray"},
    {WEND_Q_NUMBER, "0.5x", "stray"},
};

START_TEST(wrong_texts_are_explained) {
  double value = 42;
  team.status = WEND_OK;
  const wend_status status = wend_unit_names_parse(
      &team, names, &si, dimension(wrong[_i].quantity), "the.key", wrong[_i].text, &value);
  ck_assert_msg(status == WEND_ERR_SETUP, "\"%s\" was taken", wrong[_i].text);
  ck_assert_double_eq(value, 42);
  ck_assert_msg(strstr(team.text, "the.key") != NULL &&
                    strstr(team.text, wrong[_i].word) != NULL &&
                    strstr(team.text, wend_quantity_find(wrong[_i].quantity)->example) != NULL,
                "%s", team.text);
}
END_TEST

START_TEST(out_of_range_in_run_units) {
  const wend_units tiny = {1e-200, 1, 1};
  ck_assert(isnan(parse(&tiny, WEND_Q_VOLUME, "1 m^3")));
  ck_assert_ptr_nonnull(strstr(team.text, "out of range"));
}
END_TEST

START_TEST(zero_needs_no_unit) {
  for (int q = 0; q < WEND_QUANTITIES; q++)
    ck_assert_double_eq(parse(&si, (wend_quantity)q, "0"), 0);
  double value = 1;
  ck_assert_int_eq(wend_units_parse(&team, &si, dimension(WEND_Q_LENGTH), "key", "2 m", &value),
                   WEND_OK);
  ck_assert_double_eq(value, 2);
}
END_TEST

int main(int count, char **arguments) {
  MPI_Init(&count, &arguments);
  wend_team_init(&team, MPI_COMM_WORLD);
  names = wend_unit_names_create(&team);
  Suite *suite = suite_create("units");
  TCase *tc = tcase_create("units");
  tcase_add_loop_test(tc, texts_have_their_value, 0, (int)(sizeof values / sizeof values[0]));
  tcase_add_test(tc, gauss_is_no_prefix_and_no_galileo);
  tcase_add_loop_test(tc, alfven_speed_in_run_units_is_that_in_cgs, 0, 4);
  tcase_add_test(tc, own_units_convert_exactly);
  tcase_add_test(tc, examples_are_understood);
  tcase_add_loop_test(tc, wrong_texts_are_explained, 0, (int)(sizeof wrong / sizeof wrong[0]));
  tcase_add_test(tc, out_of_range_in_run_units);
  tcase_add_test(tc, zero_needs_no_unit);
  suite_add_tcase(suite, tc);
  SRunner *runner = srunner_create(suite);
  srunner_set_fork_status(runner, CK_NOFORK);
  srunner_run_all(runner, CK_NORMAL);
  const int failed = srunner_ntests_failed(runner);
  srunner_free(runner);
  wend_unit_names_destroy(names);
  wend_team_reset(&team);
  MPI_Finalize();
  return failed != 0;
}
