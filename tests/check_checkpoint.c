/* SPDX-License-Identifier: GPL-3.0-or-later
 * check_checkpoint.c: checkpoints come back to the bit on any number of ranks, know where they
 * belong, and notice damage. */
#include "checkpoint.h"
#include "scratch.h"
#include "spread.h"

#include <check.h>
#include <hdf5.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

enum { ROWS = 57, SMALL = 5 };
static const uint64_t SETUP = 0xfeedfacecafebeefu;

static wend_team team;

/* Bits that only a faithful copy keeps: NaN with a payload, -0, subnormal, infinite, and plain
 * numbers. */
static uint64_t bits_of(int64_t row, int column) {
  static const uint64_t odd[] = {0x7ff8000000abcdefu, 0x8000000000000000u, 1u,
                                 0x7ff0000000000000u, 0xfff8000000000001u};
  const double plain = 1.0 / (double)(row + 3 + 100 * column);
  uint64_t bits;
  memcpy(&bits, &plain, sizeof bits);
  return row % 7 < 5 && row % 3 == 0 ? odd[row % 7] : bits ^ (column == 1 ? UINT64_MAX : 0);
}

typedef struct content {
  wend_checkpoint c;
  wend_checkpoint_item column[3], global[3];
  uint64_t *data[3];
  double small[SMALL];
  int64_t count[2];
} content;

/* A checkpoint with this rank's rows: the first rank has most, the second none. */
static void fill(content *x, const wend_team *t) {
  static const char *const name[3] = {"energy", "id", "steps"};
  static const wend_value_type type[3] = {WEND_VALUE_DOUBLE, WEND_VALUE_UINT64,
                                          WEND_VALUE_INT64};
  memset(x, 0, sizeof *x);
  int64_t first = 0, end = t->size == 1 ? ROWS : 40;
  if (t->rank == 1) first = end;
  if (t->rank > 1) {
    first = 40 + (ROWS - 40) * (t->rank - 2) / (t->size - 2);
    end = 40 + (ROWS - 40) * (t->rank - 1) / (t->size - 2);
  }
  if (t->size == 2) { /* then the second has the rest */
    first = t->rank == 0 ? 0 : 40;
    end = t->rank == 0 ? 40 : ROWS;
  }
  for (int k = 0; k < 3; k++) {
    x->data[k] = malloc((size_t)(end - first + 1) * sizeof(uint64_t));
    for (int64_t i = first; i < end; i++) x->data[k][i - first] = bits_of(i, k);
    x->column[k] = (wend_checkpoint_item){name[k], type[k], 0, x->data[k]};
  }
  for (int k = 0; k < SMALL; k++) x->small[k] = k == 2 ? NAN : 0.1 * k;
  x->count[0] = -5;
  x->count[1] = INT64_MAX;
  x->global[0] = (wend_checkpoint_item){"controller", WEND_VALUE_DOUBLE, SMALL, x->small};
  x->global[1] = (wend_checkpoint_item){"counts", WEND_VALUE_INT64, 2, x->count};
  x->global[2] = (wend_checkpoint_item){"nothing", WEND_VALUE_DOUBLE, 0, NULL};
  x->c = (wend_checkpoint){.setup_hash = SETUP,
                           .rows = end - first,
                           .columns = 3,
                           .column = x->column,
                           .globals = 3,
                           .global = x->global};
}

static void empty(content *x) {
  for (int k = 0; k < 3; k++) free(x->data[k]);
}

static wend_status write_one(wend_team *t, const char *name) {
  content x;
  fill(&x, t);
  const wend_status status = wend_checkpoint_write(t, scratch_path(name), &x.c);
  empty(&x);
  return status;
}

static bool same_columns(wend_team *t, const wend_checkpoint *c) {
  const uint64_t *column[3] = {wend_checkpoint_column(t, c, "energy", WEND_VALUE_DOUBLE),
                               wend_checkpoint_column(t, c, "id", WEND_VALUE_UINT64),
                               wend_checkpoint_column(t, c, "steps", WEND_VALUE_INT64)};
  bool same = c->total == ROWS && c->columns == 3 && c->rows >= ROWS / t->size;
  for (int k = 0; k < 3 && same; k++) {
    same = column[k] != NULL;
    for (int64_t i = 0; same && i < c->rows; i++)
      same = column[k][i] == bits_of(c->first + i, k);
  }
  return same;
}

