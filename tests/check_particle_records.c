/* SPDX-License-Identifier: GPL-3.0-or-later
 * check_particle_records.c: whatever is wrong in a particle file is named; CR energy is read in
 * all its forms. */
#include "particle_set.h"
#include "scratch.h"
#include "spread.h"

#include <check.h>
#include <math.h>
#include <stdio.h>
#include <string.h>

static wend_team team;

/* ---- files that were tampered with
 * ------------------------------------------------------------ */

#define GAS SET_GAS

/* Stores a value at row 57 of a record. */
static void tamper_row(hid_t file, const char *record, double value) {
  const hsize_t at = 57, one = 1;
  const hid_t set = H5Dopen2(file, record, H5P_DEFAULT), space = H5Dget_space(set);
  const hid_t memory = H5Screate_simple(1, &one, NULL);
  H5Sselect_hyperslab(space, H5S_SELECT_SET, &at, NULL, &one, NULL);
  H5Dwrite(set, H5T_NATIVE_DOUBLE, memory, space, H5P_DEFAULT, &value);
  H5Sclose(memory);
  H5Sclose(space);
  H5Dclose(set);
}

static void tamper_length(hid_t file, const char *record, hsize_t n, int rank, hid_t type) {
  const hsize_t extent[2] = {n, 1};
  const double unit = 1, dimension[7] = {0, 1};
  H5Ldelete(file, record, H5P_DEFAULT);
  const hid_t space = H5Screate_simple(rank, extent, NULL);
  H5Dclose(H5Dcreate2(file, record, type, space, H5P_DEFAULT, H5P_DEFAULT, H5P_DEFAULT));
  H5Sclose(space);
  tamper_numbers(file, record, "unitSI", 1, &unit);
  tamper_numbers(file, record, "unitDimension", 7, dimension);
}

static void major_two(hid_t f) { tamper_text(f, "/", "openPMD", "2.0.0"); }
static void no_version(hid_t f) { H5Adelete(f, "openPMD"); }
static void other_base(hid_t f) { tamper_text(f, "/", "basePath", "/steps/%T/"); }
static void no_steps(hid_t f) { H5Ldelete(f, "/data/40", H5P_DEFAULT); }
static void no_data(hid_t f) { H5Ldelete(f, "/data", H5P_DEFAULT); }
static void no_gas(hid_t f) {
  H5Lmove(f, "/data/40/particles/gas", f, "/data/40/particles/stars", H5P_DEFAULT, H5P_DEFAULT);
}
static void no_position(hid_t f) { H5Ldelete(f, GAS "position", H5P_DEFAULT); }
static void no_y(hid_t f) { H5Ldelete(f, GAS "position/y", H5P_DEFAULT); }
static void no_offset(hid_t f) { H5Ldelete(f, GAS "positionOffset", H5P_DEFAULT); }
static void no_offset_y(hid_t f) { H5Ldelete(f, GAS "positionOffset/y", H5P_DEFAULT); }
static void no_bz(hid_t f) { H5Ldelete(f, GAS "magneticField/z", H5P_DEFAULT); }
static void no_unit(hid_t f) {
  H5Adelete_by_name(f, GAS "magneticField/y", "unitSI", H5P_DEFAULT);
}
static void no_dimension(hid_t f) {
  H5Adelete_by_name(f, GAS "mass", "unitDimension", H5P_DEFAULT);
}
static void wrong_dimension(hid_t f) {
  const double gauss[7] = {-0.5, 0.5, -1};
  tamper_numbers(f, GAS "magneticField", "unitDimension", 7, gauss);
}
static void short_dimension(hid_t f) {
  const double three[3] = {0, 1, 0};
  tamper_numbers(f, GAS "mass", "unitDimension", 3, three);
}
static void other_length(hid_t f) {
  tamper_length(f, GAS "mass", SET_ROWS - 1, 1, H5T_IEEE_F64LE);
}
static void two_axes(hid_t f) { tamper_length(f, GAS "mass", SET_ROWS, 2, H5T_IEEE_F64LE); }
static void text_record(hid_t f) { tamper_length(f, GAS "mass", SET_ROWS, 1, H5T_C_S1); }
static void float_ids(hid_t f) { tamper_length(f, GAS "id", SET_ROWS, 1, H5T_IEEE_F64LE); }
static void not_constant(hid_t f) {
  H5Adelete_by_name(f, GAS "positionOffset/x", "value", H5P_DEFAULT);
}
static void no_time(hid_t f) { H5Adelete_by_name(f, "/data/40", "time", H5P_DEFAULT); }
static void nan_time(hid_t f) {
  const double nan = NAN;
  tamper_numbers(f, "/data/40", "dt", 1, &nan);
}
static void flat_box(hid_t f) {
  const double upper[3] = {1, -1, 5};
  tamper_numbers(f, "/wend/domain", "upper", 3, upper);
}
static void odd_boundary(hid_t f) { tamper_text(f, "/wend/domain", "boundary_x", "round"); }
static void nan_x(hid_t f) { tamper_row(f, GAS "position/x", NAN); }
static void infinite_b(hid_t f) { tamper_row(f, GAS "magneticField/z", INFINITY); }
static void no_mass(hid_t f) { tamper_row(f, GAS "mass", 0); }
static void negative_density(hid_t f) { tamper_row(f, GAS "massDensity", -1); }
static void negative_support(hid_t f) { tamper_row(f, GAS "supportRadius", -1); }
static void no_volume(hid_t f) { tamper_row(f, GAS "volume", 0); }
static void negative_energy(hid_t f) { tamper_row(f, GAS "cosmicRayEnergy", -1e-30); }
static void negative_kappa(hid_t f) { tamper_row(f, GAS "parallelDiffusivity", -1); }
static void ionised_twice(hid_t f) { tamper_row(f, GAS "ionisedFraction", 1.5); }

