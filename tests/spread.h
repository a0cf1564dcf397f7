/* SPDX-License-Identifier: GPL-3.0-or-later
 * spread.h: sets of particles dealt out to ranks in good and bad ways, for the tests over MPI.
 */
#ifndef WEND_TESTS_SPREAD_H
#define WEND_TESTS_SPREAD_H

#include "domain.h"
#include "particles.h"

/** A whole set, the same on every rank. */
typedef struct spread {
  wend_domain domain;
  int32_t n;
  double (*place)[4]; /**< [n] x, y, z, H */
} spread;

/** Who starts with which particle. */
typedef enum spread_way {
  SPREAD_TURNS,  /**< one each in turns */
  SPREAD_RANDOM, /**< at random */
  SPREAD_BLOCKS, /**< slabs along x */
  SPREAD_HOLE,   /**< at random, but the middle rank is empty */
  SPREAD_FIRST,  /**< all on the first rank */
  SPREAD_LAST,   /**< all on the last rank */
  SPREAD_WAYS
} spread_way;

/** Makes n particles of a kind of cloud.h; bit a of `periodic` set: axis a is periodic. */
spread spread_create(int kind, int dim, unsigned periodic, int32_t n, uint64_t seed);
void spread_destroy(spread *s);

int spread_rank(const spread *s, spread_way way, int32_t i, int ranks);

/** Ids jump over all 64 bits; spread_index is the inverse. */
uint64_t spread_id(int32_t i);
int32_t spread_index(uint64_t id);

/** Value of column c of particle i: its place and support, else a number of its own. */
double spread_value(const spread *s, wend_column c, int32_t i);

/** The table that this rank starts with: positions, supports, energies and sources. */
wend_particles spread_particles(wend_team *team, const spread *s, spread_way way);

/** True where it is true on every rank. Collective. */
bool spread_everywhere(bool here);
/** True where every rank has the same text. Collective. */
bool spread_same_text(const char *text);

/** Fails allocation number `number` (from 0) of this rank from now on; -1: none. For
 * team.allocate. */
void spread_break(int number);
void *spread_allocate(size_t n, size_t size);

#endif
