/* SPDX-License-Identifier: GPL-3.0-or-later
 * check_hdf.c: blocks in several transfers, attributes of all kinds, and files that are
 * replaced only by whole ones. */
#include "hdf.h"
#include "scratch.h"
#include "spread.h"

#include <check.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static wend_team team;

/* Ranks own unlike numbers of items, and the second none. */
static int64_t items_of(int rank) { return rank == 1 ? 0 : 7 + 5 * rank; }

static double value_of(int64_t place) { return 1 / (double)(place + 3); }

static wend_status write_blocks(int64_t at_once, const char *name) {
  wend_hdf hdf;
  wend_status status;
  hid_t set = -1;
  const int64_t n = items_of(team.rank);
  double *data = n > 0 ? malloc((size_t)n * sizeof *data) : NULL;
  WEND_TRY(wend_hdf_create(&team, scratch_path(name), &hdf));
  const wend_hdf_block block = wend_hdf_share(&team, H5T_NATIVE_DOUBLE, n);
  hdf.at_once = at_once;
  for (int64_t i = 0; i < n; i++) data[i] = value_of(block.first + i);
  WEND_TRY(wend_hdf_write(&hdf, hdf.file, "numbers", &block, data, &set));
  H5Dclose(set);
  WEND_TRY(wend_hdf_publish(&hdf));
done:
  free(data);
  wend_hdf_close(&hdf);
  return status;
}

/* Reads in equal blocks, in pieces, whatever they were written as. */
static bool read_blocks(int64_t at_once, const char *name) {
  wend_hdf hdf;
  wend_hdf_block block = {.type = H5T_NATIVE_DOUBLE};
  bool good = wend_hdf_open(&team, scratch_path(name), &hdf) == WEND_OK;
  if (!good) return false;
  hdf.at_once = at_once;
  const hid_t set = H5Dopen2(hdf.file, "numbers", H5P_DEFAULT);
  block.total = wend_hdf_length(set);
  wend_hdf_deal(&team, block.total, &block.first, &block.n);
  double *data = calloc((size_t)block.n + 1, sizeof *data);
  good = wend_hdf_read(&hdf, set, &block, data) == WEND_OK;
  for (int64_t i = 0; i < block.n; i++) good = good && data[i] == value_of(block.first + i);
  int64_t sum = block.n;
  wend_team_count(&team, 1, &sum);
  H5Dclose(set);
  wend_hdf_close(&hdf);
  free(data);
  return spread_everywhere(good && sum == block.total);
}

START_TEST(blocks_in_any_number_of_transfers) {
  static const int64_t pieces[] = {1, 3, 7, 1000};
  ck_assert_int_eq(write_blocks(pieces[_i], "blocks.h5"), WEND_OK);
  for (int k = 0; k < 4; k++) ck_assert(read_blocks(pieces[k], "blocks.h5"));
}
END_TEST

START_TEST(shares_are_equal_and_in_order) {
  static const int64_t totals[] = {0, 1, 2, 5, 1000003};
  for (int k = 0; k < 5; k++) {
    wend_team t = {.size = 4};
    int64_t next = 0;
    for (t.rank = 0; t.rank < t.size; t.rank++) {
      int64_t first, n;
      wend_hdf_deal(&t, totals[k], &first, &n);
      ck_assert_int_eq(first, next);
      ck_assert(n == totals[k] / 4 || n == totals[k] / 4 + 1);
      next += n;
    }
    ck_assert_int_eq(next, totals[k]);
  }
}
END_TEST

