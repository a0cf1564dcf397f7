/* SPDX-License-Identifier: LGPL-3.0-or-later
 * near.h: the particles near a group, laid out for fast comparison with each member.
 *
 * The work in the loops is done by a kit of three functions. The portable kit is the reference;
 * another one for wider vectors may be chosen at run time. All kits give the same lists: single
 * precision decides only what it can decide beyond its round-off, and the predicate
 *     r^2 < max(H_i, H_j)^2   (mutual)   or   r^2 < H_i^2
 * in double precision decides the rest. It is the same bits from both ends of a pair:
 * differences are odd functions, and their squares are summed in the order of the axes. */
#ifndef WEND_KERNELS_NEAR_H
#define WEND_KERNELS_NEAR_H

#include "leaves.h"

#define WEND_NEAR (WEND_NEAR_LEAVES * WEND_LEAF)

/** Particles whose neighbours are sought, and those they are sought among. */
typedef struct wend_places {
  const wend_domain *domain;
  const wend_tree *tree;
  const double (*place)[4]; /**< [tree->n] x, y, z, H */
  const int32_t *name; /**< [tree->n] what lists hold for each particle; NULL: its number */
} wend_places;

/** Particles near a group. Those of leaf number k of the collection stand at 8k .. 8k + 7. */
typedef struct wend_near {
  wend_places places;
  bool mutual;
  wend_frame frame;
  wend_leaves leaves;
  int32_t leaf[WEND_NEAR_LEAVES];   /**< numbers of the leaves in the tree */
  int32_t origin[WEND_NEAR_LEAVES]; /**< which of `at` they are measured from */
  int32_t origins;
  double at[WEND_NEAR_LEAVES][4];
  bool straddles[WEND_NEAR_LEAVES]; /**< origin of a leaf whose members differ in their image */
  float x[3][WEND_NEAR];            /**< scaled, about the centre; INFINITY: nobody */
  float h2[WEND_NEAR];              /**< 0 if not mutual */
  float slack[WEND_NEAR];
  int32_t name[WEND_NEAR];
} wend_near;

/** How many rows are served together, at most. */
#define WEND_GROUP 128

/** A member of the group, scaled and about the centre. */
typedef struct wend_member {
  int32_t self; /**< number among the places */
  float x[3], h2;
} wend_member;

typedef struct wend_near_kit {
  const char *name;
  /** Adds those of the 8 leaves from `leaf` on that reach the group to the collection; they are
   *  measured from at[origins]. */
  void (*collect)(wend_near *near, int32_t leaf);
  /** Lays out the particles of leaf k of the collection, which is full and does not straddle.
   */
  void (*load)(wend_near *near, int32_t k);
  /** Chooses the leaves that reach a box of squared radius h2 into `to`. No overlap. */
  void (*narrow)(const wend_leaves *restrict from, const float lo[3], const float hi[3],
                 float h2, wend_leaves *restrict to);
  /** Chooses the leaves that reach a member; their slots go to list [WEND_NEAR_LEAVES + 8]. */
  int32_t (*choose)(const wend_leaves *leaves, const wend_member *m, int32_t *restrict list);
  /** Lists names of particles in n leaves, by slots, that satisfy the predicate with a member:
   * to hits [WEND_NEAR + 8], in order. Returns their number. */
  int32_t (*sieve)(const wend_near *near, const wend_member *m, int32_t n,
                   const int32_t *restrict slot, int32_t *restrict hits);
  /** Distances r[n] of places by their numbers from a member, in double precision: the same
   * bits from both ends. */
  void (*distances)(const wend_places *places, int32_t self, int32_t n,
                    const int32_t *restrict number, double *restrict r);
} wend_near_kit;

/** The k-th kit this processor can use, k = 0, 1, ...: the portable one, then faster ones; NULL
 *  beyond the last. Local. */
const wend_near_kit *wend_near_kit_at(int k);

/** The fastest kit this processor can use. Local. */
const wend_near_kit *wend_near_kit_best(void);

/** The kit for 256-bit vectors; NULL where the processor or the compiler has none. Local. */
const wend_near_kit *wend_near_kit_avx2(void);

/** Begins a walk for the first of n members (numbers among the places), and as many after it as
 *  fit together: near each other in terms of their radii, which do not differ much. Returns how
 *  many. Local. */
int32_t wend_near_gather(const wend_near *near, int32_t n, const int32_t *member,
                         wend_walk *walk);

/** Lays out what is near the group of a walk; the walk may end before, where no more fits.
 * Tells whether it is at its end; if not, call again (with begin false) for what is next.
 * Local. */
bool wend_near_fill(wend_near *near, const wend_near_kit *kit, wend_walk *walk, bool begin);

/** Lays out all that is near the first of n members, as many as fit together and leave room for
 * it, in units of `unit` (n itself counts as whole); returns how many members, 0 where not one
 * unit fits. Local. */
int32_t wend_near_group(wend_near *near, const wend_near_kit *kit, int32_t n,
                        const int32_t *member, int32_t unit);

/** A member of the group, by its number among the places. Local. */
wend_member wend_near_member(const wend_near *near, int32_t self);

/** Makes members [n] of some of the group, n > 0, by their numbers, and chooses the leaves that
 * matter to any of them. Local. */
void wend_near_narrow(const wend_near *near, const wend_near_kit *kit, int32_t n,
                      const int32_t *self, wend_member *member, wend_leaves *leaves);

/** Hides a particle from the sieve (INFINITY as x) or shows it again (its own x). Returns the
 *  former x; at < 0 does nothing. Local. */
static inline float wend_near_swap(wend_near *near, int32_t at, float x) {
  if (at < 0) return x;
  const float old = near->x[0][at];
  near->x[0][at] = x;
  return old;
}

/** Decides by the predicate: bits `close` of the mask `inside`, for the leaf in a slot. Local.
 */
unsigned wend_near_decide(const wend_near *near, const wend_member *m, int32_t slot,
                          unsigned inside, unsigned close);

#endif
