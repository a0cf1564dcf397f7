/* SPDX-License-Identifier: GPL-3.0-or-later
 * check_particle_file.c: particle files come back to the bit, are the same on any number of
 * ranks, and whatever is wrong in one is named. */
#include "box.h"
#include "hilbert.h"
#include "particle_file.h"
#include "scratch.h"
#include "spread.h"

#include <check.h>
#include <hdf5.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum { TOTAL = 101 };

static wend_team team;
static const wend_units units = {3e19, 3e13, 2e30};
static const uint64_t everything = ((uint64_t)1 << WEND_COLUMNS) - 1;

static const double low[3] = {0, -1, 2}, high[3] = {1, 1, 5};

static wend_domain box(int dim) {
  static const wend_boundary edge[3] = {WEND_BOUNDARY_PERIODIC, WEND_BOUNDARY_CLOSED,
                                        WEND_BOUNDARY_OPEN};
  return wend_box_make(dim, low, high, edge, 0.25);
}

/* A number in (0, 1) that fills its digits, and differs from column to column. */
static double value_of(int dim, int64_t i, int c) {
  const double share = fmod(0.5 + (double)(i + 1) * 0.6180339887498949 * (c + 1), 1.0);
  if (c <= WEND_Z) return c < dim ? low[c] + (high[c] - low[c]) * share : 0;
  return c == WEND_BX && i == 3 ? -0.0 : share * 0.9 + 0.05;
}

/* This rank's part of the whole set; the second rank has none of it. Sorted by key if asked. */
static wend_particles make(const wend_team *t, int dim, uint64_t mask) {
  const int takers = t->size > 1 ? t->size - 1 : 1, place = t->rank > 1 ? t->rank - 1 : t->rank;
  const bool takes = t->rank != 1;
  const int64_t first = TOTAL * place / takers,
                end = takes ? TOTAL * (place + 1) / takers : first;
  wend_particles p;
  wend_particles_init(&team, &p, (int32_t)(end - first), mask);
  for (int32_t i = 0; i < p.n; i++) {
    p.id[i] = UINT64_MAX - (uint64_t)(first + i) * 1000003;
    for (int c = 0; c < WEND_COLUMNS; c++)
      if (p.column[c] != NULL) p.column[c][i] = value_of(dim, first + i, c);
  }
  return p;
}

static wend_file_facts facts_of(int dim) {
  return (wend_file_facts){.iteration = 40,
                           .time = 0.1,
                           .dt = 1 / 3.0,
                           .domain_given = true,
                           .domain = box(dim),
                           .setup = "particles: a\n"};
}

static wend_status write_set(const char *name, int dim, uint64_t mask) {
  wend_particles p = make(&team, dim, mask);
  const wend_file_facts facts = facts_of(dim);
  const wend_status status =
      wend_particle_file_write(&team, scratch_path(name), &units, &p, &facts);
  wend_particles_reset(&p);
  return status;
}

static wend_status read_set(const char *name, uint64_t needed, wend_particles *p,
                            wend_file_facts *facts, bool *density) {
  return wend_particle_file_read(&team, scratch_path(name), &units, needed, p, facts, density);
}

/* Rows of a rank that reads: equal blocks. */
static int64_t first_row(void) {
  const int64_t rest = TOTAL % team.size;
  return team.rank * (TOTAL / team.size) + (team.rank < rest ? team.rank : rest);
}

static bool same_values(const wend_particles *p, int dim, uint64_t mask) {
  bool same = wend_particles_mask(p) == mask;
  for (int32_t i = 0; i < p->n; i++) {
    same = same && p->id[i] == UINT64_MAX - (uint64_t)(first_row() + i) * 1000003;
    for (int c = 0; c < WEND_COLUMNS; c++) {
      const double expected = value_of(dim, first_row() + i, c);
      if (p->column[c] == NULL) continue;
      same = same && memcmp(&p->column[c][i], &expected, sizeof expected) == 0;
    }
  }
  int64_t n = p->n;
  wend_team_count(&team, 1, &n);
  return spread_everywhere(same && n == TOTAL);
}

static bool same_domain(const wend_domain *a, const wend_domain *b) {
  bool same = a->dim == b->dim && a->thickness == b->thickness;
  for (int k = 0; k < 3; k++)
    same = same && a->lo[k] == b->lo[k] && a->hi[k] == b->hi[k] &&
           a->period[k] == b->period[k] && a->half[k] == b->half[k] && a->open[k] == b->open[k];
  return same;
}

