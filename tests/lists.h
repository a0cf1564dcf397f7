/* SPDX-License-Identifier: GPL-3.0-or-later
 * lists.h: random particles and their neighbour lists by brute force, for the tests of kernels.
 */
#ifndef WEND_TESTS_LISTS_H
#define WEND_TESTS_LISTS_H

#include "domain.h"
#include "pairs.h"

/** Particles, the first `rows` of them owned, and the lists of the owned in the order of
 * storage. */
typedef struct lists {
  wend_domain domain;
  int32_t n;
  double (*place)[4]; /**< [n] x, y, z, H */
  wend_pairs pairs;
  wend_slices all; /**< every slice */
} lists;

/** A box [-1, 1]^dim, thickness 1; bit a of `periodic` set: axis a is periodic. */
wend_domain lists_box(int dim, unsigned periodic);

/** Makes room for n particles in the domain, at 0 and with H = 0, and no lists. */
lists lists_create(wend_domain domain, int32_t n);
/** Spreads the particles at random, supports vary by a factor of 2 around `support`. */
void lists_scatter(lists *l, double support, uint64_t seed);
/** Finds all j != i with r_ij < max(H_i, H_j) for the first `rows` particles, by trying every
 * j; each slice gets `extra` entries a row of padding more than it needs. May be called again.
 */
void lists_find(lists *l, int32_t rows, int32_t extra);
void lists_destroy(lists *l);

#endif
