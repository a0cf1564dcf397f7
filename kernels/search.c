/* SPDX-License-Identifier: LGPL-3.0-or-later
 * search.c: lists of pairs, slice after slice.
 *
 * One walk serves a group of up to eight slices: the particles near the group are laid out
 * once, each slice narrows them down to the leaves that matter to it, each row again, and only
 * then are particles compared. Rows of very different supports, or far apart, are walked for by
 * themselves, so that a large support costs its own row only. */
#include "search.h"

#include "near.h"

/* A search under way. */
typedef struct work {
  const wend_search *search;
  const wend_near_kit *kit;
  wend_near near;
} work;

/* The list of one row: every eighth place of `at` is its own. */
typedef struct list {
  int32_t *at;
  int64_t room;  /* places there are */
  int64_t count; /* places needed */
} list;

/* Number of the leaf in the collection that holds a particle, from a guess at or below it; -1
 * where it is not there. */
static int32_t slot_of(const wend_near *near, int32_t guess, int32_t self) {
  const int32_t leaf = self / WEND_LEAF, n = near->leaves.n;
  while (guess < n && near->leaf[guess] < leaf) guess++;
  return guess < n && near->leaf[guess] == leaf ? guess : -1;
}

/* Continues a row's list with its pairs among some leaves of the collection. */
static void row_list(work *w, const wend_leaves *leaves, const wend_member *m, int32_t slot,
                     list *list) {
  int32_t slots[WEND_NEAR_LEAVES + 8], hits[WEND_NEAR + 8];
  const int32_t n = w->kit->choose(leaves, m, slots);
  const int32_t own = slot < 0 ? -1 : slot * WEND_LEAF + m->self % WEND_LEAF;
  const float x = wend_near_swap(&w->near, own, INFINITY);
  const int32_t found = w->kit->sieve(&w->near, m, n, slots, hits);
  wend_near_swap(&w->near, own, x);
  const int64_t left = list->room - list->count, kept = found < left ? found : left;
  int32_t *at = list->at + WEND_LANES * list->count;
  for (int64_t k = 0; k < kept; k++) at[WEND_LANES * k] = hits[k];
  list->count += found;
}

/* Continues the lists of rows begin .. end - 1 of one slice, from what is near. */
static void rows_list(work *w, int32_t begin, int32_t end, list *lists) {
  wend_member m[WEND_LANES];
  wend_leaves leaves;
  wend_near_narrow(&w->near, w->kit, end - begin, w->search->row + begin, m, &leaves);
  int32_t slot = 0;
  for (int32_t row = begin; row < end; row++) {
    const int32_t own = slot_of(&w->near, slot, m[row - begin].self);
    slot = own < 0 ? slot : own;
    row_list(w, &leaves, &m[row - begin], own, &lists[row - begin]);
  }
}

/* Lists the rows of one slice group by group, laying out what is near as often as it takes. */
static void slice_list_apart(work *w, int32_t begin, int32_t end, list *lists) {
  for (int32_t row = begin, next; row < end; row = next) {
    wend_walk walk;
    next = row + wend_near_gather(&w->near, end - row, w->search->row + row, &walk);
    for (bool first = true, last = false; !last; first = false) {
      last = wend_near_fill(&w->near, w->kit, &walk, first);
      rows_list(w, row, next, lists + (row - begin));
    }
  }
}

static int32_t slices_of(int32_t rows) { return rows / WEND_LANES + (rows % WEND_LANES != 0); }

/* Pads the lists of a slice to the longest and returns its width. */
static int64_t slice_pad(list *lists, int32_t slice, int32_t rows) {
  int64_t width = 0;
  for (int lane = 0; lane < WEND_LANES; lane++)
    width = lists[lane].count > width ? lists[lane].count : width;
  for (int lane = 0; lane < WEND_LANES && width <= lists[0].room; lane++) {
    const int32_t row = slice * WEND_LANES + lane, own = row < rows ? row : rows - 1;
    for (int64_t m = lists[lane].count; m < width; m++) lists[lane].at[WEND_LANES * m] = own;
  }
  return width;
}

int32_t wend_search_pairs(const wend_search *search, int32_t begin, int32_t *restrict index,
                          int64_t capacity, int64_t *used, int64_t *restrict first,
                          int32_t *restrict count) {
  const int32_t rows = search->rows;
  const int32_t slices = slices_of(rows);
  work w = {.search = search, .kit = wend_near_kit_best()};
  w.near.places = (wend_places){search->domain, search->tree, search->place, search->store};
  w.near.mutual = true;
  int32_t together = begin; /* slices below this one are served by what is laid out */
  for (int32_t slice = begin; slice < slices; slice++) {
    const int32_t row = slice * WEND_LANES, left = rows - row;
    const int32_t end = left < WEND_LANES ? rows : row + WEND_LANES;
    const int32_t group = left < WEND_GROUP ? left : WEND_GROUP;
    if (slice >= together)
      together = slice + slices_of(wend_near_group(&w.near, w.kit, group, search->row + row,
                                                   WEND_LANES));
    list lists[WEND_LANES];
    for (int lane = 0; lane < WEND_LANES; lane++)
      lists[lane] = (list){index + *used + lane, (capacity - *used) / WEND_LANES, 0};
    if (slice < together)
      rows_list(&w, row, end, lists);
    else
      slice_list_apart(&w, row, end, lists);
    const int64_t width = slice_pad(lists, slice, rows);
    if (width > lists[0].room) return slice;
    for (int lane = 0; lane < WEND_LANES; lane++)
      count[WEND_LANES * slice + lane] = (int32_t)lists[lane].count;
    *used += WEND_LANES * width;
    first[slice + 1] = *used;
  }
  return slices;
}
