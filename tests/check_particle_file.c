/* SPDX-License-Identifier: GPL-3.0-or-later
 * check_particle_file.c: particle files come back to the bit, are the same on any number of
 * ranks, and whatever is wrong in one is named. */
#include "hilbert.h"
#include "particle_set.h"
#include "scratch.h"
#include "spread.h"

#include <check.h>
#include <hdf5.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static wend_team team;

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
  ck_assert_msg(set_write(&team, "run_0040.h5", dim, SET_ALL) == WEND_OK, "%s", team.text);
  ck_assert_msg(set_read(&team, "run_0040.h5", SET_ALL, &p, &facts, &density) == WEND_OK, "%s",
                team.text);
  ck_assert(set_is_same(&team, &p, dim, SET_ALL));
  const wend_domain domain = set_box(dim);
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
  ck_assert_int_eq(set_write(&team, "few.h5", 3, mask), WEND_OK);
  ck_assert_int_eq(set_read(&team, "few.h5", mask, &p, &facts, &density), WEND_OK);
  ck_assert(set_is_same(&team, &p, 3, mask));
  wend_particles_reset(&p);
  ck_assert_int_eq(set_read(&team, "few.h5", mask | 1 << WEND_DENSITY, &p, &facts, &density),
                   WEND_ERR_FILE);
  ck_assert_ptr_nonnull(strstr(team.text, "massDensity is missing"));
  ck_assert_int_eq(set_read(&team, "few.h5", mask | 1 << WEND_ENERGY, &p, &facts, &density),
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

/* Part number `part` of the whole sorted set, cut in as many unequal parts as there are ranks.
 */
static wend_particles own_part(const wend_particles *all, int part) {
  const int64_t half = all->n / 2, rest = all->n - half, others = team.size - 1;
  const int64_t first = part == 0 ? 0 : half + rest * (part - 1) / others;
  const int64_t end = others == 0 ? all->n : part == 0 ? half : half + rest * part / others;
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
  const wend_file_facts facts = set_facts(dim);
  wend_team alone;
  wend_team_init(&alone, MPI_COMM_SELF);
  wend_particles all = set_make(&alone, dim, SET_ALL);
  sort_by_key(&all, &facts.domain);
  wend_particles mine = own_part(&all, team.rank);
  const wend_status status =
      wend_particle_file_write(&team, scratch_path("many.h5"), &set_units, &mine, &facts);
  ck_assert_msg(status == WEND_OK, "%s", team.text);
  comparison c = {.sets = 0};
  bool good = true;
  if (team.rank == 0) {
    good = wend_particle_file_write(&alone, scratch_path("one.h5"), &set_units, &all, &facts) ==
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

/* Readers are told a stretch for each patch, so patches need the canonical order, over ranks
 * too. */
START_TEST(particles_out_of_order_make_one_patch) {
  const wend_file_facts facts = set_facts(3);
  wend_team alone;
  hsize_t patches[2] = {0};
  wend_team_init(&alone, MPI_COMM_SELF);
  wend_particles all = set_make(&alone, 3, SET_ALL);
  sort_by_key(&all, &facts.domain);
  for (int back = 0; back < 2; back++) {
    wend_particles mine = own_part(&all, back ? team.size - 1 - team.rank : team.rank);
    if (back && team.size == 1) mine.key[0] = mine.key[mine.n - 1];
    ck_assert_int_eq(
        wend_particle_file_write(&team, scratch_path("order.h5"), &set_units, &mine, &facts),
        WEND_OK);
    MPI_Barrier(MPI_COMM_WORLD);
    const hid_t file = H5Fopen(scratch_path("order.h5"), H5F_ACC_RDONLY, H5P_DEFAULT);
    const hid_t set = H5Dopen2(file, SET_GAS "particlePatches/numParticles", H5P_DEFAULT);
    const hid_t space = H5Dget_space(set);
    H5Sget_simple_extent_dims(space, &patches[back], NULL);
    H5Sclose(space);
    H5Dclose(set);
    H5Fclose(file);
    MPI_Barrier(MPI_COMM_WORLD);
    wend_particles_reset(&mine);
  }
  /* the set lies on a few planes of the box, which pass through more than a few cells */
  ck_assert(spread_everywhere(patches[0] > 8 && patches[0] <= 64 && patches[1] == 1));
  wend_particles_reset(&all);
  wend_team_reset(&alone);
}
END_TEST

START_TEST(iterations_are_found) {
  wend_particles p;
  wend_file_facts facts;
  bool density;
  ck_assert_int_eq(set_write(&team, "many.h5", 3, SET_ALL), WEND_OK);
  MPI_Barrier(MPI_COMM_WORLD);
  if (team.rank == 0) { /* 5 and 40 in one file; a name that is no number is passed over */
    const hid_t file = H5Fopen(scratch_path("many.h5"), H5F_ACC_RDWR, H5P_DEFAULT);
    const double five = 5;
    H5Ocopy(file, "/data/40", file, "/data/5", H5P_DEFAULT, H5P_DEFAULT);
    H5Ocopy(file, "/data/40", file, "/data/99x", H5P_DEFAULT, H5P_DEFAULT);
    tamper_numbers(file, "/data/5", "time", 1, &five);
    H5Fclose(file);
  }
  MPI_Barrier(MPI_COMM_WORLD);
  const char *path = scratch_path("many.h5");
  ck_assert_int_eq(
      wend_particle_file_read_at(&team, path, -1, &set_units, 0, &p, &facts, &density),
      WEND_OK);
  ck_assert(facts.iteration == 40 && facts.time == 0.1);
  wend_particles_reset(&p);
  ck_assert_int_eq(
      wend_particle_file_read_at(&team, path, 5, &set_units, 0, &p, &facts, &density), WEND_OK);
  ck_assert(facts.iteration == 5 && facts.time == 5);
  wend_particles_reset(&p);
  ck_assert_int_eq(
      wend_particle_file_read_at(&team, path, 6, &set_units, 0, &p, &facts, &density),
      WEND_ERR_FILE);
  ck_assert_ptr_nonnull(strstr(team.text, "no iteration /data/6"));
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
  const wend_domain domain = set_box(3);
  wend_particles p = set_make(&team, 3, SET_ALL);
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
  wend_file_facts facts = set_facts(3);
  wend_particles p = set_make(&team, 3, SET_ALL);
  size_t before = 0, after = 0;
  ck_assert_int_eq(set_write(&team, "kept.h5", 3, SET_ALL), WEND_OK);
  char *old = scratch_read("kept.h5", &before);
  MPI_Barrier(MPI_COMM_WORLD);
  const int files = scratch_files();
  MPI_Barrier(MPI_COMM_WORLD);
  if (team.rank == 0) { /* a column that only the others have */
    free(p.column[WEND_MASS]);
    p.column[WEND_MASS] = NULL;
  }
  const wend_status status =
      wend_particle_file_write(&team, scratch_path("kept.h5"), &set_units, &p, &facts);
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
  ck_assert_int_eq(wend_particle_file_write(&team, nowhere, &set_units, &p, &facts),
                   WEND_ERR_FILE);
  ck_assert_ptr_nonnull(
      strstr(team.text, "absent/new.h5.part cannot be written: No such file"));
  wend_particles_reset(&p);
}
END_TEST

START_TEST(few_particles_or_none) {
  wend_file_facts facts = set_facts(2);
  wend_particles p;
  bool density;
  wend_particles_init(&team, &p, team.rank == 0 ? _i : 0, SET_ALL);
  for (int32_t i = 0; i < p.n; i++) {
    p.id[i] = (uint64_t)i;
    for (int c = 0; c < WEND_COLUMNS; c++) p.column[c][i] = c == WEND_Z ? 0 : 0.5;
  }
  const char *path = scratch_path("few.h5");
  ck_assert_int_eq(wend_particle_file_write(&team, path, &set_units, &p, &facts), WEND_OK);
  wend_particles_reset(&p);
  ck_assert_int_eq(set_read(&team, "few.h5", SET_ALL, &p, &facts, &density), WEND_OK);
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
  ck_assert_int_eq(set_write(&team, "memory.h5", 3, SET_ALL), WEND_OK);
  for (bool failed = true; failed && number < 200; number++) {
    spread_break(team.rank == team.size - 1 ? number : -1);
    const wend_status status = set_read(&team, "memory.h5", SET_ALL, &p, &facts, &density);
    spread_break(-1);
    failed = status == WEND_ERR_MEMORY;
    ck_assert_msg(failed || status == WEND_OK, "%s", team.text);
    if (!failed) ck_assert(set_is_same(&team, &p, 3, SET_ALL));
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
  ck_assert_int_eq(set_write(&team, file[_i].name, 3, SET_ALL), WEND_OK);
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
  tcase_add_test(tc, particles_out_of_order_make_one_patch);
  tcase_add_test(tc, iterations_are_found);
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
