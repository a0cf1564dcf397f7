/* SPDX-License-Identifier: LGPL-3.0-or-later
 * search.c: lists of pairs, slice after slice.
 *
 * One walk serves a group of up to eight slices. Particles of the leaves it meets are laid side
 * by side in single precision, and each row compares itself with those in leaves that it
 * reaches, in a loop without branches. What single precision cannot decide (a few pairs in
 * 10^5) is decided by r^2 < max(H_i, H_j)^2 in double precision, the same bits from both ends:
 * differences are odd functions, and squares are summed in the order of the axes. Rows of very
 * different supports, or far apart, are walked for by themselves, so that the largest support
 * costs its own row only. */
#include "search.h"

#include "clones.h"
#include "leaves.h"

#define GROUP_SLICES 8
#define GROUP_EXTENT 4.0 /* a group is no wider than so many of its smallest support, ... */
#define GROUP_RATIO 4.0  /* ... and its supports differ by no more than this factor */
#define NEAR (WEND_NEAR_LEAVES * WEND_LEAF)

/* What rows of a group search through. */
typedef struct vicinity {
  wend_frame frame;
  wend_leaves leaves;
  float x[3][NEAR]; /* particles of the leaves, scaled and about the centre */
  float h2[NEAR], slack[NEAR];
  int32_t store[NEAR];
} vicinity;

/* One row: its place in the group's frame, and its list so far. */
typedef struct lister {
  int32_t self;
  float x[3], h2;
  int32_t *list; /* every eighth place is its own */
  int64_t room;  /* places there are */
  int64_t count; /* places needed */
} lister;

/* r^2 of two places, unshifted positions and minimum image. */
static inline double distance2(const wend_domain *d, const double *a, const double *b) {
  double r2 = 0.0;
  for (int axis = 0; axis < 3; axis++) {
    const double dx = wend_domain_wrap(d, axis, b[axis] - a[axis]);
    r2 += dx * dx;
  }
  return r2;
}

/* The predicate itself. */
static inline bool is_pair(const wend_search *s, int32_t i, int32_t j) {
  const double *a = s->place[i], *b = s->place[j];
  const double h = a[3] > b[3] ? a[3] : b[3];
  return distance2(s->domain, a, b) < h * h;
}

/* Lays the particles of leaf number k of the vicinity side by side; a leaf that is not full
 * ends with particles infinitely far away. */
static void leaf_load(const wend_search *s, vicinity *v, int32_t k) {
  const wend_frame *f = &v->frame;
  const int32_t begin = v->leaves.leaf[k] * WEND_LEAF, at = k * WEND_LEAF;
  const int32_t n = s->tree->n - begin < WEND_LEAF ? s->tree->n - begin : WEND_LEAF;
  float q[WEND_LEAF] = {0.0f};
  for (int32_t j = 0; j < n; j++) {
    const double *place = s->place[begin + j];
    for (int a = 0; a < 3; a++)
      v->x[a][at + j] =
          (float)(wend_domain_wrap(s->domain, a, place[a] - f->centre[a]) * f->scale);
    q[j] = (float)(place[3] * f->scale);
    v->store[at + j] = s->store[begin + j];
  }
  for (int32_t j = 0; j < WEND_LEAF; j++) {
    v->h2[at + j] = q[j] * q[j];
    v->slack[at + j] = (float)wend_frame_slack(f, q[j]);
  }
  for (int32_t j = n; j < WEND_LEAF; j++) {
    v->x[0][at + j] = v->x[1][at + j] = v->x[2][at + j] = INFINITY;
    v->store[at + j] = -1;
  }
}

/* Collects the next leaves of a walk; false where some are left. */
static bool vicinity_fill(const wend_search *s, wend_walk *walk, vicinity *v) {
  wend_leaves_collect(walk, &v->frame, &v->leaves);
  for (int32_t k = 0; k < v->leaves.n; k++) leaf_load(s, v, k);
  return walk->level < 0;
}

static lister row_begin(const wend_search *s, const wend_frame *f, int32_t row) {
  lister r = {.self = s->row[row]};
  const double *place = s->place[r.self], q = place[3] * f->scale;
  for (int a = 0; a < 3; a++) r.x[a] = (float)((place[a] - f->centre[a]) * f->scale);
  r.h2 = (float)(q * q);
  return r;
}

/* d = r^2 - max(H_i, H_j)^2 for the particles of n leaves. Tells whether any is too close to
 * call. */
