/* SPDX-License-Identifier: LGPL-3.0-or-later
 * choose.h: which particles or boxes of this rank another one may need, by its boxes. */
#ifndef WEND_SRC_CHOOSE_H
#define WEND_SRC_CHOOSE_H

#include "boxes.h"
#include "team.h"
#include "tree.h"

/** A list of local indices that grows. */
typedef struct wend_chosen {
  int32_t n, room;
  int32_t *list;
} wend_chosen;

/** Appends, ascending, every particle that may be a pair with one in any of the boxes. Local; a
 * failing allocation or a list beyond 2^31 - 1 is recorded and returned. */
wend_status wend_choose(wend_team *team, const wend_domain *domain, const wend_tree *tree,
                        const double (*place)[4], int32_t boxes, const wend_box *box,
                        wend_chosen *chosen);
/** Appends, ascending, boxes of this tree that hold all particles which may be a pair with one
 * in any of the boxes given: of the first level with more than `enough` of them (at most
 * WEND_FAN times as many), or of level 0. Local; failures as above. */
wend_status wend_choose_boxes(wend_team *team, const wend_domain *domain, const wend_tree *tree,
                              int32_t boxes, const wend_box *box, int32_t enough,
                              wend_chosen *chosen);
/** Frees the list and zeroes the struct. Local. */
void wend_chosen_reset(wend_chosen *chosen);

#endif