START_TEST(all_columns_come_back_to_the_bit) {
  wend_particles p;
  wend_file_facts facts;
  bool density = true;
  const int dim = _i;
  ck_assert_msg(write_set("run_0040.h5", dim, everything) == WEND_OK, "%s", team.text);
  ck_assert_msg(read_set("run_0040.h5", everything, &p, &facts, &density) == WEND_OK, "%s",
                team.text);
  ck_assert(same_values(&p, dim, everything));
  const wend_domain domain = box(dim);
  ck_assert(facts.domain_given && same_domain(&facts.domain, &domain));
  ck_assert(facts.iteration == 40 && facts.time == 0.1 && facts.dt == 1 / 3.0 && !density);
  wend_particles_reset(&p);
}
END_TEST

START_TEST(absent_columns_stay_absent) {
  const uint64_t mask = 7 << WEND_X | 7 << WEND_BX | 1 << WEND_SUPPORT;
  wend_particles p;
  wend_file_facts facts;
  bool density;
  ck_assert_int_eq(write_set("few.h5", 3, mask), WEND_OK);
  ck_assert_int_eq(read_set("few.h5", mask, &p, &facts, &density), WEND_OK);
  ck_assert(same_values(&p, 3, mask));
  wend_particles_reset(&p);
  ck_assert_int_eq(read_set("few.h5", mask | 1 << WEND_DENSITY, &p, &facts, &density),
                   WEND_ERR_FILE);
  ck_assert_ptr_nonnull(strstr(team.text, "massDensity is missing"));
  ck_assert_int_eq(read_set("few.h5", mask | 1 << WEND_ENERGY, &p, &facts, &density),
                   WEND_ERR_FILE);
  ck_assert_ptr_nonnull(strstr(team.text, "cosmicRayEnergyDensity"));
  ck_assert(p.id == NULL && p.n == 0);
}
END_TEST

/* ---- the same bytes on any number of ranks
 * ---------------------------------------------------- */

/* Compares one data set of two files, byte for byte in the type they are stored in. */
static bool same_data(hid_t a, hid_t b) {
  const hid_t type = H5Dget_type(a), other = H5Dget_type(b), space = H5Dget_space(a);
  bool same = H5Tequal(type, other) > 0 && H5Dget_storage_size(a) == H5Dget_storage_size(b);
  const size_t size = (size_t)H5Dget_storage_size(a) + 1;
  char *x = calloc(size, 1), *y = calloc(size, 1);
  same = same && H5Dread(a, type, H5S_ALL, H5S_ALL, H5P_DEFAULT, x) >= 0 &&
         H5Dread(b, type, H5S_ALL, H5S_ALL, H5P_DEFAULT, y) >= 0 && memcmp(x, y, size) == 0;
  free(x);
  free(y);
  H5Sclose(space);
  H5Tclose(type);
  H5Tclose(other);
  return same;
}

typedef struct comparison {
  hid_t other;
  int sets, unlike;
} comparison;

static herr_t compare_link(hid_t group, const char *name, const H5L_info_t *info, void *data) {
  (void)info;
  comparison *c = data;
  const hid_t a = H5Oopen(group, name, H5P_DEFAULT), b = H5Oopen(c->other, name, H5P_DEFAULT);
  if (b < 0) {
    c->unlike++;
  } else if (H5Iget_type(a) == H5I_DATASET) {
    c->sets++;
    c->unlike += !same_data(a, b);
  }
  H5Oclose(a);
  if (b >= 0) H5Oclose(b);
  return 0;
}

static comparison compare_files(const char *name, const char *other) {
  const hid_t a = H5Fopen(scratch_path(name), H5F_ACC_RDONLY, H5P_DEFAULT);
  comparison c = {.other = H5Fopen(scratch_path(other), H5F_ACC_RDONLY, H5P_DEFAULT)};
  H5Lvisit(a, H5_INDEX_NAME, H5_ITER_INC, compare_link, &c);
  H5Fclose(a);
  H5Fclose(c.other);
  return c;
}

