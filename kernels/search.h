/* SPDX-License-Identifier: LGPL-3.0-or-later
 * search.h: neighbours of particles through the hierarchy of boxes.
 *
 * The search runs over all local particles (owned and ghosts) merged in canonical order
 * (Hilbert key, id); since boxes are walked in that order, lists come out in canonical order by
 * themselves. Ghosts are stored after the owned particles, hence the map from merged to storage
 * order. */
#ifndef WEND_KERNELS_SEARCH_H
#define WEND_KERNELS_SEARCH_H

#include "domain.h"
#include "pairs.h"
#include "smoothing.h"
#include "tree.h"

typedef struct wend_search {
  const wend_domain *domain;
  const wend_tree *tree;    /**< over `place` */
  const double (*place)[4]; /**< [n] x, y, z, H in merged order */
  const int32_t *store;     /**< [n] storage index of each merged particle */
  const int32_t *row;       /**< [rows] merged index of each row; ascending */
  int32_t rows;             /**< owned particles */
} wend_search;

/** Lists the pairs of rows, slice after slice: all j != i with r_ij < max(H_i, H_j), in
 * canonical order.
 *
 *  Starts at slice `begin`; appends to index[*used..capacity) in the layout of pairs.h, fills
 *  first[slice + 1] and count[8 slice..] and stops where the next slice does not fit.
 *  first[begin] must hold *used on entry. Returns the first slice not done: (rows + 7) / 8 at
 * the end; else the caller grows index and calls again (index from *used on is spoiled). Lists
 * are symmetric bit for bit: i lists j exactly when j lists i. In 2-D all z must be equal.
 * Local, allocates nothing. */
int32_t wend_search_pairs(const wend_search *search, int32_t begin, int32_t *restrict index,
                          int64_t capacity, int64_t *used, int64_t *restrict first,
                          int32_t *restrict count);

/** Solves supports: (unit-ball volume) H^D sum_j W(r_ij, H_i) = target, self included (4 pi/3
 * H^3 in 3-D, pi H^2 in 2-D), for the rows listed in todo[n], any order (neighbours in a row
 * are faster).
 *
 *  place[.][3] of a row is its trial radius (a level, see support.h); every particle within it
 *  must be present. support[k] receives the solution for row todo[k], or 0 where the trial was
 * too small. The solution does not depend on the trial. scratch [room] holds distances; returns
 * -1 where more than room particles stand within some trial, else the number solved. Local,
 *  allocates nothing. */
int32_t wend_search_supports(const wend_search *search, const wend_smoothing *smoothing,
                             double target, int32_t n, const int32_t *restrict todo,
                             double *restrict support, int32_t room, double *restrict scratch);

#endif