static bool same_globals(wend_team *t, const wend_checkpoint *c) {
  content x;
  fill(&x, t);
  const double *small = wend_checkpoint_global(t, c, "controller", WEND_VALUE_DOUBLE, SMALL);
  const int64_t *count = wend_checkpoint_global(t, c, "counts", WEND_VALUE_INT64, -1);
  const bool same = small != NULL && memcmp(small, x.small, sizeof x.small) == 0 &&
                    count != NULL && memcmp(count, x.count, sizeof x.count) == 0 &&
                    c->globals == 3 &&
                    wend_checkpoint_global(t, c, "nothing", WEND_VALUE_DOUBLE, 0) != NULL;
  empty(&x);
  return same;
}

static bool comes_back(wend_team *t, const char *name) {
  wend_checkpoint c;
  const bool read = wend_checkpoint_read(t, scratch_path(name), SETUP, &c) == WEND_OK;
  const bool same = read && same_columns(t, &c) && same_globals(t, &c) && !c.other_processor &&
                    !c.other_math && !c.other_version && c.setup_hash == SETUP;
  wend_checkpoint_reset(&c);
  return same && c.column == NULL;
}

START_TEST(comes_back_to_the_bit) {
  ck_assert_msg(write_one(&team, "same.h5") == WEND_OK, "%s", team.text);
  ck_assert_msg(spread_everywhere(comes_back(&team, "same.h5")), "%s", team.text);
}
END_TEST

/* Written by all and read by one, and the other way round. */
START_TEST(comes_back_on_another_number_of_ranks) {
  wend_team alone;
  wend_team_init(&alone, MPI_COMM_SELF);
  ck_assert_int_eq(write_one(&team, "many.h5"), WEND_OK);
  MPI_Barrier(MPI_COMM_WORLD);
  bool good = team.rank != 0 || comes_back(&alone, "many.h5");
  if (team.rank == 0) good = write_one(&alone, "one.h5") == WEND_OK && good;
  ck_assert_msg(spread_everywhere(good), "%s", alone.text);
  ck_assert(spread_everywhere(comes_back(&team, "one.h5")));
  wend_team_reset(&alone);
}
END_TEST

/* Rank 0 edits the file on its own. Collective. */
static void tamper(const char *name, void (*edit)(hid_t file)) {
  MPI_Barrier(MPI_COMM_WORLD);
  if (team.rank == 0) {
    const hid_t file = H5Fopen(scratch_path(name), H5F_ACC_RDWR, H5P_DEFAULT);
    edit(file);
    H5Fclose(file);
  }
  MPI_Barrier(MPI_COMM_WORLD);
}

static void set_row(hid_t file, const char *name, hsize_t row, uint64_t bits) {
  const hsize_t one = 1;
  const hid_t set = H5Dopen2(file, name, H5P_DEFAULT), space = H5Dget_space(set),
              type = H5Dget_type(set);
  const hid_t memory = H5Screate_simple(1, &one, NULL);
  H5Sselect_hyperslab(space, H5S_SELECT_SET, &row, NULL, &one, NULL);
  H5Dwrite(set, type, memory, space, H5P_DEFAULT, &bits);
  H5Tclose(type);
  H5Sclose(memory);
  H5Sclose(space);
  H5Dclose(set);
}

static void set_text(hid_t file, const char *name, const char *text) {
  const hid_t type = H5Tcopy(H5T_C_S1), space = H5Screate(H5S_SCALAR);
  H5Tset_size(type, strlen(text));
  H5Adelete(file, name);
  const hid_t a = H5Acreate2(file, name, type, space, H5P_DEFAULT, H5P_DEFAULT);
  H5Awrite(a, type, text);
  H5Aclose(a);
  H5Sclose(space);
  H5Tclose(type);
}