START_TEST(attributes_come_back) {
  wend_hdf hdf;
  char text[64] = "";
  const double three[3] = {1, -2, 0.3};
  const uint32_t zero = 0;
  double back[3] = {0};
  int64_t whole = -1;
  ck_assert_int_eq(wend_hdf_create(&team, scratch_path("attributes.h5"), &hdf), WEND_OK);
  wend_hdf_put_text(&hdf, hdf.file, "text", "a text");
  wend_hdf_put_text(&hdf, hdf.file, "none", "");
  wend_hdf_put(&hdf, hdf.file, "three", H5T_NATIVE_DOUBLE, 3, three);
  wend_hdf_put(&hdf, hdf.file, "zero", H5T_NATIVE_UINT32, 0, &zero);
  const hid_t a = wend_hdf_group(&hdf, hdf.file, "a"), b = wend_hdf_group(&hdf, a, "b");
  H5Gclose(b);
  H5Gclose(a);
  ck_assert_int_eq(wend_hdf_publish(&hdf), WEND_OK);
  ck_assert_int_eq(wend_hdf_open(&team, scratch_path("attributes.h5"), &hdf), WEND_OK);
  ck_assert(wend_hdf_get_text(&hdf, hdf.file, "text", sizeof text, text));
  ck_assert_str_eq(text, "a text");
  ck_assert(wend_hdf_get_text(&hdf, hdf.file, "none", sizeof text, text));
  ck_assert_str_eq(text, "");
  ck_assert(wend_hdf_get(&hdf, hdf.file, "three", H5T_NATIVE_DOUBLE, 3, back));
  ck_assert(memcmp(back, three, sizeof three) == 0);
  ck_assert(!wend_hdf_get(&hdf, hdf.file, "three", H5T_NATIVE_DOUBLE, 2, back));
  ck_assert(!wend_hdf_get(&hdf, hdf.file, "text", H5T_NATIVE_DOUBLE, 1, back));
  ck_assert(!wend_hdf_get(&hdf, hdf.file, "absent", H5T_NATIVE_DOUBLE, 1, back));
  ck_assert(!wend_hdf_get_text(&hdf, hdf.file, "three", sizeof text, text));
  ck_assert(wend_hdf_get(&hdf, hdf.file, "zero", H5T_NATIVE_INT64, 1, &whole));
  ck_assert_int_eq(whole, 0);
  ck_assert(wend_hdf_has(&hdf, hdf.file, "a/b") && wend_hdf_has(&hdf, hdf.file, "a"));
  ck_assert(!wend_hdf_has(&hdf, hdf.file, "a/c") && !wend_hdf_has(&hdf, hdf.file, "c/b/d"));
  wend_hdf_close(&hdf);
}
END_TEST

/* Text of variable length, and in UTF-8, as other writers have it. Rank 0 writes alone. */
static void write_variable(const char *path) {
  const char *value = "variable \xc2\xb5";
  const hid_t file = H5Fcreate(path, H5F_ACC_TRUNC, H5P_DEFAULT, H5P_DEFAULT);
  const hid_t type = H5Tcopy(H5T_C_S1), space = H5Screate(H5S_SCALAR);
  H5Tset_size(type, H5T_VARIABLE);
  H5Tset_cset(type, H5T_CSET_UTF8);
  const hid_t attribute = H5Acreate2(file, "text", type, space, H5P_DEFAULT, H5P_DEFAULT);
  H5Awrite(attribute, type, &value);
  H5Aclose(attribute);
  H5Sclose(space);
  H5Tclose(type);
  H5Fclose(file);
}

START_TEST(text_of_variable_length) {
  wend_hdf hdf;
  char text[64] = "", shorter[5] = "";
  if (team.rank == 0) write_variable(scratch_path("variable.h5"));
  MPI_Barrier(MPI_COMM_WORLD);
  ck_assert_int_eq(wend_hdf_open(&team, scratch_path("variable.h5"), &hdf), WEND_OK);
  ck_assert(wend_hdf_get_text(&hdf, hdf.file, "text", sizeof text, text));
  ck_assert_str_eq(text, "variable \xc2\xb5");
  ck_assert(wend_hdf_get_text(&hdf, hdf.file, "text", sizeof shorter, shorter));
  ck_assert_str_eq(shorter, "vari");
  wend_hdf_close(&hdf);
}
END_TEST

START_TEST(half_a_file_never_gets_the_name) {
  wend_hdf hdf;
  size_t before = 0, after = 0;
  ck_assert_int_eq(write_blocks(1000, "whole.h5"), WEND_OK);
  char *old = scratch_read("whole.h5", &before);
  MPI_Barrier(MPI_COMM_WORLD);
  const int files = scratch_files();
  MPI_Barrier(MPI_COMM_WORLD);
  ck_assert_int_eq(wend_hdf_create(&team, scratch_path("whole.h5"), &hdf), WEND_OK);
  wend_hdf_put_text(&hdf, hdf.file, "text", "half");
  MPI_Barrier(MPI_COMM_WORLD);
  ck_assert_int_eq(scratch_files(), files + 1);
  MPI_Barrier(MPI_COMM_WORLD);
  wend_hdf_close(&hdf); /* as after a failure */
  MPI_Barrier(MPI_COMM_WORLD);
  ck_assert_int_eq(scratch_files(), files);
  char *now = scratch_read("whole.h5", &after);
  ck_assert(spread_everywhere(before == after && memcmp(old, now, before) == 0));
  free(old);
  free(now);
}
END_TEST

