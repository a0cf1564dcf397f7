/* SPDX-License-Identifier: GPL-3.0-or-later
 * bench_search.c: time of trees, supports and neighbour lists, and of nanoflann on the same
 * set.
 *
 * Usage: bench_search [side] [repetitions]: side^3 particles (default 64) on a lattice jittered
 * by
 * +-0.3 spacings, periodic. Times are processor time, the least of the repetitions. Where the
 * program bench_nanoflann stands beside this one, it runs on the same particles. */
#include "hilbert.h"
#include "near.h"
#include "search.h"
#include "support.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

typedef struct keyed {
  uint64_t key;
  double place[4];
} keyed;

typedef struct set {
  wend_domain domain;
  int32_t n;
  double (*place)[4];
  int32_t *self; /* 0, 1, 2, ...: store and row */
  wend_tree tree;
} set;

/* Seconds and results of one repetition. */
typedef struct times {
  double tree, supports, pairs;
  int64_t entries, slots;
} times;

static double seconds(void) { return (double)clock() / CLOCKS_PER_SEC; }

static int key_order(const void *a, const void *b) {
  const uint64_t ka = ((const keyed *)a)->key, kb = ((const keyed *)b)->key;
  return (ka > kb) - (ka < kb);
}

static void set_fill(set *s, int side) {
  keyed *k = malloc(sizeof *k * (size_t)s->n);
  uint64_t *key = malloc(sizeof *key * (size_t)s->n);
  srand(1);
  for (int32_t i = 0; i < s->n; i++) {
    const int cell[3] = {i % side, i / side % side, i / (side * side)};
    for (int a = 0; a < 3; a++)
      s->place[i][a] = (cell[a] + 0.5 + 0.6 * ((double)rand() / RAND_MAX - 0.5)) / side;
  }
  wend_hilbert_keys(&s->domain, s->n, (const double(*)[4])s->place, key);
  for (int32_t i = 0; i < s->n; i++) {
    k[i].key = key[i];
    memcpy(k[i].place, s->place[i], sizeof k[i].place);
  }
  qsort(k, (size_t)s->n, sizeof *k, key_order);
  for (int32_t i = 0; i < s->n; i++) {
    memcpy(s->place[i], k[i].place, sizeof k[i].place);
    s->self[i] = i;
  }
  free(k);
  free(key);
}

static set set_create(int side) {
  set s = {.n = side * side * side, .domain = {.dim = 3, .thickness = 1.0}};
  for (int a = 0; a < 3; a++) {
    s.domain.hi[a] = s.domain.period[a] = 1.0;
    s.domain.half[a] = 0.5;
  }
  s.place = calloc((size_t)s.n, sizeof *s.place);
  s.self = malloc(sizeof *s.self * (size_t)s.n);
  set_fill(&s, side);
  const size_t boxes = (size_t)wend_tree_boxes(s.n);
  s.tree.lo = calloc(boxes, sizeof *s.tree.lo);
  s.tree.hi = calloc(boxes, sizeof *s.tree.hi);
  return s;
}

/* Supports from trials one level above the estimate for a uniform set. */
static times run(set *s, double *support, int32_t *index, int64_t capacity, int64_t *first,
                 int32_t *count) {
  times t;
  double scratch[4096];
  const double trial = wend_support_level(1.15 * cbrt(48.0 / (4.18879 * s->n)));
  for (int32_t i = 0; i < s->n; i++) s->place[i][3] = trial;
  const wend_search search = {&s->domain, &s->tree, (const double(*)[4])s->place,
                              s->self,    s->self,  s->n};
  t.tree = -seconds();
  wend_tree_build(&s->tree, s->n, search.place, s->tree.lo, s->tree.hi);
  t.tree += seconds();
  t.supports = -seconds();
  const int32_t solved = wend_search_supports(&search, wend_smoothing_find("wendland-c2"), 48.0,
                                              s->n, s->self, support, 4096, scratch);
  t.supports += seconds();
  if (solved != s->n) printf("%d supports of %d solved\n", solved, s->n);
  for (int32_t i = 0; i < s->n; i++) s->place[i][3] = support[i];
  t.pairs = -seconds();
  wend_tree_build(&s->tree, s->n, search.place, s->tree.lo, s->tree.hi);
  t.slots = 0;
  wend_search_pairs(&search, 0, index, capacity, &t.slots, first, count);
  t.pairs += seconds();
  t.entries = 0;
  for (int32_t i = 0; i < s->n; i++) t.entries += count[i];
  return t;
}

