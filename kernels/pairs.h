/* SPDX-License-Identifier: LGPL-3.0-or-later
 * pairs.h: neighbour lists in slices of eight rows (sliced ELLPACK).
 *
 * Row i is an owned particle; its entries are the particles j with r_ij < max(H_i, H_j), j !=
 * i, in canonical order (Hilbert key, id). Entry m of the eight rows of a slice lie side by
 * side, so that vectors run across rows and each lane sums its own row in list order: any
 * vector width gives the same bits. Short rows are padded with their own index; coefficient
 * columns hold zero there. Rows beyond n in the last slice are padding throughout and point at
 * row n - 1. */
#ifndef WEND_KERNELS_PAIRS_H
#define WEND_KERNELS_PAIRS_H

#include <stdint.h>

#define WEND_LANES 8

typedef struct wend_pairs {
  int32_t rows;         /**< owned particles n */
  int32_t slices;       /**< (n + 7) / 8 */
  const int64_t *first; /**< [slices + 1] first entry of each slice, multiples of 8 */
  const int32_t *count; /**< [8 slices] entries of each row, without padding */
  const int32_t *index; /**< [first[slices]] neighbour: owned, then ghosts */
} wend_pairs;

/** A choice of slices to work on: interior ones while a halo is in flight, then the rest. */
typedef struct wend_slices {
  int32_t n;
  const int32_t *list; /**< [n] slice numbers */
} wend_slices;

/** Position of entry m of row i in a pair column. */
static inline int64_t wend_pairs_entry(const wend_pairs *p, int32_t i, int32_t m) {
  return p->first[i / WEND_LANES] + (int64_t)WEND_LANES * m + i % WEND_LANES;
}

/** Entries a row of this slice has, padding included. */
static inline int32_t wend_pairs_width(const wend_pairs *p, int32_t slice) {
  return (int32_t)((p->first[slice + 1] - p->first[slice]) / WEND_LANES);
}

/** Rows of this slice that exist: 8, less in the last one. */
static inline int32_t wend_pairs_lanes(const wend_pairs *p, int32_t slice) {
  const int32_t left = p->rows - slice * WEND_LANES;
  return left < WEND_LANES ? left : WEND_LANES;
}

#endif
