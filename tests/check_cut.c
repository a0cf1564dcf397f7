/* SPDX-License-Identifier: GPL-3.0-or-later
 * check_cut.c: the cut is sorted, complete, level, the same from any start; failures change
 * nothing. */
#include "cut.h"
#include "hilbert.h"
#include "spread.h"

#include <check.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum { KINDS = 10, PARTICLES = 700 };

static wend_team team;

/* The particles of all ranks, rank after rank. */
typedef struct gathered {
  int n;
  int *count, *first; /* [size] */
  uint64_t *key, *id;
  double *column[WEND_COLUMNS];
} gathered;

static void *gather_column(const gathered *g, int n, const void *mine) {
  uint64_t *all = calloc((size_t)g->n + 1, sizeof *all);
  MPI_Allgatherv(mine, n, MPI_UINT64_T, all, g->count, g->first, MPI_UINT64_T, team.comm);
  return all;
}

static gathered gather(const wend_particles *p) {
  gathered g = {.count = calloc((size_t)team.size, sizeof(int)),
                .first = calloc((size_t)team.size, sizeof(int))};
  const int n = p->n;
  MPI_Allgather(&n, 1, MPI_INT, g.count, 1, MPI_INT, team.comm);
  for (int r = 0; r < team.size; r++) {
    g.first[r] = g.n;
    g.n += g.count[r];
  }
  g.key = gather_column(&g, n, p->key);
  g.id = gather_column(&g, n, p->id);
  for (int c = 0; c < WEND_COLUMNS; c++)
    if (p->column[c] != NULL) g.column[c] = gather_column(&g, n, p->column[c]);
  return g;
}

static void gathered_free(gathered *g) {
  free(g->count);
  free(g->first);
  free(g->key);
  free(g->id);
  for (int c = 0; c < WEND_COLUMNS; c++) free(g->column[c]);
}

static bool is_sorted(const gathered *g) {
  for (int k = 1; k < g->n; k++)
    if (g->key[k] < g->key[k - 1] || (g->key[k] == g->key[k - 1] && g->id[k] <= g->id[k - 1]))
      return false;
  return true;
}

/* Sorted ids are unique, so as many ids of the set as it has particles are all of them. */
static bool is_the_set(const gathered *g, const spread *s) {
  if (g->n != s->n) return false;
  for (int k = 0; k < g->n; k++) {
    const int32_t i = spread_index(g->id[k]);
    if (i < 0 || i >= s->n) return false;
    uint64_t key;
    wend_hilbert_keys(&s->domain, 1, (const double(*)[4])s->place[i], &key);
    if (key != g->key[k]) return false;
    for (int c = 0; c < WEND_COLUMNS; c++)
      if (g->column[c] != NULL && g->column[c][k] != spread_value(s, (wend_column)c, i))
        return false;
  }
  return g->column[WEND_X] && g->column[WEND_SUPPORT] && g->column[WEND_SOURCE];
}

static uint32_t weight_of(int32_t i, int which) {
  return which == 0 ? 1 : which == 1 ? 1 + (uint32_t)i % 97 : i % 50 == 0 ? 4000000000u : 1;
}

/* Keys belong to one rank, so a cut may miss its place by half of what one key value weighs,
 * and by one more for whole numbers. */
static bool is_level(const gathered *g, int which) {
  int64_t total = 0, group = 0, heaviest = 0;
  for (int k = 0; k < g->n; k++) {
    const uint32_t w = weight_of(spread_index(g->id[k]), which);
    total += w;
    group = (k > 0 && g->key[k] == g->key[k - 1] ? group : 0) + w;
    if (group > heaviest) heaviest = group;
  }
  int64_t before = 0;
  for (int r = 1; r < team.size; r++) {
    for (int k = g->first[r - 1]; k < g->first[r]; k++)
      before += weight_of(spread_index(g->id[k]), which);
    const double ideal = (double)total * r / team.size;
    if (fabs((double)before - ideal) > 0.5 * (double)heaviest + 1) return false;
    if (g->count[r] > 0 && g->first[r] > 0 && g->key[g->first[r]] == g->key[g->first[r] - 1])
      return false;
  }
  return true;
}

static bool same_sequence(const gathered *a, const gathered *b) {
  return a->n == b->n && memcmp(a->id, b->id, (size_t)a->n * sizeof *a->id) == 0 &&
         memcmp(a->count, b->count, (size_t)team.size * sizeof *a->count) == 0;
}

static wend_status cut(const spread *s, wend_particles *p, int which) {
  uint32_t *weight = which == 0 ? NULL : calloc((size_t)p->n + 1, sizeof *weight);
  for (int32_t i = 0; i < p->n && weight != NULL; i++)
    weight[i] = weight_of(spread_index(p->id[i]), which);
  const wend_status status = wend_cut_particles(&team, &s->domain, p, weight);
  free(weight);
  return status;
}