static void flip_one_bit(hid_t f) { set_row(f, "columns/energy", 31, bits_of(31, 0) ^ 1); }
static void flip_a_count(hid_t f) { set_row(f, "globals/counts", 0, 7); }
static void drop_format(hid_t f) { H5Adelete(f, "wend_checkpoint"); }
static void drop_hash(hid_t f) { H5Adelete(f, "setup_hash"); }
static void drop_columns(hid_t f) { H5Ldelete(f, "columns", H5P_DEFAULT); }
static void drop_checksum(hid_t f) {
  H5Adelete_by_name(f, "globals/counts", "checksum", H5P_DEFAULT);
}
static void make_short(hid_t f) {
  const hsize_t n = 3;
  const hid_t space = H5Screate_simple(1, &n, NULL);
  H5Ldelete(f, "columns/id", H5P_DEFAULT);
  H5Dclose(H5Dcreate2(f, "columns/id", H5T_NATIVE_UINT64, space, H5P_DEFAULT, H5P_DEFAULT,
                      H5P_DEFAULT));
  H5Sclose(space);
}
static void make_float(hid_t f) {
  const hsize_t n = ROWS;
  const hid_t space = H5Screate_simple(1, &n, NULL);
  H5Ldelete(f, "columns/id", H5P_DEFAULT);
  H5Dclose(H5Dcreate2(f, "columns/id", H5T_NATIVE_FLOAT, space, H5P_DEFAULT, H5P_DEFAULT,
                      H5P_DEFAULT));
  H5Sclose(space);
}

static const struct {
  void (*edit)(hid_t file);
  const char *word;
} damage[] = {
    {flip_one_bit, "energy is damaged: its checksum is wrong"},
    {flip_a_count, "counts is damaged: its checksum is wrong"},
    {drop_format, "no checkpoint"},
    {drop_hash, "no checkpoint"},
    {drop_columns, "group /columns cannot be read"},
    {drop_checksum, "counts is damaged"},
    {make_short, "id is damaged"},
    {make_float, "id is damaged"},
};

START_TEST(damage_is_noticed) {
  wend_checkpoint c;
  ck_assert_int_eq(write_one(&team, "damaged.h5"), WEND_OK);
  tamper("damaged.h5", damage[_i].edit);
  ck_assert_int_eq(wend_checkpoint_read(&team, scratch_path("damaged.h5"), SETUP, &c),
                   WEND_ERR_FILE);
  ck_assert_msg(strstr(team.text, damage[_i].word) != NULL, "%s", team.text);
  ck_assert(spread_same_text(team.text));
  ck_assert(c.column == NULL && c.total == 0);
}
END_TEST

START_TEST(another_setup_is_an_error) {
  wend_checkpoint c;
  ck_assert_int_eq(write_one(&team, "setup.h5"), WEND_OK);
  ck_assert_int_eq(wend_checkpoint_read(&team, scratch_path("setup.h5"), SETUP + 1, &c),
                   WEND_ERR_FILE);
  ck_assert_ptr_nonnull(strstr(team.text, "another setup"));
  ck_assert_int_eq(wend_checkpoint_read(&team, scratch_path("absent.h5"), SETUP, &c),
                   WEND_ERR_FILE);
  ck_assert_ptr_nonnull(strstr(team.text, "absent.h5"));
}
END_TEST

static void other_processor(hid_t f) { set_text(f, "processor", "abacus"); }
static void other_math(hid_t f) { set_text(f, "math_library", "tables 1614"); }
static void other_version(hid_t f) { set_text(f, "version", "0.0.0"); }
static void other_rounding(hid_t f) {
  const uint64_t print = 1;
  const hid_t a = H5Aopen(f, "math_fingerprint", H5P_DEFAULT);
  H5Awrite(a, H5T_NATIVE_UINT64, &print);
  H5Aclose(a);
}

START_TEST(another_machine_is_flagged) {
  static void (*const edit[4])(hid_t) = {other_processor, other_math, other_version,
                                         other_rounding};
  wend_checkpoint c;
  ck_assert_int_eq(write_one(&team, "moved.h5"), WEND_OK);
  tamper("moved.h5", edit[_i]);
  ck_assert_int_eq(wend_checkpoint_read(&team, scratch_path("moved.h5"), SETUP, &c), WEND_OK);
  ck_assert(c.other_processor == (_i == 0) && c.other_version == (_i == 2));
  ck_assert(c.other_math == (_i == 1 || _i == 3));
  ck_assert(_i != 0 || strstr(c.made_by, "abacus") != NULL);
  wend_checkpoint_reset(&c);
}
END_TEST