static void sort_by_key(wend_particles *p, const wend_domain *domain) {
  double(*place)[4] = calloc((size_t)p->n, sizeof *place);
  for (int32_t i = 0; i < p->n; i++)
    for (int a = 0; a < domain->dim; a++) place[i][a] = p->column[WEND_X + a][i];
  wend_hilbert_keys(domain, p->n, place, p->key);
  for (int32_t i = 1; i < p->n; i++) /* insertion sort: the set is small */
    for (int32_t k = i; k > 0 && p->key[k - 1] > p->key[k]; k--)
      for (int c = -2; c < WEND_COLUMNS; c++) {
        uint64_t *x = c == -2 ? p->key : c == -1 ? p->id : (uint64_t *)(void *)p->column[c];
        const uint64_t keep = x[k];
        x[k] = x[k - 1];
        x[k - 1] = keep;
      }
  free(place);
}

/* The part of the whole sorted set that this rank owns, dealt out unevenly. */
static wend_particles own_part(const wend_particles *all) {
  const int64_t half = all->n / 2,
                first = team.rank == 0
                            ? 0
                            : half + (all->n - half) * (team.rank - 1) / (team.size - 1);
  const int64_t end = team.size == 1   ? all->n
                      : team.rank == 0 ? half
                                       : half + (all->n - half) * team.rank / (team.size - 1);
  wend_particles p;
  wend_particles_init(&team, &p, (int32_t)(end - first), wend_particles_mask(all));
  for (int32_t i = 0; i < p.n; i++) {
    p.id[i] = all->id[first + i];
    p.key[i] = all->key[first + i];
    for (int c = 0; c < WEND_COLUMNS; c++) p.column[c][i] = all->column[c][first + i];
  }
  return p;
}

START_TEST(data_do_not_depend_on_the_number_of_ranks) {
  const int dim = _i;
  const wend_file_facts facts = facts_of(dim);
  wend_team alone;
  wend_team_init(&alone, MPI_COMM_SELF);
  wend_particles all = make(&alone, dim, everything);
  sort_by_key(&all, &facts.domain);
  wend_particles mine = own_part(&all);
  const wend_status status =
      wend_particle_file_write(&team, scratch_path("many.h5"), &units, &mine, &facts);
  ck_assert_msg(status == WEND_OK, "%s", team.text);
  comparison c = {.sets = 0};
  bool good = true;
  if (team.rank == 0) {
    good = wend_particle_file_write(&alone, scratch_path("one.h5"), &units, &all, &facts) ==
           WEND_OK;
    c = compare_files("many.h5", "one.h5");
    /* 14 records, of which 3 are vectors; ids; 2 lists and 2 vectors of patches; the setup */
    good = good && c.unlike == 0 && c.sets == (dim == 3 ? 20 + 1 + 8 + 1 : 19 + 1 + 6 + 1);
  }
  ck_assert_msg(spread_everywhere(good), "%d data sets, %d unlike", c.sets, c.unlike);
  wend_particles_reset(&mine);
  wend_particles_reset(&all);
  wend_team_reset(&alone);
}
END_TEST

/* ---- files that were tampered with
 * ------------------------------------------------------------ */

#define GAS "/data/40/particles/gas/"

static void set_text(hid_t file, const char *object, const char *name, const char *text) {
  const hid_t type = H5Tcopy(H5T_C_S1), space = H5Screate(H5S_SCALAR);
  H5Tset_size(type, strlen(text));
  H5Adelete_by_name(file, object, name, H5P_DEFAULT);
  const hid_t a =
      H5Acreate_by_name(file, object, name, type, space, H5P_DEFAULT, H5P_DEFAULT, H5P_DEFAULT);
  H5Awrite(a, type, text);
  H5Aclose(a);
  H5Sclose(space);
  H5Tclose(type);
}

static void set_numbers(hid_t file, const char *object, const char *name, hsize_t n,
                        const double *x) {
  const hid_t space = H5Screate_simple(1, &n, NULL);
  H5Adelete_by_name(file, object, name, H5P_DEFAULT);
  const hid_t a = H5Acreate_by_name(file, object, name, H5T_NATIVE_DOUBLE, space, H5P_DEFAULT,
                                    H5P_DEFAULT, H5P_DEFAULT);
  H5Awrite(a, H5T_NATIVE_DOUBLE, x);
  H5Aclose(a);
  H5Sclose(space);
}