/* Every way of dealing out the same set must end in the same cut; one that is cut already
 * stays. */
static void compare_starts(const spread *s, int which) {
  gathered reference = {0};
  for (int way = 0; way < SPREAD_WAYS; way++) {
    wend_particles p = spread_particles(&team, s, (spread_way)way);
    if (way == 0) ck_assert(spread_everywhere(cut(s, &p, which) == WEND_OK));
    if (way == 0) reference = gather(&p);
    ck_assert(spread_everywhere(cut(s, &p, which) == WEND_OK));
    gathered g = gather(&p);
    ck_assert(spread_everywhere(is_sorted(&g)));
    ck_assert(spread_everywhere(is_the_set(&g, s)));
    ck_assert(spread_everywhere(is_level(&g, which)));
    ck_assert(spread_everywhere(same_sequence(&reference, &g)));
    gathered_free(&g);
    wend_particles_reset(&p);
  }
  gathered_free(&reference);
}

START_TEST(cut_is_sorted_complete_level_and_unique) {
  for (int which = 0; which < 3; which++) {
    spread s = spread_create(_i, 2 + (_i + which) % 2, which == 1 ? 0 : 7, PARTICLES, 11);
    compare_starts(&s, which);
    spread_destroy(&s);
  }
}
END_TEST

START_TEST(fewer_particles_than_ranks) {
  for (int32_t n = 1; n < 4; n++) {
    spread s = spread_create(0, 3, 7, n, 5);
    compare_starts(&s, 0);
    spread_destroy(&s);
  }
}
END_TEST

/* A copy of the table's bytes, to see that nothing changed. */
typedef struct snapshot {
  wend_particles pointers, copy;
} snapshot;

static snapshot take(const wend_particles *p) {
  snapshot shot = {*p, {0}};
  wend_particles_init(&team, &shot.copy, p->n, wend_particles_mask(p));
  if (p->n > 0) memcpy(shot.copy.id, p->id, (size_t)p->n * sizeof *p->id);
  for (int c = 0; c < WEND_COLUMNS; c++)
    if (p->column[c] != NULL)
      memcpy(shot.copy.column[c], p->column[c], (size_t)p->n * sizeof(double));
  return shot;
}

static bool unchanged(snapshot *shot, const wend_particles *p) {
  bool same = memcmp(&shot->pointers, p, sizeof *p) == 0;
  if (p->n > 0) same = same && memcmp(shot->copy.id, p->id, (size_t)p->n * sizeof *p->id) == 0;
  for (int c = 0; c < WEND_COLUMNS && same; c++)
    if (p->column[c] != NULL)
      same = memcmp(shot->copy.column[c], p->column[c], (size_t)p->n * sizeof(double)) == 0;
  wend_particles_reset(&shot->copy);
  return same;
}

/* The cut must fail everywhere alike, with `word` in its text, and leave the table alone. */
static void must_fail(const spread *s, wend_particles *p, wend_status expected,
                      const char *word) {
  snapshot shot = take(p);
  const wend_status status = wend_cut_particles(&team, &s->domain, p, NULL);
  ck_assert(spread_everywhere(status == expected));
  ck_assert(spread_same_text(team.text));
  ck_assert_msg(strstr(team.text, word) != NULL, "no '%s' in: %s", word, team.text);
  ck_assert(spread_everywhere(unchanged(&shot, p)));
}

START_TEST(id_used_twice_is_named) {
  spread s = spread_create(0, 3, 7, PARTICLES, 3);
  char word[32];
  for (int way = 0; way < SPREAD_WAYS; way++) {
    wend_particles p = spread_particles(&team, &s, (spread_way)way);
    for (int32_t i = 0; i < p.n; i++)
      if (p.id[i] == spread_id(PARTICLES - 1)) p.id[i] = spread_id(1);
    snprintf(word, sizeof word, "%llu", (unsigned long long)spread_id(1));
    must_fail(&s, &p, WEND_ERR_PARTICLES, word);
    wend_particles_reset(&p);
  }
  spread_destroy(&s);
}
END_TEST

START_TEST(ids_at_both_ends_of_64_bits) {
  spread s = spread_create(0, 3, 7, PARTICLES, 3);
  wend_particles p = spread_particles(&team, &s, SPREAD_TURNS);
  for (int32_t i = 0; i < p.n; i++)
    if (p.id[i] == spread_id(0))
      p.id[i] = 0;
    else if (p.id[i] == spread_id(7))
      p.id[i] = UINT64_MAX;
  ck_assert(spread_everywhere(wend_cut_particles(&team, &s.domain, &p, NULL) == WEND_OK));
  for (int32_t i = 0; i < p.n; i++)
    if (p.id[i] == spread_id(9)) p.id[i] = UINT64_MAX;
  must_fail(&s, &p, WEND_ERR_PARTICLES, "18446744073709551615");
  wend_particles_reset(&p);
  spread_destroy(&s);
}
END_TEST

