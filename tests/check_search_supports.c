/* SPDX-License-Identifier: GPL-3.0-or-later
 * check_search_supports.c: supports of whole sets against brute force and GSL's solver. */
#include "cloud.h"
#include "count_root.h"
#include "support.h"

#include <check.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

/* As in check_support.c. */
#define TOLERANCE 2e-12
#define ROOM 3000

static double target_of(int dim) { return dim == 3 ? 48.0 : 20.0; }

static wend_search cloud_search(const cloud *c) {
  return (wend_search){&c->domain, &c->tree, (const double(*)[4])c->place,
                       c->store,   c->row,   c->rows};
}

/* Sets the trial of every row to a level near `share` of the support found by brute force, at
 * least `least`; the tree keeps the supports it was built with, which must not matter. */
static void trials_set(cloud *c, const double *expected, double factor) {
  for (int32_t i = 0; i < c->rows; i++)
    c->place[c->row[i]][3] = wend_support_level(expected[i] * factor);
}

/* Supports by brute force; 0 where none exists within four box sizes. */
static void expected_fill(const cloud *c, const wend_smoothing *kernel, double *expected) {
  const int dim = c->domain.dim;
  const double target = target_of(dim), far = 4.0 * c->domain.hi[0];
  double *r = malloc(sizeof *r * ((size_t)c->n + 1));
  for (int32_t i = 0; i < c->rows; i++) {
    double least = INFINITY;
    for (int32_t j = 0; j < c->n; j++) {
      r[j] = sqrt(cloud_distance2(c, c->row[i], j));
      least = r[j] > 0.0 ? fmin(least, r[j]) : least;
    }
    const double above = fmin(far, 1e6 * least);
    const double close = count_number(kernel->name, dim, least, c->n, r);
    expected[i] = 0.0;
    if (least < INFINITY && close >= target)
      expected[i] = -least;
    else if (least < INFINITY && count_number(kernel->name, dim, above, c->n, r) > target)
      expected[i] = count_root(kernel->name, dim, target, c->n, r, least, above);
  }
  free(r);
}

static int32_t solve(const cloud *c, const wend_smoothing *kernel, const int32_t *todo,
                     int32_t n, double *support) {
  const wend_search search = cloud_search(c);
  double *scratch = malloc(sizeof *scratch * ROOM);
  const int32_t solved = wend_search_supports(&search, kernel, target_of(c->domain.dim), n,
                                              todo, support, ROOM, scratch);
  free(scratch);
  return solved;
}

/* Every row solved from three trials: the same bits, and the brute-force root. */
static void compare(const cloud_kind *kind, int dim, unsigned periodic, double unit,
                    int32_t n) {
  const wend_smoothing *kernel = wend_smoothing_find("wendland-c2");
  cloud c = cloud_create(kind, dim, periodic, unit, n, 0.3, 5);
  const size_t rows = (size_t)c.rows + 1;
  double *expected = malloc(sizeof *expected * rows), *support = malloc(sizeof *support * rows);
  double *again = malloc(sizeof *again * rows);
  int32_t *todo = malloc(sizeof *todo * rows), m = 0;
  expected_fill(&c, kernel, expected);
  for (int32_t i = 0; i < c.rows; i++)
    if (expected[i] > 0.0) todo[m++] = i;
  trials_set(&c, expected, 1.0);
  ck_assert_int_eq(solve(&c, kernel, todo, m, support), m);
  for (int32_t k = 0; k < m; k++)
    require(fabs(support[k] / expected[todo[k]] - 1.0) < TOLERANCE,
            "%s %d-D row %d: %.16g not %.16g", kind->name, dim, todo[k], support[k],
            expected[todo[k]]);
  for (double factor = 1.6; factor < 20.0; factor *= 3.0) {
    trials_set(&c, expected, factor);
    ck_assert_int_eq(solve(&c, kernel, todo, m, again), m);
    ck_assert_mem_eq(support, again, sizeof *support * (size_t)m);
  }
  trials_set(&c, expected, 0.8);
  ck_assert_int_eq(solve(&c, kernel, todo, m, again), 0);
  for (int32_t k = 0; k < m; k++) require(again[k] == 0.0, "%s row %d", kind->name, todo[k]);
  free(expected);
  free(support);
  free(again);
  free(todo);
  cloud_destroy(&c);
}

