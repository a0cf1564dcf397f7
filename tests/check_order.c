/* SPDX-License-Identifier: GPL-3.0-or-later
 * check_order.c: the canonical order against the C library's sort. */
#include "cloud.h"
#include "order.h"
#include "spread.h"

#include <check.h>
#include <stdlib.h>

static wend_team team;

typedef struct item {
  uint64_t key, id;
  int32_t index;
} item;

static int compare(const void *a, const void *b) {
  const item *x = a, *y = b;
  if (x->key != y->key) return x->key < y->key ? -1 : 1;
  return (x->id > y->id) - (x->id < y->id);
}

/* Sorts n unique items whose keys are below `keys`, which start as `runs` sorted parts (0:
 * none). */
static void compare_with_qsort(int32_t n, uint64_t keys, int32_t runs) {
  item *t = calloc((size_t)n + 1, sizeof *t);
  uint64_t *key = calloc((size_t)n + 1, sizeof *key), *id = calloc((size_t)n + 1, sizeof *id);
  int32_t *index = calloc((size_t)n + 1, sizeof *index);
  uint64_t seed = 99;
  for (int32_t i = 0; i < n; i++)
    t[i] = (item){(uint64_t)(cloud_random(&seed) * 0x1p63) % keys, UINT64_MAX - (uint64_t)i * 7,
                  0};
  for (int32_t r = 0; r < runs; r++)
    qsort(t + (int64_t)n * r / runs,
          (size_t)((int64_t)n * (r + 1) / runs - (int64_t)n * r / runs), sizeof *t, compare);
  for (int32_t i = 0; i < n; i++) {
    t[i].index = i;
    key[i] = t[i].key;
    id[i] = t[i].id;
  }
  index[n] = -5;
  ck_assert_int_eq(wend_order(&team, n, key, id, index), WEND_OK);
  ck_assert_int_eq(index[n], -5);
  qsort(t, (size_t)n, sizeof *t, compare);
  for (int32_t i = 0; i < n; i++) ck_assert_int_eq(index[i], t[i].index);
  free(t);
  free(key);
  free(id);
  free(index);
}

START_TEST(order_is_that_of_qsort) {
  const int32_t sizes[] = {0, 1, 2, 3, 7, 64, 1000, 40001};
  const uint64_t keys[] = {1, 2, 100, UINT64_C(1) << 63};
  for (int s = 0; s < 8; s++)
    for (int k = 0; k < 4; k++)
      for (int32_t runs = 0; runs < 6; runs++) compare_with_qsort(sizes[s], keys[k], runs);
}
END_TEST

START_TEST(no_memory_is_an_error) {
  const uint64_t key[3] = {3, 2, 1}, id[3] = {1, 2, 3};
  int32_t index[3];
  team.allocate = spread_allocate;
  for (int number = 0; number < 2; number++) {
    spread_break(number);
    ck_assert_int_eq(wend_order(&team, 3, key, id, index), WEND_ERR_MEMORY);
    team.status = WEND_OK;
  }
  spread_break(-1);
  ck_assert_int_eq(wend_order(&team, 3, key, id, index), WEND_OK);
}
END_TEST

int main(void) {
  Suite *suite = suite_create("order");
  TCase *tc = tcase_create("order");
  tcase_add_test(tc, order_is_that_of_qsort);
  tcase_add_test(tc, no_memory_is_an_error);
  suite_add_tcase(suite, tc);
  SRunner *runner = srunner_create(suite);
  srunner_set_fork_status(runner, CK_NOFORK);
  srunner_run_all(runner, CK_NORMAL);
  const int failed = srunner_ntests_failed(runner);
  srunner_free(runner);
  return failed != 0;
}
