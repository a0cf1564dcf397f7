/* SPDX-License-Identifier: GPL-3.0-or-later
 * check_merge.c: the merged line is sorted, holds everything once, and knows its rows. */
#include "cloud.h"
#include "merge.h"
#include "order.h"
#include "spread.h"

#include <check.h>
#include <stdlib.h>
#include <string.h>

static wend_team team;

/* Owned particles in canonical order, then three peers' ghosts in canonical order each. */
typedef struct stored {
  int32_t owned, ghosts;
  uint64_t *key, *id;
} stored;

/* share: part of the line that is owned; stretch: particles in a row with one owner. */
static stored stored_create(int32_t n, double share, int32_t stretch, uint64_t keys) {
  stored s = {.key = calloc((size_t)n + 1, sizeof *s.key),
              .id = calloc((size_t)n + 1, sizeof *s.id)};
  uint64_t *key = calloc((size_t)n + 1, sizeof *key), *id = calloc((size_t)n + 1, sizeof *id);
  int32_t *order = calloc((size_t)n + 1, sizeof *order);
  int *owner = calloc((size_t)n + 1, sizeof *owner);
  uint64_t seed = 4;
  for (int32_t i = 0; i < n; i++) {
    key[i] = (uint64_t)(cloud_random(&seed) * 0x1p62) % keys;
    id[i] = spread_id(i);
  }
  wend_order(&team, n, key, id, order);
  for (int32_t k = 0; k < n; k++) {
    const bool same = k > 0 && k % stretch != 0;
    const double r = cloud_random(&seed);
    owner[k] = same ? owner[k - 1] : r < share ? 0 : 1 + (int)(r * 1000) % 3;
  }
  int32_t out = 0;
  for (int r = 0; r < 4; r++) {
    for (int32_t k = 0; k < n; k++) {
      if (owner[k] != r) continue;
      s.key[out] = key[order[k]];
      s.id[out++] = id[order[k]];
    }
    if (r == 0) s.owned = out;
  }
  s.ghosts = out - s.owned;
  free(key);
  free(id);
  free(order);
  free(owner);
  return s;
}

static void check_line(const stored *s) {
  wend_merge m;
  const int32_t n = s->owned + s->ghosts;
  char *seen = calloc((size_t)n + 1, 1);
  ck_assert_int_eq(wend_merge_init(&team, s->owned, s->ghosts, s->key, s->id, &m), WEND_OK);
  ck_assert_int_eq(m.n, n);
  ck_assert_int_eq(m.rows, s->owned);
  for (int32_t k = 0; k < n; k++) {
    const int32_t here = m.store[k];
    ck_assert(here >= 0 && here < n && !seen[here]);
    seen[here] = 1;
    if (k == 0) continue;
    const int32_t last = m.store[k - 1];
    ck_assert(s->key[last] < s->key[here] ||
              (s->key[last] == s->key[here] && s->id[last] < s->id[here]));
  }
  for (int32_t r = 0; r < m.rows; r++) {
    ck_assert_int_eq(m.store[m.row[r]], r);
    ck_assert(r == 0 || m.row[r] > m.row[r - 1]);
  }
  free(seen);
  wend_merge_reset(&m);
  ck_assert_ptr_null(m.store);
}

START_TEST(line_is_sorted_and_complete) {
  const int32_t sizes[] = {0, 1, 2, 50, 3000};
  const double shares[] = {0, 0.02, 0.5, 1};
  for (int a = 0; a < 5; a++)
    for (int b = 0; b < 4; b++)
      for (int32_t stretch = 1; stretch < 300; stretch *= 17)
        for (uint64_t keys = 1; keys < UINT64_C(1) << 60; keys *= 1000) {
          stored s = stored_create(sizes[a], shares[b], stretch, keys);
          check_line(&s);
          free(s.key);
          free(s.id);
        }
}
END_TEST

START_TEST(gather_follows_the_line) {
  stored s = stored_create(100, 0.5, 3, 1000);
  const int32_t n = s.owned + s.ghosts;
  double *from = calloc((size_t)n * 3, sizeof *from), *to = calloc((size_t)n * 3, sizeof *to);
  wend_merge m;
  for (int32_t i = 0; i < 3 * n; i++) from[i] = i;
  ck_assert_int_eq(wend_merge_init(&team, s.owned, s.ghosts, s.key, s.id, &m), WEND_OK);
  wend_merge_gather(&m, 3, from, to);
  for (int32_t k = 0; k < n; k++)
    for (int c = 0; c < 3; c++) ck_assert(to[3 * k + c] == 3 * m.store[k] + c);
  wend_merge_reset(&m);
  free(from);
  free(to);
  free(s.key);
  free(s.id);
}
END_TEST

START_TEST(owned_out_of_order_is_an_error) {
  stored s = stored_create(100, 0.5, 3, 1000);
  wend_merge m;
  s.id[1] = s.id[0] - 1;
  s.key[1] = s.key[0];
  ck_assert_int_eq(wend_merge_init(&team, s.owned, s.ghosts, s.key, s.id, &m),
                   WEND_ERR_ARGUMENT);
  ck_assert_ptr_nonnull(strstr(team.text, "out of order"));
  team.status = WEND_OK;
  wend_merge_reset(&m);
  free(s.key);
  free(s.id);
}
END_TEST

START_TEST(no_memory_is_an_error) {
  stored s = stored_create(100, 0.5, 3, 1000);
  wend_merge m;
  for (int number = 0; number < 4; number++) {
    spread_break(number);
    ck_assert_int_eq(wend_merge_init(&team, s.owned, s.ghosts, s.key, s.id, &m),
                     WEND_ERR_MEMORY);
    spread_break(-1);
    wend_merge_reset(&m);
    team.status = WEND_OK;
  }
  check_line(&s);
  free(s.key);
  free(s.id);
}
END_TEST

int main(void) {
  team.allocate = spread_allocate;
  Suite *suite = suite_create("merge");
  TCase *tc = tcase_create("merge");
  tcase_add_test(tc, line_is_sorted_and_complete);
  tcase_add_test(tc, gather_follows_the_line);
  tcase_add_test(tc, owned_out_of_order_is_an_error);
  tcase_add_test(tc, no_memory_is_an_error);
  suite_add_tcase(suite, tc);
  SRunner *runner = srunner_create(suite);
  srunner_set_fork_status(runner, CK_NOFORK);
  srunner_run_all(runner, CK_NORMAL);
  const int failed = srunner_ntests_failed(runner);
  srunner_free(runner);
  return failed != 0;
}
