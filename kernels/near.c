/* SPDX-License-Identifier: LGPL-3.0-or-later
 * near.c: the particles near a group: layout, exact predicate, and the portable kit. */
#include "near.h"

#include <stddef.h>
#include <string.h>

#define GROUP_EXTENT 4.0 /* a group is no wider than so many of its smallest radius, ... */
#define GROUP_RATIO 4.0  /* ... and its radii differ by no more than this factor */

/* r^2 of two places, unshifted positions and minimum image. */
static inline double distance2(const wend_domain *d, const double *a, const double *b) {
  double r2 = 0.0;
  for (int axis = 0; axis < 3; axis++) {
    const double dx = wend_domain_wrap(d, axis, b[axis] - a[axis]);
    r2 += dx * dx;
  }
  return r2;
}

unsigned wend_near_decide(const wend_near *near, const wend_member *m, int32_t slot,
                          unsigned inside, unsigned close) {
  const wend_places *p = &near->places;
  const double *a = p->place[m->self];
  for (int lane = 0; lane < WEND_LEAF; lane++) {
    const int32_t j = near->leaf[slot] * WEND_LEAF + lane;
    if (!(close >> lane & 1u)) continue;
    inside &= ~(1u << lane);
    if (j >= p->tree->n || (near->mutual && j == m->self)) continue;
    const double *b = p->place[j], h = near->mutual && b[3] > a[3] ? b[3] : a[3];
    inside |= (unsigned)(distance2(p->domain, a, b) < h * h) << lane;
  }
  return inside;
}

/* Particle j of the places to position `to`, measured from `at`. */
static inline void load_one(wend_near *near, const double *at, int32_t j, int32_t to,
                            bool wraps) {
  const double *place = near->places.place[j], scale = near->frame.scale;
  for (int a = 0; a < 3; a++) {
    const double dx = place[a] - at[a];
    const double x = wraps ? wend_domain_wrap(near->places.domain, a, dx) : dx;
    near->x[a][to] = (float)(x * scale);
  }
  const double q = near->mutual ? place[3] * scale : 0.0;
  near->h2[to] = (float)(q * q);
  near->slack[to] = (float)wend_frame_slack(&near->frame, q);
  near->name[to] = near->places.name ? near->places.name[j] : j;
}

static void load_portable(wend_near *near, int32_t k) {
  const double *at = near->at[near->origin[k]];
  for (int32_t lane = 0; lane < WEND_LEAF; lane++)
    load_one(near, at, near->leaf[k] * WEND_LEAF + lane, k * WEND_LEAF + lane, false);
}

/* A leaf that straddles, or that is not full: ends with particles infinitely far away. */
static void load_odd(wend_near *near, int32_t k) {
  const int32_t begin = near->leaf[k] * WEND_LEAF, left = near->places.tree->n - begin;
  const int32_t origin = near->origin[k];
  for (int32_t lane = 0; lane < WEND_LEAF; lane++) {
    const int32_t to = k * WEND_LEAF + lane, j = lane < left ? begin + lane : begin;
    load_one(near, near->at[origin], j, to, near->straddles[origin]);
    if (lane >= left) near->x[0][to] = INFINITY;
  }
}

int32_t wend_near_gather(const wend_near *near, int32_t n, const int32_t *member,
                         wend_walk *walk) {
  const wend_places *p = &near->places;
  *walk = wend_walk_begin(p->tree, p->domain, near->mutual);
  double smallest = INFINITY;
  for (int32_t k = 0; k < n; k++) {
    const double *place = p->place[member[k]];
    wend_walk wider = *walk;
    wend_walk_add(&wider, place);
    smallest = place[3] < smallest ? place[3] : smallest;
    double extent = 0.0;
    for (int a = 0; a < 3; a++) extent = fmax(extent, wider.hi[a] - wider.lo[a]);
    const bool fits =
        extent <= GROUP_EXTENT * smallest && wider.reach <= GROUP_RATIO * smallest;
    if (k > 0 && !fits) return k;
    *walk = wider;
  }
  return n;
}

int32_t wend_near_group(wend_near *near, const wend_near_kit *kit, int32_t n,
                        const int32_t *member, int32_t unit) {
  wend_walk walk;
  while (n > 0) {
    const int32_t taken = wend_near_gather(near, n, member, &walk);
    const bool whole = taken == n || taken % unit == 0;
    n = taken == n ? n : taken - taken % unit;
    if (!whole) continue;
    if (wend_near_fill(near, kit, &walk, true)) return n;
    n = n / 2 - n / 2 % unit;
  }
  return 0;
}

wend_member wend_near_member(const wend_near *near, int32_t self) {
  const wend_frame *f = &near->frame;
  const double *place = near->places.place[self], q = place[3] * f->scale;
  wend_member m = {.self = self, .h2 = (float)(q * q)};
  for (int a = 0; a < 3; a++) m.x[a] = (float)((place[a] - f->centre[a]) * f->scale);
  return m;
}