/* Each with words its error must hold. */
static const struct {
  const char *path;
  bool write;
  const char *word;
} unusable[] = {
    {"absent.h5", false, "No such file"}, {".", false, "is no file"},
    {"noise.h5", false, "no HDF5 file"},  {"empty.h5", false, "no HDF5 file"},
    {"half.h5", false, "half.h5"},        {"absent/new.h5", true, "No such file"},
    {".", true, "something else"},        {"noise.h5/new.h5", true, "Not a directory"},
};

START_TEST(unusable_files_are_explained) {
  wend_hdf hdf;
  size_t size = 0;
  scratch_write("noise.h5", 11, "hello world");
  scratch_write("empty.h5", 0, "");
  write_blocks(1000, "half.h5");
  char *half = scratch_read("half.h5", &size);
  scratch_write("half.h5", size / 2, half);
  free(half);
  const char *path = scratch_path(unusable[_i].path);
  const wend_status status = unusable[_i].write ? wend_hdf_create(&team, path, &hdf)
                                                : wend_hdf_open(&team, path, &hdf);
  ck_assert_msg(status == WEND_ERR_FILE, "%s was taken", path);
  ck_assert_msg(strstr(team.text, unusable[_i].word) != NULL, "%s", team.text);
  ck_assert(spread_same_text(team.text));
  wend_hdf_close(&hdf);
}
END_TEST

/* A host's own error printing is left as it was. */
static herr_t my_printer(hid_t stack, void *data) {
  (void)stack;
  (void)data;
  return 0;
}

START_TEST(error_printing_is_restored) {
  H5E_auto2_t printer = NULL;
  void *data = NULL;
  wend_hdf hdf;
  int mark = 0;
  H5Eset_auto2(H5E_DEFAULT, my_printer, &mark);
  write_blocks(1000, "quiet.h5");
  ck_assert_int_eq(wend_hdf_open(&team, scratch_path("absent.h5"), &hdf), WEND_ERR_FILE);
  H5Eget_auto2(H5E_DEFAULT, &printer, &data);
  ck_assert(printer == my_printer && data == &mark);
}
END_TEST

START_TEST(checksums_add_up_and_notice) {
  double x[6] = {1, 2, 3, 4, 5, 6};
  const uint64_t all = wend_hdf_checksum(x, 0, 6);
  ck_assert_uint_eq(wend_hdf_checksum(x, 0, 2) + wend_hdf_checksum(x + 2, 2, 4), all);
  x[3] = 4.0000000000000009;
  ck_assert_uint_ne(wend_hdf_checksum(x, 0, 6), all);
  x[3] = 5;
  x[4] = 4; /* two exchanged */
  ck_assert_uint_ne(wend_hdf_checksum(x, 0, 6), all);
  ck_assert_uint_eq(wend_hdf_checksum(NULL, 0, 0), 0);
}
END_TEST

int main(int count, char **arguments) {
  MPI_Init(&count, &arguments);
  wend_team_init(&team, MPI_COMM_WORLD);
  scratch_begin();
  Suite *suite = suite_create("hdf");
  TCase *tc = tcase_create("hdf");
  tcase_add_loop_test(tc, blocks_in_any_number_of_transfers, 0, 4);
  tcase_add_test(tc, shares_are_equal_and_in_order);
  tcase_add_test(tc, attributes_come_back);
  tcase_add_test(tc, text_of_variable_length);
  tcase_add_test(tc, half_a_file_never_gets_the_name);
  tcase_add_loop_test(tc, unusable_files_are_explained, 0,
                      (int)(sizeof unusable / sizeof unusable[0]));
  tcase_add_test(tc, error_printing_is_restored);
  tcase_add_test(tc, checksums_add_up_and_notice);
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