/* Stores a value at row 57 of a record. */
static void set_row(hid_t file, const char *record, double value) {
  const hsize_t at = 57, one = 1;
  const hid_t set = H5Dopen2(file, record, H5P_DEFAULT), space = H5Dget_space(set);
  const hid_t memory = H5Screate_simple(1, &one, NULL);
  H5Sselect_hyperslab(space, H5S_SELECT_SET, &at, NULL, &one, NULL);
  H5Dwrite(set, H5T_NATIVE_DOUBLE, memory, space, H5P_DEFAULT, &value);
  H5Sclose(memory);
  H5Sclose(space);
  H5Dclose(set);
}

static void set_length(hid_t file, const char *record, hsize_t n, int rank, hid_t type) {
  const hsize_t extent[2] = {n, 1};
  const double unit = 1, dimension[7] = {0, 1};
  H5Ldelete(file, record, H5P_DEFAULT);
  const hid_t space = H5Screate_simple(rank, extent, NULL);
  H5Dclose(H5Dcreate2(file, record, type, space, H5P_DEFAULT, H5P_DEFAULT, H5P_DEFAULT));
  H5Sclose(space);
  set_numbers(file, record, "unitSI", 1, &unit);
  set_numbers(file, record, "unitDimension", 7, dimension);
}

static void major_two(hid_t f) { set_text(f, "/", "openPMD", "2.0.0"); }
static void no_version(hid_t f) { H5Adelete(f, "openPMD"); }
static void other_base(hid_t f) { set_text(f, "/", "basePath", "/steps/%T/"); }
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
  set_numbers(f, GAS "magneticField", "unitDimension", 7, gauss);
}
static void short_dimension(hid_t f) {
  const double three[3] = {0, 1, 0};
  set_numbers(f, GAS "mass", "unitDimension", 3, three);
}
static void other_length(hid_t f) { set_length(f, GAS "mass", TOTAL - 1, 1, H5T_IEEE_F64LE); }
static void two_axes(hid_t f) { set_length(f, GAS "mass", TOTAL, 2, H5T_IEEE_F64LE); }
static void text_record(hid_t f) { set_length(f, GAS "mass", TOTAL, 1, H5T_C_S1); }
static void float_ids(hid_t f) { set_length(f, GAS "id", TOTAL, 1, H5T_IEEE_F64LE); }
static void not_constant(hid_t f) {
  H5Adelete_by_name(f, GAS "positionOffset/x", "value", H5P_DEFAULT);
}
static void no_time(hid_t f) { H5Adelete_by_name(f, "/data/40", "time", H5P_DEFAULT); }
static void nan_time(hid_t f) {
  const double nan = NAN;
  set_numbers(f, "/data/40", "dt", 1, &nan);
}
static void flat_box(hid_t f) {
  const double upper[3] = {1, -1, 5};
  set_numbers(f, "/wend/domain", "upper", 3, upper);
}
static void odd_boundary(hid_t f) { set_text(f, "/wend/domain", "boundary_x", "round"); }
static void nan_x(hid_t f) { set_row(f, GAS "position/x", NAN); }
static void infinite_b(hid_t f) { set_row(f, GAS "magneticField/z", INFINITY); }
static void no_mass(hid_t f) { set_row(f, GAS "mass", 0); }
static void negative_density(hid_t f) { set_row(f, GAS "massDensity", -1); }
static void negative_support(hid_t f) { set_row(f, GAS "supportRadius", -1); }
static void no_volume(hid_t f) { set_row(f, GAS "volume", 0); }
static void negative_energy(hid_t f) { set_row(f, GAS "cosmicRayEnergy", -1e-30); }
static void negative_kappa(hid_t f) { set_row(f, GAS "parallelDiffusivity", -1); }
static void ionised_twice(hid_t f) { set_row(f, GAS "ionisedFraction", 1.5); }

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

/* Rank 0 edits the file on its own. Collective. */
static void tamper(const char *name, void (*edit)(hid_t file)) {
  MPI_Barrier(MPI_COMM_WORLD);
  if (team.rank == 0) {
    const hid_t file = H5Fopen(scratch_path(name), H5F_ACC_RDWR, H5P_DEFAULT);
    H5E_BEGIN_TRY { edit(file); }
    H5E_END_TRY
    H5Fclose(file);
  }
  MPI_Barrier(MPI_COMM_WORLD);
}

