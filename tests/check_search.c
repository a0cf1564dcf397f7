/* SPDX-License-Identifier: GPL-3.0-or-later
 * check_search.c: lists of pairs against brute force over all particles. */
#include "cloud.h"

#include <check.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

#define GUARD INT32_MIN /* fills index: no entry beyond the capacity may change it */

/* Lists of a whole set. */
typedef struct lists {
  wend_pairs pairs;
  int32_t *index, *count;
  int64_t *first;
} lists;

static wend_search cloud_search(const cloud *c) {
  return (wend_search){&c->domain, &c->tree, (const double(*)[4])c->place,
                       c->store,   c->row,   c->rows};
}

/* Searches with a capacity that begins at `capacity` and grows by `more` each time. */
static lists search_all(const cloud *c, int64_t capacity, int64_t more) {
  const wend_search search = cloud_search(c);
  const int32_t slices = (c->rows + 7) / 8;
  lists l = {.count = malloc(sizeof *l.count * 8u * ((size_t)slices + 1)),
             .first = calloc((size_t)slices + 1, sizeof *l.first)};
  int64_t used = 0;
  int32_t begin = 0;
  for (;; capacity += more) {
    l.index = realloc(l.index, sizeof *l.index * ((size_t)capacity + 1));
    for (int64_t k = used; k <= capacity; k++) l.index[k] = GUARD;
    const int32_t done =
        wend_search_pairs(&search, begin, l.index, capacity, &used, l.first, l.count);
    require(done >= begin && used <= capacity && l.first[done] == used, "slices %d", done);
    require(l.index[capacity] == GUARD, "an entry beyond the capacity");
    begin = done;
    if (begin == slices) break;
  }
  l.pairs = (wend_pairs){c->rows, slices, l.first, l.count, l.index};
  return l;
}

static void lists_free(lists *l) {
  free(l->index);
  free(l->count);
  free(l->first);
}

/* Compares row i with every particle of the set in merged order. */
static void compare_row(const cloud *c, const wend_pairs *p, int32_t i, const char *name) {
  const int32_t self = c->row[i];
  int32_t m = 0;
  for (int32_t j = 0; j < c->n; j++) {
    const double h = fmax(c->place[self][3], c->place[j][3]);
    if (j == self || !(cloud_distance2(c, self, j) < h * h)) continue;
    require(m < p->count[i], "%s: row %d of %d lacks entry %d", name, i, c->rows, m);
    require(p->index[wend_pairs_entry(p, i, m)] == c->store[j],
            "%s: row %d entry %d is %d, not %d", name, i, m,
            p->index[wend_pairs_entry(p, i, m)], c->store[j]);
    m++;
  }
  require(m == p->count[i], "%s: row %d has %d entries, not %d", name, i, p->count[i], m);
}

/* Widths are the longest rows', and all that is not an entry is padding. */
static void compare_padding(const wend_pairs *p) {
  for (int32_t s = 0; s < p->slices; s++) {
    int32_t widest = 0;
    for (int lane = 0; lane < WEND_LANES; lane++) {
      const int32_t i = s * WEND_LANES + lane, count = p->count[i];
      widest = count > widest ? count : widest;
      require(i < p->rows || count == 0, "row %d does not exist", i);
      for (int32_t m = count; m < wend_pairs_width(p, s); m++)
        require(p->index[wend_pairs_entry(p, i, m)] == (i < p->rows ? i : p->rows - 1),
                "row %d, padding %d", i, m);
    }
    require(wend_pairs_width(p, s) == widest, "slice %d", s);
  }
}

static void compare(const cloud_kind *kind, int dim, unsigned periodic, double unit, int32_t n,
                    double ghosts) {
  cloud c = cloud_create(kind, dim, periodic, unit, n, ghosts, 7);
  lists l = search_all(&c, 80 * n + 64, 400 * n);
  for (int32_t i = 0; i < c.rows; i++) compare_row(&c, &l.pairs, i, kind->name);
  compare_padding(&l.pairs);
  lists_free(&l);
  cloud_destroy(&c);
}

START_TEST(test_brute_force_3d) {
  for (const cloud_kind *k = cloud_kinds; k->name; k++)
    compare(k, 3, (unsigned)_i, 1.0, 700, 0.4);
}
END_TEST