START_TEST(test_brute_force_3d) {
  for (const cloud_kind *k = cloud_kinds; k->name; k++) compare(k, 3, (unsigned)_i, 1.0, 300);
}
END_TEST

START_TEST(test_brute_force_2d) {
  for (const cloud_kind *k = cloud_kinds; k->name; k++) compare(k, 2, (unsigned)_i, 1.0, 300);
}
END_TEST

START_TEST(test_sizes) {
  static const int32_t sizes[] = {0, 1, 2, 7, 8, 9, 64, 65, 1000};
  for (size_t s = 0; s < sizeof sizes / sizeof *sizes; s++)
    for (const cloud_kind *k = cloud_kinds; k->name; k++)
      compare(k, 3, (unsigned)_i, 0x1p80, sizes[s]);
}
END_TEST

/* Trials and order of todo chosen at random row by row: each row's solution keeps its bits. */
START_TEST(test_any_todo) {
  const wend_smoothing *kernel = wend_smoothing_find("cubic-spline");
  for (const cloud_kind *k = cloud_kinds; k->name; k++) {
    cloud c = cloud_create(k, 3, 7u, 1.0, 400, 0.3, 5);
    double all[400], some[400];
    int32_t todo[400];
    uint64_t seed = (uint64_t)_i;
    for (int32_t i = 0; i < c.rows; i++) {
      todo[i] = i;
      c.place[c.row[i]][3] = 2.0;
    }
    solve(&c, kernel, todo, c.rows, all);
    for (int32_t i = 0; i < c.rows; i++) {
      todo[i] = (int32_t)(cloud_random(&seed) * c.rows);
      const double least = all[i] > 0.0 ? all[i] : 2.0;
      c.place[c.row[i]][3] = wend_support_level(least * (1.0 + 3.0 * cloud_random(&seed)));
    }
    solve(&c, kernel, todo, c.rows, some);
    for (int32_t i = 0; i < c.rows; i++)
      require(some[i] == all[todo[i]], "%s row %d: %.17g not %.17g", k->name, todo[i], some[i],
              all[todo[i]]);
    cloud_destroy(&c);
  }
}
END_TEST

/* Exactly as much room as there are particles inside is enough, one less is not. */
START_TEST(test_room) {
  const wend_smoothing *kernel = wend_smoothing_find("wendland-c2");
  cloud c = cloud_create(&cloud_kinds[0], 3, 7u, 1.0, 200, 0.0, 5);
  const wend_search search = cloud_search(&c);
  for (int32_t i = 0; i < c.n; i++) c.place[i][3] = 2.0;
  for (int32_t room = 190; room <= 210; room++) {
    double *scratch = malloc(sizeof *scratch * (size_t)room), support[1];
    const int32_t todo[1] = {room - 190};
    const int32_t solved =
        wend_search_supports(&search, kernel, 48.0, 1, todo, support, room, scratch);
    ck_assert_int_eq(solved, room < 200 ? -1 : 1);
    free(scratch);
  }
  cloud_destroy(&c);
}
END_TEST

int main(void) {
  Suite *suite = suite_create("search_supports");
  TCase *cases = tcase_create("search_supports");
  tcase_set_timeout(cases, 0);
  tcase_add_loop_test(cases, test_brute_force_3d, 0, 8);
  tcase_add_loop_test(cases, test_brute_force_2d, 0, 4);
  tcase_add_loop_test(cases, test_sizes, 7, 8);
  tcase_add_loop_test(cases, test_any_todo, 0, 4);
  tcase_add_test(cases, test_room);
  suite_add_tcase(suite, cases);
  SRunner *runner = srunner_create(suite);
  srunner_set_fork_status(runner, CK_NOFORK);
  srunner_run_all(runner, CK_NORMAL);
  const int failed = srunner_ntests_failed(runner);
  srunner_free(runner);
  return failed != 0;
}