START_TEST(what_is_wrong_is_named) {
  wend_particles p;
  wend_file_facts facts;
  bool density;
  char id[64];
  ck_assert_int_eq(write_set("tampered.h5", 3, everything), WEND_OK);
  tamper("tampered.h5", tampered[_i].edit);
  const wend_status status = read_set("tampered.h5", 0, &p, &facts, &density);
  ck_assert_msg(status == tampered[_i].status, "status %d, not %d, for \"%s\": %s", status,
                tampered[_i].status, tampered[_i].word[0], team.text);
  ck_assert(spread_same_text(team.text));
  ck_assert_ptr_nonnull(strstr(team.text, "tampered.h5"));
  for (int k = 0; k < 2 && tampered[_i].word[k] != NULL; k++)
    ck_assert_msg(strstr(team.text, tampered[_i].word[k]) != NULL, "no \"%s\" in: %s",
                  tampered[_i].word[k], team.text);
  snprintf(id, sizeof id, " id %llu ", (unsigned long long)(UINT64_MAX - 57ull * 1000003));
  ck_assert_msg(status != WEND_ERR_PARTICLES || strstr(team.text, id) != NULL, "%s", team.text);
  ck_assert_ptr_null(p.id);
}
END_TEST

START_TEST(iterations_are_found) {
  wend_particles p;
  wend_file_facts facts;
  bool density;
  ck_assert_int_eq(write_set("many.h5", 3, everything), WEND_OK);
  MPI_Barrier(MPI_COMM_WORLD);
  if (team.rank == 0) { /* 5 and 40 in one file; a name that is no number is passed over */
    const hid_t file = H5Fopen(scratch_path("many.h5"), H5F_ACC_RDWR, H5P_DEFAULT);
    const double five = 5;
    H5Ocopy(file, "/data/40", file, "/data/5", H5P_DEFAULT, H5P_DEFAULT);
    H5Ocopy(file, "/data/40", file, "/data/99x", H5P_DEFAULT, H5P_DEFAULT);
    set_numbers(file, "/data/5", "time", 1, &five);
    H5Fclose(file);
  }
  MPI_Barrier(MPI_COMM_WORLD);
  const char *path = scratch_path("many.h5");
  ck_assert_int_eq(wend_particle_file_read_at(&team, path, -1, &units, 0, &p, &facts, &density),
                   WEND_OK);
  ck_assert(facts.iteration == 40 && facts.time == 0.1);
  wend_particles_reset(&p);
  ck_assert_int_eq(wend_particle_file_read_at(&team, path, 5, &units, 0, &p, &facts, &density),
                   WEND_OK);
  ck_assert(facts.iteration == 5 && facts.time == 5);
  wend_particles_reset(&p);
  ck_assert_int_eq(wend_particle_file_read_at(&team, path, 6, &units, 0, &p, &facts, &density),
                   WEND_ERR_FILE);
  ck_assert_ptr_nonnull(strstr(team.text, "no iteration /data/6"));
}
END_TEST

/* ---- forms of CR energy
 * ----------------------------------------------------------------------- */

static void rename_energy(hid_t f, const char *name, double length, double mass) {
  const double dimension[7] = {length, mass, -2};
  char path[128];
  snprintf(path, sizeof path, GAS "%s", name);
  H5Lmove(f, GAS "cosmicRayEnergy", f, path, H5P_DEFAULT, H5P_DEFAULT);
  set_numbers(f, path, "unitDimension", 7, dimension);
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
  const uint64_t mask = everything & ~form[_i].without;
  wend_particles p;
  wend_file_facts facts;
  bool density;
  write_set("energy.h5", 3, mask);
  tamper("energy.h5", form[_i].edit);
  const wend_status status = read_set("energy.h5", 1 << WEND_ENERGY, &p, &facts, &density);
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
  const double stored = wend_units_scale(&units, wend_quantity_find(WEND_Q_ENERGY)->dimension) /
                        wend_units_scale(&units, wend_quantity_find(quantity)->dimension);
  for (int32_t i = 0; i < p.n; i++) {
    const int64_t row = first_row() + i;
    const double mass = value_of(3, row, WEND_MASS);
    const double factor = density                             ? 1
                          : quantity != WEND_Q_ENERGY_DENSITY ? mass
                          : form[_i].without == 0             ? value_of(3, row, WEND_VOLUME)
                                                  : mass / value_of(3, row, WEND_DENSITY);
    const double expected = value_of(3, row, WEND_ENERGY) * stored * factor;
    good =
        good && fabs(p.column[WEND_ENERGY][i] - expected) <= 4e-16 * expected; /* roundings */
  }
  ck_assert(spread_everywhere(good));
  wend_particles_reset(&p);
}
END_TEST