void wend_near_narrow(const wend_near *near, const wend_near_kit *kit, int32_t n,
                      const int32_t *self, wend_member *member, wend_leaves *leaves) {
  member[0] = wend_near_member(near, self[0]);
  wend_member lo = member[0], hi = member[0];
  for (int32_t k = 1; k < n; k++) {
    const wend_member m = member[k] = wend_near_member(near, self[k]);
    for (int a = 0; a < 3; a++) {
      lo.x[a] = m.x[a] < lo.x[a] ? m.x[a] : lo.x[a];
      hi.x[a] = m.x[a] > hi.x[a] ? m.x[a] : hi.x[a];
    }
    hi.h2 = m.h2 > hi.h2 ? m.h2 : hi.h2;
  }
  kit->narrow(&near->leaves, lo.x, hi.x, hi.h2, leaves);
}

/* Distance of a box from the interval [lo, hi] on one axis. */
static inline float gap(float box_lo, float box_hi, float lo, float hi) {
  const float below = box_lo - hi, above = lo - box_hi;
  const float d = below > above ? below : above;
  return d > 0.0f ? d : 0.0f;
}

/* Whether leaf k reaches a box. */
static inline int reaches_one(const wend_leaves *restrict v, int32_t k,
                              const float *restrict lo, const float *restrict hi, float h2) {
  const float x = gap(v->lo[0][k], v->hi[0][k], lo[0], hi[0]);
  const float y = gap(v->lo[1][k], v->hi[1][k], lo[1], hi[1]);
  const float z = gap(v->lo[2][k], v->hi[2][k], lo[2], hi[2]);
  const float r2 = v->reach2[k] > h2 ? v->reach2[k] : h2;
  return !(x * x + y * y + z * z - r2 > v->slack[k]);
}

/* Marks the leaves that reach a box. */
static void reaches(const wend_leaves *restrict v, const float *restrict lo,
                    const float *restrict hi, float h2, int32_t *restrict near) {
  for (int32_t k = 0; k < v->n; k++) near[k] = reaches_one(v, k, lo, hi, h2);
}

/* Adds one leaf to the end of the collection, whether it reaches the group or not. */
static void leaf_add(wend_near *near, int32_t leaf) {
  wend_leaves *to = &near->leaves;
  const wend_frame *f = &near->frame;
  const double *lo = near->places.tree->lo[leaf], *hi = near->places.tree->hi[leaf];
  const double *at = near->at[near->origins];
  const bool straddles = near->straddles[near->origins];
  const int32_t n = to->n++;
  for (int a = 0; a < 3; a++) {
    to->lo[a][n] = straddles ? -INFINITY : (float)((lo[a] - at[a]) * f->scale);
    to->hi[a][n] = straddles ? INFINITY : (float)((hi[a] - at[a]) * f->scale);
  }
  const double q = near->mutual ? lo[3] * f->scale : 0.0;
  to->reach2[n] = (float)(q * q);
  to->slack[n] = (float)wend_frame_slack(f, q);
  to->slot[n] = n;
  near->leaf[n] = leaf;
  near->origin[n] = near->origins;
}

static void collect_portable(wend_near *near, int32_t leaf) {
  for (int32_t k = 0; k < WEND_FAN; k++) {
    const int32_t last = near->leaves.n;
    leaf_add(near, leaf + k);
    near->leaves.n -=
        !reaches_one(&near->leaves, last, near->frame.lo, near->frame.hi, near->frame.h2);
  }
}

/* Adds leaves one by one: a branch that is not full, or whose leaves differ in their image. */
static void collect_odd(wend_near *near, const wend_walk *w, int32_t leaf, int32_t n) {
  for (int32_t k = leaf; k < leaf + n; k++) {
    const bool same = wend_frame_image(&near->frame, w, w->tree->lo[k], w->tree->hi[k],
                                       near->at[near->origins]);
    near->straddles[near->origins] = !same;
    leaf_add(near, k);
    near->origins++;
  }
}

/* Collects leaves until the walk ends or no branch more fits. */
static void collect(wend_near *near, const wend_near_kit *kit, wend_walk *w) {
  const wend_tree *t = w->tree;
  const int32_t leaves = t->levels > 0 ? t->offset[1] : 0;
  near->leaves.n = near->origins = 0;
  for (int32_t branch;
       near->leaves.n + WEND_FAN <= WEND_NEAR_LEAVES && (branch = wend_walk_next(w)) >= 0;) {
    const int32_t box = t->offset[w->floor] + branch, leaf = branch * WEND_FAN;
    const int32_t n = leaves - leaf < WEND_FAN ? leaves - leaf : WEND_FAN;
    const bool same =
        wend_frame_image(&near->frame, w, t->lo[box], t->hi[box], near->at[near->origins]);
    near->straddles[near->origins] = false;
    const int32_t before = near->leaves.n;
    if (n < WEND_FAN || !same) {
      collect_odd(near, w, leaf, n);
    } else {
      kit->collect(near, leaf);
      near->origins += near->leaves.n > before;
    }
  }
}

