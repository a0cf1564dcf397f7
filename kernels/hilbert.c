/* SPDX-License-Identifier: LGPL-3.0-or-later
 * hilbert.c: Hilbert keys by Skilling's transform, a batch of places at a time.
 *
 * The transform undoes the turns of the curve from the coarsest level down: a set bit of axis i
 * inverts the finer bits of axis 0, a clear one exchanges them with those of axis i; a Gray
 * code over the axes ends it. Each level touches finer bits only, so the top bits of a key are
 * the key of the coarser cell. Bits become masks instead of branches and lanes lie side by
 * side, so that the loops vectorise. */
#include "hilbert.h"

#include "clones.h"

enum { BATCH = 64, BITS_2D = 31, BITS_3D = 21 };

/* Cell numbers on one axis; a coordinate that is not a number counts as the lower border. */
static void cells_of_axis(const wend_domain *domain, int axis, int bits, int n,
                          const double (*restrict place)[4], uint32_t *restrict cell) {
  const double lo = domain->lo[axis], width = domain->hi[axis] - lo;
  const double cells = (double)(UINT32_C(1) << bits);
  const double scale = width > 0 ? cells / width : 0.0;
  for (int k = 0; k < n; k++) {
    const double x = (place[k][axis] - lo) * scale;
    const double above = x > 0.0 ? x : 0.0;
    cell[k] = (uint32_t)(int32_t)(above < cells - 1.0 ? above : cells - 1.0);
  }
}

/* Parity of all higher bits, at each bit. */
static inline uint32_t parity_above(uint32_t x) {
  x >>= 1;
  x ^= x >> 1;
  x ^= x >> 2;
  x ^= x >> 4;
  x ^= x >> 8;
  return x ^ x >> 16;
}

static inline uint32_t mask_of(uint32_t x, int bit) { return 0 - (x >> bit & 1); }

static void turn_first(int bit, uint32_t *restrict x0) {
  const uint32_t finer = (UINT32_C(1) << bit) - 1;
  for (int k = 0; k < BATCH; k++) x0[k] ^= mask_of(x0[k], bit) & finer;
}

static void turn_other(int bit, uint32_t *restrict x0, uint32_t *restrict xa) {
  const uint32_t finer = (UINT32_C(1) << bit) - 1;
  for (int k = 0; k < BATCH; k++) {
    const uint32_t invert = mask_of(xa[k], bit);
    const uint32_t swap = (x0[k] ^ xa[k]) & ~invert & finer;
    xa[k] ^= swap;
    x0[k] ^= swap | (invert & finer);
  }
}

WEND_CLONES static void undo_turns(int dim, int bits, uint32_t x[3][BATCH]) {
  for (int bit = bits - 1; bit > 0; bit--) {
    turn_first(bit, x[0]);
    for (int axis = 1; axis < dim; axis++) turn_other(bit, x[0], x[axis]);
  }
}

WEND_CLONES static void gray_encode(int dim, uint32_t x[3][BATCH]) {
  for (int axis = 1; axis < dim; axis++)
    for (int k = 0; k < BATCH; k++) x[axis][k] ^= x[axis - 1][k];
  for (int k = 0; k < BATCH; k++) {
    const uint32_t parity = parity_above(x[dim - 1][k]);
    for (int axis = 0; axis < dim; axis++) x[axis][k] ^= parity;
  }
}

/* Puts one empty bit between the bits of x < 2^31. */
static inline uint64_t spread_by_two(uint32_t from) {
  uint64_t x = from;
  x = (x | x << 16) & UINT64_C(0x0000ffff0000ffff);
  x = (x | x << 8) & UINT64_C(0x00ff00ff00ff00ff);
  x = (x | x << 4) & UINT64_C(0x0f0f0f0f0f0f0f0f);
  x = (x | x << 2) & UINT64_C(0x3333333333333333);
  return (x | x << 1) & UINT64_C(0x5555555555555555);
}

/* Puts two empty bits between the bits of x < 2^21. */
static inline uint64_t spread_by_three(uint32_t from) {
  uint64_t x = from;
  x = (x | x << 32) & UINT64_C(0x001f00000000ffff);
  x = (x | x << 16) & UINT64_C(0x001f0000ff0000ff);
  x = (x | x << 8) & UINT64_C(0x100f00f00f00f00f);
  x = (x | x << 4) & UINT64_C(0x10c30c30c30c30c3);
  return (x | x << 2) & UINT64_C(0x1249249249249249);
}

WEND_CLONES static void interleave(int dim, int n, uint32_t x[3][BATCH],
                                   uint64_t *restrict key) {
  if (dim == 2)
    for (int k = 0; k < n; k++) key[k] = spread_by_two(x[0][k]) << 1 | spread_by_two(x[1][k]);
  else
    for (int k = 0; k < n; k++)
      key[k] = spread_by_three(x[0][k]) << 2 | spread_by_three(x[1][k]) << 1 |
               spread_by_three(x[2][k]);
}

void wend_hilbert_keys(const wend_domain *domain, int32_t n, const double (*restrict place)[4],
                       uint64_t *restrict key) {
  const int dim = domain->dim, bits = dim == 2 ? BITS_2D : BITS_3D;
  uint32_t x[3][BATCH] = {{0}};
  for (int64_t begin = 0; begin < n; begin += BATCH) {
    const int batch = n - begin < BATCH ? (int)(n - begin) : BATCH;
    for (int axis = 0; axis < dim; axis++)
      cells_of_axis(domain, axis, bits, batch, place + begin, x[axis]);
    undo_turns(dim, bits, x);
    gray_encode(dim, x);
    interleave(dim, batch, x, key + begin);
  }
}