/* ---- places in the box
 * ------------------------------------------------------------------------ */

START_TEST(places_are_brought_into_the_box) {
  static const struct {
    int axis; /* 0 periodic in [0, 1), 1 closed in [-1, 1], 2 open in [2, 5] */
    double x, expected;
    bool good;
  } place[] = {
      {0, 0.25, 0.25, true},
      {0, 0, 0, true},
      {0, 1, 0, true},
      {0, -0.25, 0.75, true},
      {0, 1.75, 0.75, true},
      {0, -1e-20, 0, true}, /* 1 - 1e-20 is 1 */
      {0, -1.5, 0, false},
      {0, 2.5, 0, false},
      {1, -1, -1, true},
      {1, 1, 1, true},
      {1, 1.0000000000000002, 0, false},
      {1, -1.1, 0, false},
      {2, 5, 5, true},
      {2, 5.0000000000000009, 0, false},
      {2, 1.9, 0, false},
  };
  const wend_domain domain = box(3);
  wend_particles p = make(&team, 3, everything);
  const bool holder = team.rank == team.size - 1 && p.n > 0;
  if (holder) p.column[WEND_X + place[_i].axis][p.n / 2] = place[_i].x;
  const int holders = team.size == 2 ? 0 : 1; /* the second rank has no particles */
  const wend_status status = wend_particle_file_place(&team, "the_file.h5", &domain, &p);
  const bool good = holders == 0 || place[_i].good;
  ck_assert_int_eq(status, good ? WEND_OK : WEND_ERR_PARTICLES);
  ck_assert(spread_everywhere(
      !holder || !good || p.column[WEND_X + place[_i].axis][p.n / 2] == place[_i].expected));
  if (!good)
    ck_assert_msg(strstr(team.text, "the_file.h5: particle id 1844") != NULL &&
                      strstr(team.text, "outside the box") != NULL,
                  "%s", team.text);
  wend_particles_reset(&p);
}
END_TEST

/* ---- writing that fails, few particles, no memory
 * --------------------------------------------- */

START_TEST(failed_writing_keeps_the_old_file) {
  wend_file_facts facts = facts_of(3);
  wend_particles p = make(&team, 3, everything);
  size_t before = 0, after = 0;
  ck_assert_int_eq(write_set("kept.h5", 3, everything), WEND_OK);
  char *old = scratch_read("kept.h5", &before);
  MPI_Barrier(MPI_COMM_WORLD);
  const int files = scratch_files();
  MPI_Barrier(MPI_COMM_WORLD);
  if (team.rank == 0) { /* a column that only the others have */
    free(p.column[WEND_MASS]);
    p.column[WEND_MASS] = NULL;
  }
  const wend_status status =
      wend_particle_file_write(&team, scratch_path("kept.h5"), &units, &p, &facts);
  const bool lacks = team.size > 1;
  MPI_Barrier(MPI_COMM_WORLD);
  ck_assert_int_eq(status, lacks ? WEND_ERR_ARGUMENT : WEND_OK);
  if (lacks) {
    ck_assert_ptr_nonnull(strstr(team.text, "record mass"));
    char *now = scratch_read("kept.h5", &after);
    ck_assert(spread_everywhere(before == after && memcmp(old, now, before) == 0));
    ck_assert(spread_everywhere(scratch_files() == files));
    free(now);
  }
  free(old);
  const char *nowhere = scratch_path("absent/new.h5");
  ck_assert_int_eq(wend_particle_file_write(&team, nowhere, &units, &p, &facts), WEND_ERR_FILE);
  ck_assert_ptr_nonnull(
      strstr(team.text, "absent/new.h5.part cannot be written: No such file"));
  wend_particles_reset(&p);
}
END_TEST

