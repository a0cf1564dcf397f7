/* SPDX-License-Identifier: GPL-3.0-or-later
 * check_tree.c: boxes hold what they should, and no more. */
#include "cloud.h"

#include <check.h>
#include <math.h>

/* Members of a box at some level: the particles [begin, end). */
static void span(const cloud *c, int level, int32_t box, int32_t *begin, int32_t *end) {
  int64_t size = WEND_LEAF;
  for (int k = 0; k < level; k++) size *= WEND_FAN;
  const int64_t last = (box + 1) * size;
  *begin = (int32_t)(box * size);
  *end = last < c->n ? (int32_t)last : c->n;
}

/* Corners and largest support of the particles [begin, end), by the C library's fmin and fmax.
 */
static void compare_box(const cloud *c, int32_t b, int32_t begin, int32_t end) {
  double lo[3] = {INFINITY, INFINITY, INFINITY}, hi[3] = {-INFINITY, -INFINITY, -INFINITY};
  double h = 0.0;
  require(begin < end, "box %d", b);
  for (int32_t j = begin; j < end; j++) {
    for (int a = 0; a < 3; a++) {
      lo[a] = fmin(lo[a], c->place[j][a]);
      hi[a] = fmax(hi[a], c->place[j][a]);
    }
    h = fmax(h, c->place[j][3]);
  }
  for (int a = 0; a < 3; a++) {
    require(c->tree.lo[b][a] == lo[a] && c->tree.hi[b][a] == hi[a], "box %d", b);
  }
  require(c->tree.lo[b][3] == h, "box %d", b);
}

static const int32_t sizes[] = {0, 1, 7, 8, 9, 63, 64, 65, 511, 512, 513, 4096, 4097, 5000};

START_TEST(test_boxes) {
  for (const cloud_kind *k = cloud_kinds; k->name; k++) {
    cloud c = cloud_create(k, 3, 0u, 1.0, sizes[_i], 0.0, 11);
    ck_assert_int_eq(c.tree.n, c.n);
    ck_assert_int_eq(c.tree.offset[0], 0);
    ck_assert_int_eq(c.tree.offset[c.tree.levels], wend_tree_boxes(c.n));
    for (int level = 0; level < c.tree.levels; level++)
      for (int32_t b = c.tree.offset[level]; b < c.tree.offset[level + 1]; b++) {
        int32_t begin, end;
        span(&c, level, b - c.tree.offset[level], &begin, &end);
        compare_box(&c, b, begin, end);
      }
    cloud_destroy(&c);
  }
}
END_TEST

/* One box at the top, and levels for the largest count of particles. */
START_TEST(test_levels) {
  ck_assert_int_eq(wend_tree_boxes(0), 0);
  for (size_t s = 1; s < sizeof sizes / sizeof *sizes; s++) {
    cloud c = cloud_create(&cloud_kinds[0], 3, 0u, 1.0, sizes[s], 0.0, 11);
    ck_assert_int_eq(c.tree.offset[c.tree.levels] - c.tree.offset[c.tree.levels - 1], 1);
    cloud_destroy(&c);
  }
  int levels = 1;
  for (int64_t size = WEND_LEAF; size < INT32_MAX; size *= WEND_FAN) levels++;
  ck_assert_int_le(levels, WEND_TREE_LEVELS);
  ck_assert_int_gt(wend_tree_boxes(INT32_MAX), INT32_MAX / WEND_LEAF);
}
END_TEST

int main(void) {
  Suite *suite = suite_create("tree");
  TCase *cases = tcase_create("tree");
  tcase_set_timeout(cases, 0);
  tcase_add_loop_test(cases, test_boxes, 0, (int)(sizeof sizes / sizeof *sizes));
  tcase_add_test(cases, test_levels);
  suite_add_tcase(suite, cases);
  SRunner *runner = srunner_create(suite);
  srunner_set_fork_status(runner, CK_NOFORK);
  srunner_run_all(runner, CK_NORMAL);
  const int failed = srunner_ntests_failed(runner);
  srunner_free(runner);
  return failed != 0;
}