bool wend_near_fill(wend_near *near, const wend_near_kit *kit, wend_walk *walk, bool begin) {
  if (begin) near->frame = wend_frame_of(walk);
  collect(near, kit, walk);
  for (int32_t k = 0; k < near->leaves.n; k++) {
    const bool full = near->places.tree->n / WEND_LEAF > near->leaf[k];
    if (full && !near->straddles[near->origin[k]])
      kit->load(near, k);
    else
      load_odd(near, k);
  }
  return walk->level < 0;
}

static void narrow_portable(const wend_leaves *restrict from, const float lo[3],
                            const float hi[3], float h2, wend_leaves *restrict to) {
  int32_t near[WEND_NEAR_LEAVES], m = 0;
  reaches(from, lo, hi, h2, near);
  for (int32_t k = 0; k < from->n; k++) {
    to->slot[m] = from->slot[k];
    to->reach2[m] = from->reach2[k];
    to->slack[m] = from->slack[k];
    for (int a = 0; a < 3; a++) {
      to->lo[a][m] = from->lo[a][k];
      to->hi[a][m] = from->hi[a][k];
    }
    m += near[k];
  }
  to->n = m;
}

static int32_t choose_portable(const wend_leaves *leaves, const wend_member *m,
                               int32_t *restrict list) {
  int32_t near[WEND_NEAR_LEAVES], n = 0;
  reaches(leaves, m->x, m->x, m->h2, near);
  for (int32_t k = 0; k < leaves->n; k++) {
    list[n] = leaves->slot[k];
    n += near[k];
  }
  return n;
}

/* d = r^2 - H^2 of the particles of one leaf; tells whether any is too close to call. */
static inline int compare(const wend_near *restrict near, int32_t at, const wend_member *m,
                          float *restrict d, int32_t *restrict close) {
  int any = 0;
#pragma GCC unroll 1 /* else gcc unrolls first and then finds nothing to vectorise */
  for (int32_t j = 0; j < WEND_LEAF; j++) {
    const float x = near->x[0][at + j] - m->x[0];
    const float y = near->x[1][at + j] - m->x[1];
    const float z = near->x[2][at + j] - m->x[2];
    const float h2 = near->h2[at + j] > m->h2 ? near->h2[at + j] : m->h2;
    d[j] = x * x + y * y + z * z - h2;
    close[j] = !(fabsf(d[j]) > near->slack[at + j]);
    any |= close[j];
  }
  return any;
}

static int32_t sieve_portable(const wend_near *near, const wend_member *m, int32_t n,
                              const int32_t *restrict slot, int32_t *restrict hits) {
  int32_t count = 0;
  for (int32_t k = 0; k < n; k++) {
    const int32_t at = slot[k] * WEND_LEAF;
    float d[WEND_LEAF];
    int32_t close[WEND_LEAF];
    if (compare(near, at, m, d, close)) {
      unsigned mask = 0;
      for (int lane = 0; lane < WEND_LEAF; lane++) mask |= (unsigned)close[lane] << lane;
      mask = wend_near_decide(near, m, slot[k], 0u, mask);
      for (int lane = 0; lane < WEND_LEAF; lane++)
        d[lane] = close[lane] ? (mask >> lane & 1u ? -1.0f : 1.0f) : d[lane];
    }
    for (int lane = 0; lane < WEND_LEAF; lane++) {
      uint32_t sign;
      memcpy(&sign, &d[lane], sizeof sign);
      hits[count] = near->name[at + lane];
      count += (int32_t)(sign >> 31);
    }
  }
  return count;
}

static void distances_portable(const wend_places *p, int32_t self, int32_t n,
                               const int32_t *restrict number, double *restrict r) {
  for (int32_t k = 0; k < n; k++)
    r[k] = distance2(p->domain, p->place[self], p->place[number[k]]);
  for (int32_t k = 0; k < n; k++) r[k] = sqrt(r[k]);
}

static const wend_near_kit portable = {
    "portable",      collect_portable, load_portable,      narrow_portable,
    choose_portable, sieve_portable,   distances_portable,
};

const wend_near_kit *wend_near_kit_at(int k) {
  return k == 0 ? &portable : k == 1 ? wend_near_kit_avx2() : NULL;
}

const wend_near_kit *wend_near_kit_best(void) {
  const wend_near_kit *kit = wend_near_kit_avx2();
  return kit ? kit : &portable;
}
