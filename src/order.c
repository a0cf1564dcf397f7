/* SPDX-License-Identifier: LGPL-3.0-or-later
 * order.c: the canonical order of particles, by a natural merge sort.
 *
 * Neighbouring ascending runs are merged pairwise until one is left. Particles move little
 * between cuts and arrive from other ranks in sorted parts, so there are few runs. */
#include "order.h"
#include <stdlib.h>
#include <string.h>

typedef struct entry {
  uint64_t key, id;
  int32_t index;
} entry;

static bool before(const entry *a, const entry *b) {
  return a->key < b->key || (a->key == b->key && a->id < b->id);
}

static int32_t run_end(const entry *e, int32_t start, int32_t n) {
  int32_t end = start < n ? start + 1 : n;
  while (end < n && !before(&e[end], &e[end - 1])) end++;
  return end;
}

/* Merges [start, middle) and [middle, end) of `from` into the same range of `to`. */
static void merge_runs(const entry *restrict from, int32_t start, int32_t middle, int32_t end,
                       entry *restrict to) {
  int32_t a = start, b = middle, out = start;
  while (a < middle && b < end) to[out++] = before(&from[b], &from[a]) ? from[b++] : from[a++];
  memcpy(to + out, from + a, (size_t)(middle - a) * sizeof *to);
  out += middle - a;
  memcpy(to + out, from + b, (size_t)(end - b) * sizeof *to);
}

/* Halves the number of runs; returns how many are left. */
static int32_t merge_pass(int32_t n, const entry *restrict from, entry *restrict to) {
  int32_t runs = 0;
  for (int32_t start = 0, end; start < n; start = end, runs++) {
    const int32_t middle = run_end(from, start, n);
    end = run_end(from, middle, n);
    merge_runs(from, start, middle, end, to);
  }
  return runs;
}

wend_status wend_order(wend_team *team, int32_t n, const uint64_t *key, const uint64_t *id,
                       int32_t *index) {
  entry *from = wend_allocate(team, n, sizeof *from);
  entry *to = wend_allocate(team, n, sizeof *to);
  if (n <= 0 || from == NULL || to == NULL) goto done;
  for (int32_t i = 0; i < n; i++) from[i] = (entry){key[i], id[i], i};
  if (run_end(from, 0, n) < n) {
    int32_t runs;
    do {
      runs = merge_pass(n, from, to);
      entry *const sorted = to;
      to = from;
      from = sorted;
    } while (runs > 1);
  }
  for (int32_t i = 0; i < n; i++) index[i] = from[i].index;
done:
  free(to);
  free(from);
  return team->status;
}