static times least(times a, times b) {
  a.tree = fmin(a.tree, b.tree);
  a.supports = fmin(a.supports, b.supports);
  a.pairs = fmin(a.pairs, b.pairs);
  return a;
}

/* Runs nanoflann's program on the same particles: "seconds neighbours" come back. */
static void compare(const set *s, const char *self, int repetitions, const times *t) {
  char path[4096], command[9000];
  snprintf(path, sizeof path, "%s.places", self);
  FILE *file = fopen(path, "wb");
  if (!file) return;
  fwrite(s->place, sizeof *s->place, (size_t)s->n, file);
  fclose(file);
  const char *slash = strrchr(self, '/');
  snprintf(command, sizeof command, "%.*s/bench_nanoflann %s %d 2>&1",
           slash ? (int)(slash - self) : 1, slash ? self : ".", path, repetitions);
  FILE *pipe = popen(command, "r");
  double time, neighbours;
  if (pipe && fscanf(pipe, "%lf %lf", &time, &neighbours) == 2)
    printf("nanoflann, build and search     %8.4f s  %7.2f ns/neighbour  %7.1f M neighbours/s\n"
           "nanoflann over wend             %8.2f in time a neighbour, %.2f in time\n",
           time, 1e9 * time / neighbours, 1e-6 * neighbours / time,
           time / neighbours / (t->pairs / (double)t->entries), time / t->pairs);
  else
    printf("nanoflann: no program bench_nanoflann beside this one\n");
  if (pipe) pclose(pipe);
  remove(path);
}

int main(int argc, char **argv) {
  const int side = argc > 1 ? atoi(argv[1]) : 64, repetitions = argc > 2 ? atoi(argv[2]) : 3;
  set s = set_create(side);
  const size_t slices = ((size_t)s.n + 7) / 8;
  const int64_t capacity = 8 * 64 * (int64_t)slices;
  double *support = malloc(sizeof *support * (size_t)s.n);
  int32_t *index = calloc((size_t)capacity, sizeof *index);
  int32_t *count = calloc(8 * slices, sizeof *count);
  int64_t *first = calloc(slices + 1, sizeof *first);
  times t = run(&s, support, index, capacity, first, count);
  for (int k = 1; k < repetitions; k++)
    t = least(t, run(&s, support, index, capacity, first, count));
  const double n = s.n, entries = (double)t.entries;
  printf("%d particles, %.1f entries a row, %.1f with padding; kit: %s\n", s.n, entries / n,
         (double)t.slots / n, wend_near_kit_best()->name);
  printf("tree                            %8.4f s  %7.2f ns/particle\n", t.tree,
         1e9 * t.tree / n);
  printf("supports                        %8.4f s  %7.1f ns/particle  %5.1f M neighbours/s\n",
         t.supports, 1e9 * t.supports / n, 1e-6 * entries / t.supports);
  printf("tree and lists                  %8.4f s  %7.2f ns/neighbour  %7.1f M neighbours/s\n",
         t.pairs, 1e9 * t.pairs / entries, 1e-6 * entries / t.pairs);
  compare(&s, argv[0], repetitions, &t);
  free(s.place);
  free(s.self);
  free(s.tree.lo);
  free(s.tree.hi);
  free(support);
  free(index);
  free(count);
  free(first);
  return 0;
}