static const struct {
  void (*edit)(hid_t file);
  wend_status status;
  const char *word[2];
} tampered[] = {
    {major_two, WEND_ERR_FILE, {"follows openPMD 2.0.0"}},
    {no_version, WEND_ERR_FILE, {"attribute openPMD is missing"}},
    {other_base, WEND_ERR_FILE, {"basePath is not /data/%T/"}},
    {no_steps, WEND_ERR_FILE, {"no iteration"}},
    {no_data, WEND_ERR_FILE, {"no iteration"}},
    {no_gas, WEND_ERR_FILE, {"data/40/particles/gas is missing"}},
    {no_position, WEND_ERR_FILE, {"gas/position/x is missing"}},
    {no_y, WEND_ERR_FILE, {"gas/position/y is missing"}},
    {no_offset, WEND_ERR_FILE, {"gas/positionOffset/x is missing"}},
    {no_offset_y, WEND_ERR_FILE, {"gas/positionOffset/y is missing"}},
    {no_bz, WEND_ERR_FILE, {"gas/magneticField/z is missing"}},
    {no_unit, WEND_ERR_FILE, {"gas/magneticField/y has no unitSI"}},
    {no_dimension, WEND_ERR_FILE, {"gas/mass has no unitDimension"}},
    {wrong_dimension, WEND_ERR_FILE, {"gas/magneticField has another unitDimension"}},
    {short_dimension, WEND_ERR_FILE, {"gas/mass has no unitDimension of 7"}},
    {other_length, WEND_ERR_FILE, {"gas/mass has another length"}},
    {two_axes, WEND_ERR_FILE, {"gas/mass has more than one dimension"}},
    {text_record, WEND_ERR_FILE, {"gas/mass holds no numbers"}},
    {float_ids, WEND_ERR_FILE, {"gas/id must be a data set of whole numbers"}},
    {not_constant, WEND_ERR_FILE, {"gas/positionOffset/x is a group without"}},
    {no_time, WEND_ERR_FILE, {"/data/40 lacks a finite time"}},
    {nan_time, WEND_ERR_FILE, {"/data/40 lacks a finite time"}},
    {flat_box, WEND_ERR_FILE, {"/wend/domain does not describe a box of 3 axes"}},
    {odd_boundary, WEND_ERR_FILE, {"/wend/domain"}},
    {nan_x, WEND_ERR_PARTICLES, {"gas/position/x of particle id", "is nan: it must be finite"}},
    {infinite_b, WEND_ERR_PARTICLES, {"gas/magneticField/z of particle id", "is inf"}},
    {no_mass, WEND_ERR_PARTICLES, {"gas/mass of particle id", "must be greater than 0"}},
    {negative_density,
     WEND_ERR_PARTICLES,
     {"gas/massDensity of particle id", "greater than 0"}},
    {negative_support,
     WEND_ERR_PARTICLES,
     {"gas/supportRadius of particle id", "greater than 0"}},
    {no_volume, WEND_ERR_PARTICLES, {"gas/volume of particle id", "greater than 0"}},
    {negative_energy,
     WEND_ERR_PARTICLES,
     {"gas/cosmicRayEnergy of particle id", "0 or greater"}},
    {negative_kappa,
     WEND_ERR_PARTICLES,
     {"gas/parallelDiffusivity of particle id", "0 or greater"}},
    {ionised_twice,
     WEND_ERR_PARTICLES,
     {"gas/ionisedFraction of particle id", "between 0 and 1"}},
};