WEND_CLONES
static int compare(const vicinity *restrict v, int32_t n, const int32_t *restrict slot,
                   const float *restrict at, float h2, float *restrict d) {
  int32_t close[WEND_LEAF] = {0}, any = 0;
  for (int32_t m = 0; m < n; m++) {
    const int32_t k = slot[m] * WEND_LEAF;
#pragma GCC unroll 1 /* else gcc unrolls the particles and vectorises over leaves */
    for (int32_t j = 0; j < WEND_LEAF; j++) {
      const float x = v->x[0][k + j] - at[0];
      const float y = v->x[1][k + j] - at[1];
      const float z = v->x[2][k + j] - at[2];
      const float r2 = v->h2[k + j] > h2 ? v->h2[k + j] : h2;
      const float over = x * x + y * y + z * z - r2;
      d[m * WEND_LEAF + j] = over;
      close[j] |= !(fabsf(over) > v->slack[k + j]);
    }
  }
  for (int32_t j = 0; j < WEND_LEAF; j++) any |= close[j];
  return any;
}

/* Decides what is too close to call. */
static void decide(const wend_search *s, const vicinity *v, int32_t n, const int32_t *slot,
                   int32_t self, float *d) {
  for (int32_t m = 0; m < n * WEND_LEAF; m++) {
    const int32_t k = slot[m / WEND_LEAF], lane = m % WEND_LEAF;
    const int32_t j = v->leaves.leaf[k] * WEND_LEAF + lane;
    if (!(fabsf(d[m]) > v->slack[k * WEND_LEAF + lane]))
      d[m] = j < s->tree->n && is_pair(s, self, j) ? -1.0f : 1.0f;
  }
}

/* Appends those with d < 0 to the row's list. */
static void append(const vicinity *v, int32_t n, const int32_t *restrict slot,
                   const float *restrict d, lister *r) {
  int64_t count = r->count;
  const bool roomy = count + (int64_t)n * WEND_LEAF <= r->room;
  for (int32_t m = 0; m < n; m++) {
    const int32_t *store = v->store + slot[m] * WEND_LEAF;
    for (int32_t j = 0; j < WEND_LEAF; j++) {
      if (roomy || count < r->room) r->list[WEND_LANES * count] = store[j];
      count += d[m * WEND_LEAF + j] < 0.0f;
    }
  }
  r->count = count;
}

/* Continues a row's list with its pairs among some leaves of the vicinity. */
static void row_list(const wend_search *s, const vicinity *v, const wend_leaves *leaves,
                     lister *r) {
  int32_t slot[WEND_NEAR_LEAVES];
  float d[NEAR];
  const int32_t n = wend_leaves_choose(leaves, r->x, r->x, r->h2, slot);
  for (int32_t m = 0; m < n; m++) slot[m] = leaves->slot[slot[m]];
  if (compare(v, n, slot, r->x, r->h2, d)) decide(s, v, n, slot, r->self, d);
  const int32_t own = r->self / WEND_LEAF;
  int32_t m = 0;
  while (m < n && v->leaves.leaf[slot[m]] < own) m++;
  if (m < n && v->leaves.leaf[slot[m]] == own) d[m * WEND_LEAF + r->self % WEND_LEAF] = 1.0f;
  append(v, n, slot, d, r);
}

/* Adds rows begin, begin + 1, ... to the group of a walk as long as they fit together; returns
 * the first that does not. */
static int32_t group_gather(const wend_search *s, int32_t begin, int32_t end, wend_walk *walk) {
  *walk = wend_walk_begin(s->tree, s->domain, true);
  double smallest = INFINITY;
  for (int32_t row = begin; row < end; row++) {
    const double *place = s->place[s->row[row]];
    wend_walk wider = *walk;
    wend_walk_add(&wider, place);
    smallest = place[3] < smallest ? place[3] : smallest;
    double extent = 0.0;
    for (int a = 0; a < 3; a++) extent = fmax(extent, wider.hi[a] - wider.lo[a]);
    const bool fits =
        extent <= GROUP_EXTENT * smallest && wider.reach <= GROUP_RATIO * smallest;
    if (row > begin && !fits) return row;
    *walk = wider;
  }
  return end;
}

/* The leaves of the vicinity that matter to some rows of the group. */
static void leaves_of_rows(const vicinity *v, int32_t n, const lister *r, wend_leaves *leaves) {
  float lo[3], hi[3], h2 = r->h2;
  for (int a = 0; a < 3; a++) lo[a] = hi[a] = r->x[a];
  for (int32_t k = 1; k < n; k++) {
    for (int a = 0; a < 3; a++) {
      lo[a] = r[k].x[a] < lo[a] ? r[k].x[a] : lo[a];
      hi[a] = r[k].x[a] > hi[a] ? r[k].x[a] : hi[a];
    }
    h2 = r[k].h2 > h2 ? r[k].h2 : h2;
  }
  int32_t list[WEND_NEAR_LEAVES];
  const int32_t m = wend_leaves_choose(&v->leaves, lo, hi, h2, list);
  wend_leaves_copy(&v->leaves, m, list, leaves);
}

