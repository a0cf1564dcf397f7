/* SPDX-License-Identifier: GPL-3.0-or-later
 * cloud.h: sets of particles that make neighbour search difficult, for the tests of kernels. */
#ifndef WEND_TESTS_CLOUD_H
#define WEND_TESTS_CLOUD_H

#include "search.h"
#include "tree.h"

#include <check.h>
#include <stdint.h>

/** A set of particles, its tree, and maps as if some of the particles were ghosts. */
typedef struct cloud {
  wend_domain domain;
  int32_t n, rows;
  double (*place)[4]; /**< x, y, z, H along a space-filling curve */
  int32_t *store, *row;
  wend_tree tree;
} cloud;

/** Fills places [n][4] in the unit square or cube, with supports. */
typedef void cloud_shape(int dim, int32_t n, double (*place)[4], uint64_t seed);

typedef struct cloud_kind {
  const char *name;
  cloud_shape *fill;
} cloud_kind;

/** Uniform, clustered and degenerate sets; the last row has no name. */
extern const cloud_kind cloud_kinds[];

/** Makes a set of n particles: periodic bit a set makes axis a periodic, lengths are scaled by
 * unit, a share of the particles (0 to 1) are ghosts, stored in reverse order after the owned.
 */
cloud cloud_create(const cloud_kind *kind, int dim, unsigned periodic, double unit, int32_t n,
                   double ghosts, uint64_t seed);
void cloud_destroy(cloud *c);

/** Squared minimum-image distance of particles i and j, written without the library. */
double cloud_distance2(const cloud *c, int32_t i, int32_t j);

/** Next random number of [0, 1) (Steele, Lea & Flood 2014: splitmix64). */
double cloud_random(uint64_t *state);

/** ck_assert_msg for inner loops: libcheck notes every assertion in a file, which costs far
 * more than what is asserted. */
#define require(condition, ...)                                                                \
  do {                                                                                         \
    if (!(condition)) ck_abort_msg(__VA_ARGS__);                                               \
  } while (0)

#endif
