/* SPDX-License-Identifier: GPL-3.0-or-later
 * check_near.c: every kit of comparisons against the predicate in double precision. */
#include "cloud.h"
#include "near.h"

#include <check.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

static wend_near *near_create(const cloud *c, bool mutual) {
  wend_near *near = calloc(1, sizeof *near);
  near->places = (wend_places){&c->domain, &c->tree, (const double(*)[4])c->place, NULL};
  near->mutual = mutual;
  return near;
}

static bool inside(const cloud *c, bool mutual, int32_t i, int32_t j) {
  const double h = mutual ? fmax(c->place[i][3], c->place[j][3]) : c->place[i][3];
  return (!mutual || i != j) && cloud_distance2(c, i, j) < h * h;
}

/* Number of the leaf in the collection that holds a particle, or -1. */
static int32_t slot_of(const wend_near *near, int32_t self) {
  int32_t slot = near->leaves.n - 1;
  while (slot >= 0 && near->leaf[slot] != self / WEND_LEAF) slot--;
  return slot;
}

/* Compares hits of a member with all particles from j on, in order. Returns the first particle
 * not looked at. */
static int32_t compare_hits(const cloud *c, wend_near *near, const wend_near_kit *kit,
                            int32_t self, int32_t j, const char *name) {
  static wend_leaves leaves;
  static int32_t slots[WEND_NEAR_LEAVES + 8], hits[WEND_NEAR + 8];
  wend_member m;
  wend_near_narrow(near, kit, 1, &self, &m, &leaves);
  const int32_t n = kit->choose(&leaves, &m, slots), slot = slot_of(near, self);
  const int32_t own = near->mutual && slot >= 0 ? slot * WEND_LEAF + self % WEND_LEAF : -1;
  const float x = wend_near_swap(near, own, INFINITY);
  const int32_t found = kit->sieve(near, &m, n, slots, hits);
  wend_near_swap(near, own, x);
  for (int32_t k = 0; k < found; k++, j++) {
    while (j < c->n && j < hits[k] && !inside(c, near->mutual, self, j)) j++;
    require(j == hits[k] && inside(c, near->mutual, self, j),
            "%s, %s: %d lists %d, expected %d", name, kit->name, self, hits[k], j);
  }
  return j;
}

/* That none is left from particle j on. */
static void compare_rest(const cloud *c, const wend_near *near, const wend_near_kit *kit,
                         int32_t self, int32_t j, const char *name) {
  for (; j < c->n; j++)
    require(!inside(c, near->mutual, self, j), "%s, %s: %d lacks %d", name, kit->name, self, j);
}

/* One member alone, from as many layings-out as it takes. */
static void compare_alone(const cloud *c, wend_near *near, const wend_near_kit *kit,
                          int32_t self, const char *name) {
  int32_t j = 0;
  wend_walk walk;
  wend_near_gather(near, 1, &self, &walk);
  for (bool first = true, last = false; !last; first = false) {
    last = wend_near_fill(near, kit, &walk, first);
    j = compare_hits(c, near, kit, self, j, name);
  }
  compare_rest(c, near, kit, self, j, name);
}

/* All particles, in groups where they fit together; every fifth alone as well. */
static void compare_all(const cloud *c, wend_near *near, const wend_near_kit *kit,
                        const char *name) {
  for (int32_t begin = 0, taken; begin < c->n; begin += taken) {
    const int32_t n = c->n - begin < WEND_GROUP ? c->n - begin : WEND_GROUP;
    taken = wend_near_group(near, kit, n, c->row + begin, 1);
    for (int32_t i = begin; i < begin + taken; i++)
      compare_rest(c, near, kit, i, compare_hits(c, near, kit, i, 0, name), name);
    taken = taken > 0 ? taken : 1;
  }
  for (int32_t i = 0; i < c->n; i += 5) compare_alone(c, near, kit, i, name);
}

/* Bit i of the loop number: axes that are periodic; the highest: mutual. */
START_TEST(test_predicate) {
  const wend_near_kit *kit;
  for (int k = 0; (kit = wend_near_kit_at(k)); k++)
    for (const cloud_kind *kind = cloud_kinds; kind->name; kind++) {
      cloud c = cloud_create(kind, 3, (unsigned)_i & 7u, 1.0, 603, 0.0, 13);
      wend_near *near = near_create(&c, _i >= 8);
      compare_all(&c, near, kit, kind->name);
      free(near);
      cloud_destroy(&c);
    }
}
END_TEST

/* The same bits from every kit, from both ends, and from a formula that folds |dx|. */
START_TEST(test_distances) {
  const wend_near_kit *kit;
  for (int k = 0; (kit = wend_near_kit_at(k)); k++)
    for (const cloud_kind *kind = cloud_kinds; kind->name; kind++) {
      cloud c = cloud_create(kind, 3, (unsigned)_i, 3.1, 203, 0.0, 13);
      const wend_places places = {&c.domain, &c.tree, (const double(*)[4])c.place, NULL};
      double r[203], back[1];
      int32_t number[203];
      for (int32_t j = 0; j < c.n; j++) number[j] = c.n - 1 - j;
      for (int32_t i = 0; i < c.n; i++) {
        kit->distances(&places, i, c.n, number, r);
        for (int32_t j = 0; j < c.n; j++) {
          require(r[j] == sqrt(cloud_distance2(&c, i, number[j])), "%s: %d %d", kit->name, i,
                  number[j]);
          kit->distances(&places, number[j], 1, &i, back);
          require(r[j] == back[0], "%s: %d %d", kit->name, i, number[j]);
        }
      }
      cloud_destroy(&c);
    }
}
END_TEST

/* Groups are taken from the front, in whole units, and never beyond n. */
START_TEST(test_groups) {
  const wend_near_kit *kit = wend_near_kit_best();
  for (const cloud_kind *kind = cloud_kinds; kind->name; kind++) {
    cloud c = cloud_create(kind, 3, 7u, 1.0, 300, 0.0, 13);
    wend_near *near = near_create(&c, true);
    for (int32_t begin = 0; begin < c.n; begin += 8)
      for (int32_t unit = 1; unit <= 8; unit *= 8) {
        const int32_t n = c.n - begin < WEND_GROUP ? c.n - begin : WEND_GROUP;
        const int32_t taken = wend_near_group(near, kit, n, c.row + begin, unit);
        ck_assert(taken >= 0 && taken <= n);
        ck_assert(taken == n || taken % unit == 0);
      }
    free(near);
    cloud_destroy(&c);
  }
}
END_TEST

int main(void) {
  Suite *suite = suite_create("near");
  TCase *cases = tcase_create("near");
  tcase_set_timeout(cases, 0);
  tcase_add_loop_test(cases, test_predicate, 0, 16);
  tcase_add_loop_test(cases, test_distances, 0, 8);
  tcase_add_test(cases, test_groups);
  suite_add_tcase(suite, cases);
  SRunner *runner = srunner_create(suite);
  srunner_set_fork_status(runner, CK_NOFORK);
  srunner_run_all(runner, CK_NORMAL);
  const int failed = srunner_ntests_failed(runner);
  srunner_free(runner);
  return failed != 0;
}