START_TEST(test_brute_force_2d) {
  for (const cloud_kind *k = cloud_kinds; k->name; k++)
    compare(k, 2, (unsigned)_i, 1.0, 700, 0.3);
}
END_TEST

START_TEST(test_small_sets) {
  static const int32_t sizes[] = {0, 1, 2, 3, 7, 8, 9, 15, 16, 17, 63, 64, 65, 72, 73};
  for (const cloud_kind *k = cloud_kinds; k->name; k++)
    for (size_t s = 0; s < sizeof sizes / sizeof *sizes; s++) {
      compare(k, 3, (unsigned)_i, 1.0, sizes[s], 0.0);
      compare(k, 3, (unsigned)_i, 1.0, sizes[s], 0.5);
    }
}
END_TEST

/* Lengths in cm or in megaparsecs: squares beyond the range of float must do no harm. */
START_TEST(test_units) {
  for (const cloud_kind *k = cloud_kinds; k->name; k++) {
    compare(k, 3, 7u, 3.086e24, 500, 0.2);
    compare(k, 3, 0u, 1e-25, 500, 0.2);
  }
}
END_TEST

/* Many small particles in a dense ball, one large one reaching all of them. */
START_TEST(test_large_set) {
  compare(&cloud_kinds[3], 3, 7u, 1.0, 4000, 0.1);
  compare(&cloud_kinds[4], 3, 7u, 1.0, 4000, 0.1);
  compare(&cloud_kinds[0], 3, 7u, 1.0, 4000, 0.1);
}
END_TEST

/* Ties r = H on a lattice: i sees j exactly when j sees i. */
START_TEST(test_symmetry) {
  for (const cloud_kind *k = cloud_kinds; k->name; k++) {
    cloud c = cloud_create(k, 3, 7u, 0.3, 700, 0.0, 3);
    lists l = search_all(&c, 1 << 15, 1 << 17);
    char *seen = calloc((size_t)c.n * (size_t)c.n, 1);
    for (int32_t i = 0; i < c.n; i++)
      for (int32_t m = 0; m < l.count[i]; m++)
        seen[i * c.n + l.index[wend_pairs_entry(&l.pairs, i, m)]] = 1;
    for (int32_t i = 0; i < c.n; i++)
      for (int32_t j = 0; j <= i; j++)
        require(seen[i * c.n + j] == seen[j * c.n + i], "%s: %d %d", k->name, i, j);
    free(seen);
    lists_free(&l);
    cloud_destroy(&c);
  }
}
END_TEST

/* A search that stops for room and goes on ends with the same lists. */
START_TEST(test_capacity) {
  for (const cloud_kind *k = cloud_kinds; k->name; k++) {
    cloud c = cloud_create(k, 3, 7u, 1.0, 400, 0.2, 5);
    lists once = search_all(&c, 1 << 15, 1 << 15), grown = search_all(&c, _i, 24);
    const int64_t entries = once.first[once.pairs.slices];
    ck_assert_int_eq(grown.first[once.pairs.slices], entries);
    ck_assert_mem_eq(once.first, grown.first, sizeof *once.first * (size_t)once.pairs.slices);
    ck_assert_mem_eq(once.count, grown.count,
                     sizeof *once.count * 8u * (size_t)once.pairs.slices);
    ck_assert_mem_eq(once.index, grown.index, sizeof *once.index * (size_t)entries);
    lists_free(&once);
    lists_free(&grown);
    cloud_destroy(&c);
  }
}
END_TEST

int main(void) {
  Suite *suite = suite_create("search");
  TCase *cases = tcase_create("search");
  tcase_set_timeout(cases, 0);
  tcase_add_loop_test(cases, test_brute_force_3d, 0, 8);
  tcase_add_loop_test(cases, test_brute_force_2d, 0, 4);
  tcase_add_loop_test(cases, test_small_sets, 0, 8);
  tcase_add_test(cases, test_units);
  tcase_add_test(cases, test_large_set);
  tcase_add_test(cases, test_symmetry);
  tcase_add_loop_test(cases, test_capacity, 0, 3);
  suite_add_tcase(suite, cases);
  SRunner *runner = srunner_create(suite);
  srunner_set_fork_status(runner, CK_NOFORK);
  srunner_run_all(runner, CK_NORMAL);
  const int failed = srunner_ntests_failed(runner);
  srunner_free(runner);
  return failed != 0;
}