START_TEST(items_are_found_by_name_type_and_length) {
  wend_checkpoint c;
  ck_assert_int_eq(write_one(&team, "items.h5"), WEND_OK);
  ck_assert_int_eq(wend_checkpoint_read(&team, scratch_path("items.h5"), SETUP, &c), WEND_OK);
  static const char *const word[] = {"lacks the column colour", "column id has another type",
                                     "global counts has another type or length"};
  for (int k = 0; k < 3; k++) {
    const void *found = k == 0 ? wend_checkpoint_column(&team, &c, "colour", WEND_VALUE_DOUBLE)
                        : k == 1
                            ? wend_checkpoint_column(&team, &c, "id", WEND_VALUE_DOUBLE)
                            : wend_checkpoint_global(&team, &c, "counts", WEND_VALUE_INT64, 3);
    ck_assert(found == NULL);
    ck_assert_int_eq(wend_agree(&team), WEND_ERR_FILE);
    ck_assert_msg(strstr(team.text, word[k]) != NULL, "%s", team.text);
  }
  wend_checkpoint_reset(&c);
}
END_TEST

/* A global must be the same on all ranks; and a failed checkpoint leaves the last one alone. */
START_TEST(failed_writing_keeps_the_previous) {
  content x;
  ck_assert_int_eq(write_one(&team, "kept.h5"), WEND_OK);
  fill(&x, &team);
  x.small[1] = team.rank;
  const wend_status status = wend_checkpoint_write(&team, scratch_path("kept.h5"), &x.c);
  ck_assert_int_eq(status, team.size > 1 ? WEND_ERR_ARGUMENT : WEND_OK);
  if (team.size > 1) {
    ck_assert_ptr_nonnull(strstr(team.text, "controller differs among ranks"));
    ck_assert(spread_everywhere(comes_back(&team, "kept.h5")));
    MPI_Barrier(MPI_COMM_WORLD);
    char *part;
    size_t size;
    ck_assert((part = scratch_read("kept.h5.part", &size)) == NULL);
    free(part);
  }
  empty(&x);
}
END_TEST

START_TEST(nothing_at_all) {
  const wend_checkpoint none = {.setup_hash = 3};
  wend_checkpoint c;
  ck_assert_int_eq(wend_checkpoint_write(&team, scratch_path("none.h5"), &none), WEND_OK);
  ck_assert_int_eq(wend_checkpoint_read(&team, scratch_path("none.h5"), 3, &c), WEND_OK);
  ck_assert(c.total == 0 && c.rows == 0 && c.columns == 0 && c.globals == 0);
  wend_checkpoint_reset(&c);
}
END_TEST

START_TEST(failing_allocations_are_errors) {
  wend_checkpoint c;
  int number = 0;
  ck_assert_int_eq(write_one(&team, "memory.h5"), WEND_OK);
  for (bool failed = true; failed && number < 100; number++) {
    spread_break(team.rank == team.size - 1 ? number : -1);
    const wend_status status =
        wend_checkpoint_read(&team, scratch_path("memory.h5"), SETUP, &c);
    spread_break(-1);
    failed = status == WEND_ERR_MEMORY;
    ck_assert_msg(failed || status == WEND_OK, "%s", team.text);
    wend_checkpoint_reset(&c);
  }
  ck_assert_int_gt(number, 6); /* one array each of 3 columns and 3 globals */
  ck_assert_int_lt(number, 100);
}
END_TEST

int main(int count, char **arguments) {
  MPI_Init(&count, &arguments);
  wend_team_init(&team, MPI_COMM_WORLD);
  team.allocate = spread_allocate;
  scratch_begin();
  Suite *suite = suite_create("checkpoint");
  TCase *tc = tcase_create("checkpoint");
  tcase_add_test(tc, comes_back_to_the_bit);
  tcase_add_test(tc, comes_back_on_another_number_of_ranks);
  tcase_add_loop_test(tc, damage_is_noticed, 0, (int)(sizeof damage / sizeof damage[0]));
  tcase_add_test(tc, another_setup_is_an_error);
  tcase_add_loop_test(tc, another_machine_is_flagged, 0, 4);
  tcase_add_test(tc, items_are_found_by_name_type_and_length);
  tcase_add_test(tc, failed_writing_keeps_the_previous);
  tcase_add_test(tc, nothing_at_all);
  tcase_add_test(tc, failing_allocations_are_errors);
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