START_TEST(what_is_wrong_is_named) {
  wend_particles p;
  wend_file_facts facts;
  bool density;
  char id[64];
  ck_assert_int_eq(set_write(&team, "tampered.h5", 3, SET_ALL), WEND_OK);
  set_tamper("tampered.h5", tampered[_i].edit);
  const wend_status status = set_read(&team, "tampered.h5", 0, &p, &facts, &density);
  ck_assert_msg(status == tampered[_i].status, "status %d, not %d, for \"%s\": %s", status,
                tampered[_i].status, tampered[_i].word[0], team.text);
  ck_assert(spread_same_text(team.text));
  ck_assert_ptr_nonnull(strstr(team.text, "tampered.h5"));
  for (int k = 0; k < 2 && tampered[_i].word[k] != NULL; k++)
    ck_assert_msg(strstr(team.text, tampered[_i].word[k]) != NULL, "no \"%s\" in: %s",
                  tampered[_i].word[k], team.text);
  snprintf(id, sizeof id, " id %llu ", (unsigned long long)(set_id(57)));
  ck_assert_msg(status != WEND_ERR_PARTICLES || strstr(team.text, id) != NULL, "%s", team.text);
  ck_assert_ptr_null(p.id);
}
END_TEST

/* ---- forms of CR energy
 * ----------------------------------------------------------------------- */

static void rename_energy(hid_t f, const char *name, double length, double mass) {
  const double dimension[7] = {length, mass, -2};
  char path[128];
  snprintf(path, sizeof path, GAS "%s", name);
  H5Lmove(f, GAS "cosmicRayEnergy", f, path, H5P_DEFAULT, H5P_DEFAULT);
  tamper_numbers(f, path, "unitDimension", 7, dimension);
}

static void to_density(hid_t f) { rename_energy(f, "cosmicRayEnergyDensity", -1, 1); }
static void to_specific(hid_t f) { rename_energy(f, "cosmicRaySpecificEnergy", 2, 0); }

START_TEST(energy_in_three_forms) {
  static const struct {
    void (*edit)(hid_t file);
    uint64_t without; /* columns the file lacks */
    bool density;     /* no volume known */
    wend_status status;
  } form[] = {{to_density, 0, false, WEND_OK},
              {to_density, 1 << WEND_VOLUME, false, WEND_OK},
              {to_density, 1 << WEND_VOLUME | 1 << WEND_MASS, true, WEND_OK},
              {to_density, 1 << WEND_VOLUME | 1 << WEND_DENSITY, true, WEND_OK},
              {to_specific, 0, false, WEND_OK},
              {to_specific, 1 << WEND_MASS, false, WEND_ERR_FILE}};
  const uint64_t mask = SET_ALL & ~form[_i].without;
  wend_particles p;
  wend_file_facts facts;
  bool density;
  set_write(&team, "energy.h5", 3, mask);
  set_tamper("energy.h5", form[_i].edit);
  const wend_status status =
      set_read(&team, "energy.h5", 1 << WEND_ENERGY, &p, &facts, &density);
  ck_assert_msg(status == form[_i].status, "%s", team.text);
  if (status != WEND_OK) {
    ck_assert_ptr_nonnull(strstr(team.text, "cosmicRaySpecificEnergy needs the record mass"));
    return;
  }
  ck_assert(density == form[_i].density);
  bool good = true;
  const wend_quantity quantity =
      form[_i].edit == to_density ? WEND_Q_ENERGY_DENSITY : WEND_Q_SPECIFIC_ENERGY;
  /* the stored unitSI is that of an energy */
  const double stored =
      wend_units_scale(&set_units, wend_quantity_find(WEND_Q_ENERGY)->dimension) /
      wend_units_scale(&set_units, wend_quantity_find(quantity)->dimension);
  for (int32_t i = 0; i < p.n; i++) {
    const int64_t row = set_first_row(&team) + i;
    const double mass = set_value(3, row, WEND_MASS);
    const double factor = density                             ? 1
                          : quantity != WEND_Q_ENERGY_DENSITY ? mass
                          : form[_i].without == 0             ? set_value(3, row, WEND_VOLUME)
                                                  : mass / set_value(3, row, WEND_DENSITY);
    const double expected = set_value(3, row, WEND_ENERGY) * stored * factor;
    good =
        good && fabs(p.column[WEND_ENERGY][i] - expected) <= 4e-16 * expected; /* roundings */
  }
  ck_assert(spread_everywhere(good));
  wend_particles_reset(&p);
}
END_TEST

int main(int count, char **arguments) {
  MPI_Init(&count, &arguments);
  wend_team_init(&team, MPI_COMM_WORLD);
  team.allocate = spread_allocate;
  scratch_begin();
  Suite *suite = suite_create("particle_records");
  TCase *tc = tcase_create("particle_records");
  tcase_add_loop_test(tc, what_is_wrong_is_named, 0,
                      (int)(sizeof tampered / sizeof tampered[0]));
  tcase_add_loop_test(tc, energy_in_three_forms, 0, 6);
  suite_add_tcase(suite, tc);
  SRunner *runner = srunner_create(suite);
  srunner_set_fork_status(runner, CK_NOFORK);
  srunner_run_all(runner, team.rank == 0 ? CK_NORMAL : CK_SILENT);
  const int failed = srunner_ntests_failed(runner);
  srunner_free(runner);
  scratch_end();
  wend_team_reset(&team);
  MPI_Finalize();
  return failed != 0;
}