START_TEST(place_outside_is_named) {
  const double wrong[] = {-1e-300, 1.0, 1.0 + 1e-15, NAN, INFINITY};
  spread s = spread_create(0, 3, 1, PARTICLES, 3);
  char word[32];
  snprintf(word, sizeof word, "%llu", (unsigned long long)spread_id(500));
  for (size_t k = 0; k < sizeof wrong / sizeof wrong[0]; k++)
    for (int a = 0; a < 3; a++) {
      wend_particles p = spread_particles(&team, &s, SPREAD_RANDOM);
      for (int32_t i = 0; i < p.n; i++)
        if (p.id[i] == spread_id(500)) p.column[a][i] = wrong[k];
      const bool fine =
          wrong[k] == 1.0 && a > 0; /* the upper face of an axis that does not wrap */
      if (fine)
        ck_assert(spread_everywhere(wend_cut_particles(&team, &s.domain, &p, NULL) == WEND_OK));
      else
        must_fail(&s, &p, WEND_ERR_PARTICLES, word);
      wend_particles_reset(&p);
    }
  spread_destroy(&s);
}
END_TEST

START_TEST(no_particles_at_all) {
  spread s = spread_create(0, 2, 3, 0, 3);
  wend_particles p = spread_particles(&team, &s, SPREAD_TURNS);
  must_fail(&s, &p, WEND_ERR_PARTICLES, "no particles");
  wend_particles_reset(&p);
  spread_destroy(&s);
}
END_TEST

START_TEST(columns_must_agree) {
  spread s = spread_create(0, 2, 3, PARTICLES, 3);
  wend_particles p = spread_particles(&team, &s, SPREAD_TURNS);
  if (team.rank == team.size - 1) wend_particles_add(&team, &p, WEND_KPAR);
  if (team.size > 1) must_fail(&s, &p, WEND_ERR_ARGUMENT, "different columns");
  free(p.column[WEND_KPAR]);
  free(p.column[WEND_Z]); /* need not be there in 2-D */
  p.column[WEND_KPAR] = p.column[WEND_Z] = NULL;
  ck_assert(spread_everywhere(wend_cut_particles(&team, &s.domain, &p, NULL) == WEND_OK));
  s.domain.dim = 3;
  must_fail(&s, &p, WEND_ERR_ARGUMENT, "no positions");
  wend_particles_reset(&p);
  spread_destroy(&s);
}
END_TEST

/* Every single allocation fails once, on the last rank: all ranks must learn of it. */
START_TEST(failing_allocations_change_nothing) {
  spread s = spread_create(0, 3, 7, PARTICLES, 3);
  wend_particles p = spread_particles(&team, &s, SPREAD_TURNS);
  wend_status status = WEND_ERR_MEMORY;
  int number = 0;
  for (; status == WEND_ERR_MEMORY; number++) {
    snapshot shot = take(&p);
    if (team.rank == team.size - 1) spread_break(number);
    status = wend_cut_particles(&team, &s.domain, &p, NULL);
    spread_break(-1);
    const bool same = unchanged(&shot, &p);
    ck_assert(spread_everywhere(status == WEND_OK || (status == WEND_ERR_MEMORY && same)));
    ck_assert(!spread_everywhere(status == WEND_OK) || spread_everywhere(!same));
    ck_assert(spread_same_text(wend_status_text(status)));
  }
  ck_assert(spread_everywhere(status == WEND_OK));
  ck_assert(spread_everywhere(team.rank < team.size - 1 || number > 30));
  wend_particles_reset(&p);
  spread_destroy(&s);
}
END_TEST

int main(int count, char **arguments) {
  MPI_Init(&count, &arguments);
  wend_team_init(&team, MPI_COMM_WORLD);
  team.allocate = spread_allocate;
  Suite *suite = suite_create("cut");
  TCase *tc = tcase_create("cut");
  tcase_add_loop_test(tc, cut_is_sorted_complete_level_and_unique, 0, KINDS);
  tcase_add_test(tc, fewer_particles_than_ranks);
  tcase_add_test(tc, id_used_twice_is_named);
  tcase_add_test(tc, ids_at_both_ends_of_64_bits);
  tcase_add_test(tc, place_outside_is_named);
  tcase_add_test(tc, no_particles_at_all);
  tcase_add_test(tc, columns_must_agree);
  tcase_add_test(tc, failing_allocations_change_nothing);
  suite_add_tcase(suite, tc);
  SRunner *runner = srunner_create(suite);
  srunner_set_fork_status(runner, CK_NOFORK);
  srunner_run_all(runner, team.rank == 0 ? CK_NORMAL : CK_SILENT);
  const int failed = srunner_ntests_failed(runner);
  srunner_free(runner);
  wend_team_reset(&team);
  MPI_Finalize();
  return failed != 0;
}