START_TEST(few_particles_or_none) {
  wend_file_facts facts = facts_of(2);
  wend_particles p;
  bool density;
  wend_particles_init(&team, &p, team.rank == 0 ? _i : 0, everything);
  for (int32_t i = 0; i < p.n; i++) {
    p.id[i] = (uint64_t)i;
    for (int c = 0; c < WEND_COLUMNS; c++) p.column[c][i] = c == WEND_Z ? 0 : 0.5;
  }
  const char *path = scratch_path("few.h5");
  ck_assert_int_eq(wend_particle_file_write(&team, path, &units, &p, &facts), WEND_OK);
  wend_particles_reset(&p);
  ck_assert_int_eq(read_set("few.h5", everything, &p, &facts, &density), WEND_OK);
  int64_t n = p.n;
  wend_team_count(&team, 1, &n);
  ck_assert_int_eq(n, _i);
  wend_particles_reset(&p);
}
END_TEST

START_TEST(failing_allocations_are_errors) {
  wend_particles p;
  wend_file_facts facts;
  bool density;
  int number = 0;
  ck_assert_int_eq(write_set("memory.h5", 3, everything), WEND_OK);
  for (bool failed = true; failed && number < 200; number++) {
    spread_break(team.rank == team.size - 1 ? number : -1);
    const wend_status status = read_set("memory.h5", everything, &p, &facts, &density);
    spread_break(-1);
    failed = status == WEND_ERR_MEMORY;
    ck_assert_msg(failed || status == WEND_OK, "%s", team.text);
    if (!failed) ck_assert(same_values(&p, 3, everything));
    wend_particles_reset(&p);
  }
  ck_assert_int_gt(number, 30);
  ck_assert_int_lt(number, 200);
}
END_TEST

/* Says whether the file belongs to a series, by its name. */
START_TEST(names_decide_the_encoding) {
  static const struct {
    const char *name, *encoding, *format;
  } file[] = {
      {"run_40.h5", "fileBased", "run_%T.h5"},  {"run_00040.h5", "fileBased", "run_%05T.h5"},
      {"run_41.h5", "groupBased", "/data/%T/"}, {"run40.h5", "groupBased", "/data/%T/"},
      {"ring.h5", "groupBased", "/data/%T/"},   {"_40.h5", "groupBased", "/data/%T/"}};
  ck_assert_int_eq(write_set(file[_i].name, 3, everything), WEND_OK);
  char encoding[32] = "", format[64] = "";
  const hid_t f = H5Fopen(scratch_path(file[_i].name), H5F_ACC_RDONLY, H5P_DEFAULT);
  const char *const attribute[2] = {"iterationEncoding", "iterationFormat"};
  for (int k = 0; k < 2; k++) {
    const hid_t a = H5Aopen(f, attribute[k], H5P_DEFAULT), type = H5Aget_type(a);
    H5Aread(a, type, k == 0 ? encoding : format);
    H5Tclose(type);
    H5Aclose(a);
  }
  H5Fclose(f);
  ck_assert(spread_everywhere(strcmp(encoding, file[_i].encoding) == 0));
  ck_assert(spread_everywhere(strcmp(format, file[_i].format) == 0));
  MPI_Barrier(MPI_COMM_WORLD);
}
END_TEST

int main(int count, char **arguments) {
  MPI_Init(&count, &arguments);
  wend_team_init(&team, MPI_COMM_WORLD);
  team.allocate = spread_allocate;
  scratch_begin();
  Suite *suite = suite_create("particle_file");
  TCase *tc = tcase_create("particle_file");
  tcase_add_loop_test(tc, all_columns_come_back_to_the_bit, 2, 4);
  tcase_add_test(tc, absent_columns_stay_absent);
  tcase_add_loop_test(tc, data_do_not_depend_on_the_number_of_ranks, 2, 4);
  tcase_add_loop_test(tc, what_is_wrong_is_named, 0,
                      (int)(sizeof tampered / sizeof tampered[0]));
  tcase_add_test(tc, iterations_are_found);
  tcase_add_loop_test(tc, energy_in_three_forms, 0, 6);
  tcase_add_loop_test(tc, places_are_brought_into_the_box, 0, 15);
  tcase_add_test(tc, failed_writing_keeps_the_old_file);
  tcase_add_loop_test(tc, few_particles_or_none, 0, 3);
  tcase_add_test(tc, failing_allocations_are_errors);
  tcase_add_loop_test(tc, names_decide_the_encoding, 0, 6);
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
