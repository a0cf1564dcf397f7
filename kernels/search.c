/* SPDX-License-Identifier: LGPL-3.0-or-later
 * search.c: lists of pairs, slice after slice.
 *
 * The predicate r^2 < max(H_i, H_j)^2 is the same bits from both ends: differences are odd
 * functions and the squares are summed in the order of the axes. */
#include "search.h"

#include "walk.h"

/* r^2 of two places, unshifted positions and minimum image. */
static inline double distance2(const wend_domain *d, const double *a, const double *b) {
  double r2 = 0.0;
  for (int axis = 0; axis < 3; axis++) {
    const double dx = wend_domain_wrap(d, axis, b[axis] - a[axis]);
    r2 += dx * dx;
  }
  return r2;
}

/* Lists one row from entry 0 on, into every eighth place of list; counts on beyond `width`. */
static int32_t list_row(const wend_search *s, int32_t self, int32_t *restrict list,
                        int64_t width) {
  const double *place = s->place[self];
  wend_walk walk = wend_walk_begin(s->tree, s->domain, true);
  wend_walk_add(&walk, place);
  int32_t count = 0;
  for (int32_t leaf; (leaf = wend_walk_next(&walk)) >= 0;) {
    const int32_t begin = leaf * WEND_LEAF;
    const int32_t end = s->tree->n - begin < WEND_LEAF ? s->tree->n : begin + WEND_LEAF;
    for (int32_t j = begin; j < end; j++) {
      const double h = s->place[j][3] > place[3] ? s->place[j][3] : place[3];
      if (!(distance2(s->domain, place, s->place[j]) < h * h) || j == self) continue;
      if (count < width) list[(int64_t)WEND_LANES * count] = s->store[j];
      count++;
    }
  }
  return count;
}

int32_t wend_search_pairs(const wend_search *search, int32_t begin, int32_t *restrict index,
                          int64_t capacity, int64_t *used, int64_t *restrict first,
                          int32_t *restrict count) {
  const int32_t slices = search->rows / WEND_LANES + (search->rows % WEND_LANES != 0);
  for (int32_t slice = begin; slice < slices; slice++) {
    const int64_t room = (capacity - *used) / WEND_LANES;
    int32_t *out = index + *used, *n = count + (int64_t)WEND_LANES * slice;
    int64_t width = 0;
    for (int lane = 0; lane < WEND_LANES; lane++) {
      const int32_t row = slice * WEND_LANES + lane;
      n[lane] = row < search->rows ? list_row(search, search->row[row], out + lane, room) : 0;
      width = n[lane] > width ? n[lane] : width;
    }
    if (width > room) return slice;
    for (int lane = 0; lane < WEND_LANES; lane++) {
      const int32_t row = slice * WEND_LANES + lane;
      for (int64_t m = n[lane]; m < width; m++)
        out[WEND_LANES * m + lane] = row < search->rows ? row : search->rows - 1;
    }
    *used += WEND_LANES * width;
    first[slice + 1] = *used;
  }
  return slices;
}
