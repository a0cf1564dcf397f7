/* SPDX-License-Identifier: LGPL-3.0-or-later
 * tree.h: a hierarchy of boxes over particles sorted along the Hilbert curve.
 *
 * Level 0 has one box for every WEND_LEAF consecutive particles, each further level one box for
 * every WEND_FAN boxes below it, up to a single box. A box knows its corners and the largest
 * support in it, so that one search serves supports that differ by 1000x. Boxes cost no
 * pointers. */
#ifndef WEND_KERNELS_TREE_H
#define WEND_KERNELS_TREE_H

#include <stdint.h>

#define WEND_LEAF 8
#define WEND_FAN 8
#define WEND_TREE_LEVELS 12

typedef struct wend_tree {
  int32_t n;                            /**< particles */
  int levels;                           /**< 0 where n = 0 */
  int32_t offset[WEND_TREE_LEVELS + 1]; /**< boxes of level k: [offset[k], offset[k + 1]) */
  double (*lo)[4]; /**< [boxes] lower corner; 4th: largest support inside */
  double (*hi)[4]; /**< [boxes] upper corner; 4th not used */
} wend_tree;

/** Boxes that a tree over n particles needs. Local. */
int32_t wend_tree_boxes(int32_t n);

/** Builds the tree: lo and hi are the caller's, [wend_tree_boxes(n)] each; place [n][4] holds
 *  x, y, z, H of particles in Hilbert order. Local, allocates nothing. */
void wend_tree_build(wend_tree *tree, int32_t n, const double (*place)[4], double (*lo)[4],
                     double (*hi)[4]);

#endif
