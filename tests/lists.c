/* SPDX-License-Identifier: GPL-3.0-or-later
 * lists.c: random particles and their neighbour lists by brute force. */
#include "lists.h"

#include "cloud.h"

#include <math.h>
#include <stdlib.h>

wend_domain lists_box(int dim, unsigned periodic) {
  wend_domain box = {.dim = dim, .thickness = 1.0};
  for (int a = 0; a < 3; a++) {
    const bool wraps = a < dim && (periodic >> a & 1u) != 0;
    box.lo[a] = a < dim ? -1.0 : 0.0;
    box.hi[a] = a < dim ? 1.0 : 0.0;
    box.period[a] = wraps ? 2.0 : 0.0;
    box.half[a] = wraps ? 1.0 : INFINITY;
  }
  return box;
}

lists lists_create(wend_domain domain, int32_t n) {
  lists l = {.domain = domain, .n = n};
  l.place = calloc((size_t)n + 1, sizeof *l.place);
  return l;
}

void lists_scatter(lists *l, double support, uint64_t seed) {
  for (int32_t i = 0; i < l->n; i++) {
    for (int a = 0; a < l->domain.dim; a++)
      l->place[i][a] =
          l->domain.lo[a] + cloud_random(&seed) * (l->domain.hi[a] - l->domain.lo[a]);
    l->place[i][3] = support * (2.0 + 2.0 * cloud_random(&seed)) / 3.0;
  }
}

/* Of the direct difference and the two images beside it, the shortest. */
static double distance(const lists *l, int32_t i, int32_t j) {
  double r2 = 0.0;
  for (int a = 0; a < l->domain.dim; a++) {
    const double d = l->place[j][a] - l->place[i][a], p = l->domain.period[a];
    const double least = fmin(fabs(d), fmin(fabs(d - p), fabs(d + p)));
    r2 += least * least;
  }
  return sqrt(r2);
}

static bool is_pair(const lists *l, int32_t i, int32_t j) {
  return i != j && distance(l, i, j) < fmax(l->place[i][3], l->place[j][3]);
}

static void drop_pairs(lists *l) {
  free((void *)l->pairs.first);
  free((void *)l->pairs.count);
  free((void *)l->pairs.index);
  free((void *)l->all.list);
  l->pairs = (wend_pairs){0};
  l->all = (wend_slices){0};
}

void lists_find(lists *l, int32_t rows, int32_t extra) {
  const int32_t slices = (rows + WEND_LANES - 1) / WEND_LANES;
  drop_pairs(l);
  int64_t *first = calloc((size_t)slices + 1, sizeof *first);
  int32_t *count = calloc((size_t)slices * WEND_LANES + 1, sizeof *count);
  int32_t *list = calloc((size_t)slices + 1, sizeof *list);
  for (int32_t s = 0; s < slices; s++) {
    int32_t most = 0;
    list[s] = s;
    for (int32_t i = s * WEND_LANES; i < (s + 1) * WEND_LANES && i < rows; i++) {
      for (int32_t j = 0; j < l->n; j++) count[i] += is_pair(l, i, j);
      most = count[i] > most ? count[i] : most;
    }
    first[s + 1] = first[s] + (int64_t)WEND_LANES * (most + extra);
  }
  int32_t *index = calloc((size_t)first[slices] + 1, sizeof *index);
  l->pairs = (wend_pairs){rows, slices, first, count, index};
  l->all = (wend_slices){slices, list};
  for (int32_t i = 0; i < slices * WEND_LANES; i++) {
    const int32_t width = wend_pairs_width(&l->pairs, i / WEND_LANES);
    int32_t m = 0;
    for (int32_t j = 0; i < rows && j < l->n; j++)
      if (is_pair(l, i, j)) index[wend_pairs_entry(&l->pairs, i, m++)] = j;
    while (m < width) index[wend_pairs_entry(&l->pairs, i, m++)] = i < rows ? i : rows - 1;
  }
}

void lists_destroy(lists *l) {
  drop_pairs(l);
  free(l->place);
}