/* Lists the rows of one slice from a vicinity that holds all they need. */
static void slice_list(const wend_search *s, const vicinity *v, int32_t begin, int32_t end,
                       int32_t *out, int64_t room, int64_t *restrict count) {
  lister r[WEND_LANES];
  wend_leaves leaves;
  for (int32_t k = 0; k < end - begin; k++) {
    r[k] = row_begin(s, &v->frame, begin + k);
    r[k].list = out + k;
    r[k].room = room;
  }
  leaves_of_rows(v, end - begin, r, &leaves);
  for (int32_t k = 0; k < end - begin; k++) {
    row_list(s, v, &leaves, &r[k]);
    count[k] = r[k].count;
  }
}

/* Lists the rows of one slice group by group, from as many fillings of the vicinity as it
 * takes. */
static void slice_list_apart(const wend_search *s, vicinity *v, int32_t begin, int32_t end,
                             int32_t *out, int64_t room, int64_t *restrict count) {
  for (int32_t row = begin, next; row < end; row = next) {
    wend_walk walk;
    next = group_gather(s, row, end, &walk);
    v->frame = wend_frame_of(&walk);
    lister r[WEND_LANES];
    for (int32_t k = row; k < next; k++) {
      r[k - row] = row_begin(s, &v->frame, k);
      r[k - row].list = out + (k - begin);
      r[k - row].room = room;
    }
    for (bool complete = false; !complete;) {
      complete = vicinity_fill(s, &walk, v);
      for (int32_t k = 0; k < next - row; k++) row_list(s, v, &v->leaves, &r[k]);
    }
    for (int32_t k = row; k < next; k++) count[k - begin] = r[k - row].count;
  }
}

/* Where lists go. */
typedef struct output {
  int32_t *index, *count;
  int64_t *first, *used;
  int64_t capacity;
} output;

/* Pads a slice and closes it; false where it did not fit. */
static bool slice_close(const output *o, int32_t slice, int32_t rows, const int64_t *count) {
  const int64_t room = (o->capacity - *o->used) / WEND_LANES;
  int32_t *out = o->index + *o->used;
  int64_t width = 0;
  for (int lane = 0; lane < WEND_LANES; lane++)
    width = count[lane] > width ? count[lane] : width;
  if (width > room) return false;
  for (int lane = 0; lane < WEND_LANES; lane++) {
    const int32_t row = slice * WEND_LANES + lane;
    for (int64_t m = count[lane]; m < width; m++)
      out[WEND_LANES * m + lane] = row < rows ? row : rows - 1;
    o->count[row] = (int32_t)count[lane];
  }
  *o->used += WEND_LANES * width;
  o->first[slice + 1] = *o->used;
  return true;
}

int32_t wend_search_pairs(const wend_search *search, int32_t begin, int32_t *restrict index,
                          int64_t capacity, int64_t *used, int64_t *restrict first,
                          int32_t *restrict count) {
  const int32_t rows = search->rows;
  const int32_t slices = rows / WEND_LANES + (rows % WEND_LANES != 0);
  const output o = {index, count, first, used, capacity};
  vicinity v;
  int32_t together = begin; /* slices before this one are served by v */
  for (int32_t slice = begin; slice < slices; slice++) {
    const int32_t row = slice * WEND_LANES;
    const int32_t end = rows - row < WEND_LANES ? rows : row + WEND_LANES;
    if (slice == together) {
      const int32_t last =
          rows - row < GROUP_SLICES * WEND_LANES ? rows : row + GROUP_SLICES * WEND_LANES;
      wend_walk walk;
      const int32_t next = group_gather(search, row, last, &walk);
      v.frame = wend_frame_of(&walk);
      if (next == last && vicinity_fill(search, &walk, &v)) together = slice + GROUP_SLICES;
    }
    int64_t n[WEND_LANES] = {0};
    int32_t *out = index + *used;
    const int64_t room = (capacity - *used) / WEND_LANES;
    if (slice < together) {
      slice_list(search, &v, row, end, out, room, n);
    } else {
      slice_list_apart(search, &v, row, end, out, room, n);
      together = slice + 1;
    }
    if (!slice_close(&o, slice, rows, n)) return slice;
  }
  return slices;
}
