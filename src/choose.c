/* SPDX-License-Identifier: LGPL-3.0-or-later
 * choose.c: which particles or boxes of this rank another one may need, by its boxes.
 *
 * One descent of the tree with the boxes still near, a list that shrinks on the way down. */
#include "choose.h"
#include <stdlib.h>
#include <string.h>

typedef struct descent {
  wend_team *team;
  const wend_domain *domain;
  const wend_tree *tree;
  const double (*place)[4];
  const wend_box *box;
  int32_t boxes;
  int stop;      /* level whose boxes are chosen; -1: particles */
  int32_t *near; /* [levels + 1][boxes] boxes near the node entered at each level */
  wend_chosen *chosen;
} descent;

static bool grow(wend_team *team, wend_chosen *chosen) {
  if (chosen->n < chosen->room) return true;
  if (chosen->room == INT32_MAX) {
    wend_fail(team, WEND_ERR_PARTICLES,
              "rank %d would send more than %d ghosts: use fewer ranks, or smaller supports",
              team->rank, INT32_MAX);
    return false;
  }
  const int64_t wanted = chosen->room < 512 ? 1024 : 2 * (int64_t)chosen->room;
  const int32_t room = wanted < INT32_MAX ? (int32_t)wanted : INT32_MAX;
  int32_t *list = wend_allocate(team, room, sizeof *list);
  if (list == NULL) return false;
  if (chosen->n > 0) memcpy(list, chosen->list, (size_t)chosen->n * sizeof *list);
  free(chosen->list);
  chosen->list = list;
  chosen->room = room;
  return true;
}

static void append(const descent *d, int32_t item) {
  if (grow(d->team, d->chosen)) d->chosen->list[d->chosen->n++] = item;
}

/* Appends the particles of a leaf that are near any of the boxes left. */
static void take(const descent *d, int32_t leaf, int32_t n, const int32_t *near) {
  const int32_t first = leaf * WEND_LEAF;
  const int32_t last = first + WEND_LEAF < d->tree->n ? first + WEND_LEAF : d->tree->n;
  for (int32_t i = first; i < last; i++) {
    const double *p = d->place[i];
    const wend_box point = {{p[0], p[1], p[2], p[3]}, {p[0], p[1], p[2], 0}};
    int32_t k = 0;
    while (k < n && !wend_boxes_near(d->domain, &point, &d->box[near[k]])) k++;
    if (k < n) append(d, i);
  }
}

static void enter(const descent *d, int level, int32_t node, int32_t n, const int32_t *near) {
  const int32_t *const offset = d->tree->offset;
  const int32_t number = offset[level] + node;
  int32_t *const left = d->near + (int64_t)level * d->boxes;
  wend_box own;
  int32_t count = 0;
  memcpy(own.lo, d->tree->lo[number], sizeof own.lo);
  memcpy(own.hi, d->tree->hi[number], sizeof own.hi);
  for (int32_t k = 0; k < n; k++)
    if (wend_boxes_near(d->domain, &own, &d->box[near[k]])) left[count++] = near[k];
  if (count == 0) return;
  if (level == d->stop) append(d, number);
  if (level == 0 && d->stop < 0) take(d, node, count, left);
  if (level == 0 || level == d->stop) return;
  const int32_t below = offset[level] - offset[level - 1];
  for (int32_t c = node * WEND_FAN; c < (node + 1) * WEND_FAN && c < below; c++)
    enter(d, level - 1, c, count, left);
}

static wend_status descend(descent *d) {
  const wend_tree *const tree = d->tree;
  if (tree->n == 0 || d->boxes == 0) return WEND_OK;
  d->near = wend_allocate(d->team, (int64_t)(tree->levels + 1) * d->boxes, sizeof *d->near);
  if (d->near == NULL) return d->team->status;
  int32_t *const every = d->near + (int64_t)tree->levels * d->boxes;
  for (int32_t k = 0; k < d->boxes; k++) every[k] = k;
  enter(d, tree->levels - 1, 0, d->boxes, every);
  free(d->near);
  return d->team->status;
}

wend_status wend_choose(wend_team *team, const wend_domain *domain, const wend_tree *tree,
                        const double (*place)[4], int32_t boxes, const wend_box *box,
                        wend_chosen *chosen) {
  descent d = {team, domain, tree, place, box, boxes, -1, NULL, chosen};
  return descend(&d);
}

wend_status wend_choose_boxes(wend_team *team, const wend_domain *domain, const wend_tree *tree,
                              int32_t boxes, const wend_box *box, int32_t enough,
                              wend_chosen *chosen) {
  const int32_t first = chosen->n;
  for (int level = tree->levels - 1; level >= 0; level--) {
    descent d = {team, domain, tree, NULL, box, boxes, level, NULL, chosen};
    chosen->n = first;
    if (descend(&d) != WEND_OK || chosen->n - first > enough) break;
  }
  return team->status;
}

void wend_chosen_reset(wend_chosen *chosen) {
  free(chosen->list);
  memset(chosen, 0, sizeof *chosen);
}
