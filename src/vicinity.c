/* SPDX-License-Identifier: LGPL-3.0-or-later
 * vicinity.c: owned particles and ghosts merged in canonical order. */
#include "vicinity.h"
#include <stdlib.h>
#include <string.h>

/* Ghosts' places, keys and ids; then the canonical order over all of them. */
static wend_status merge(wend_team *team, int32_t owned, const double (*place)[4],
                         const uint64_t *key, const uint64_t *id, wend_vicinity *v) {
  wend_status status = WEND_OK;
  uint64_t *keys = wend_allocate(team, v->local, sizeof *keys);
  uint64_t *ids = wend_allocate(team, v->local, sizeof *ids);
  v->place = wend_allocate(team, v->local, sizeof *v->place);
  v->merged = wend_allocate(team, v->local, sizeof *v->merged);
  WEND_TRY(wend_agree(team));
  if (owned > 0) {
    memcpy(v->place, place, (size_t)owned * sizeof *place);
    memcpy(keys, key, (size_t)owned * sizeof *key);
    memcpy(ids, id, (size_t)owned * sizeof *id);
  }
  /* A rank short of memory goes on to the agreement, so that its peers do not wait for ever. */
  wend_halo_exchange(team, &v->halo, v->place, 4, 4, sizeof(double));
  wend_halo_exchange(team, &v->halo, keys, 1, 1, sizeof(uint64_t));
  wend_halo_exchange(team, &v->halo, ids, 1, 1, sizeof(uint64_t));
  wend_merge_init(team, owned, v->halo.ghosts, keys, ids, &v->order);
  WEND_TRY(wend_agree(team));
  wend_merge_gather(&v->order, 4, (const double *)v->place, (double *)v->merged);
done:
  free(keys);
  free(ids);
  return status;
}

static wend_status grow_tree(wend_team *team, wend_vicinity *v) {
  const int32_t boxes = wend_tree_boxes(v->local);
  v->tree.lo = wend_allocate(team, boxes, sizeof *v->tree.lo);
  v->tree.hi = wend_allocate(team, boxes, sizeof *v->tree.hi);
  const wend_status status = wend_agree(team);
  if (status != WEND_OK) return status;
  wend_tree_build(&v->tree, v->local, v->merged, v->tree.lo, v->tree.hi);
  return WEND_OK;
}

wend_status wend_vicinity_init(wend_team *team, const wend_domain *domain, int32_t owned,
                               const double (*place)[4], const uint64_t *key,
                               const uint64_t *id, wend_vicinity *vicinity) {
  memset(vicinity, 0, sizeof *vicinity);
  wend_status status = wend_halo_build(team, domain, owned, place, &vicinity->halo);
  if (status != WEND_OK) return status;
  vicinity->local = owned + vicinity->halo.ghosts;
  WEND_TRY(merge(team, owned, place, key, id, vicinity));
  WEND_TRY(grow_tree(team, vicinity));
  vicinity->search = (wend_search){.domain = domain,
                                   .tree = &vicinity->tree,
                                   .place = vicinity->merged,
                                   .store = vicinity->order.store,
                                   .row = vicinity->order.row,
                                   .rows = owned};
done:
  if (status != WEND_OK) wend_vicinity_reset(vicinity);
  return status;
}

void wend_vicinity_reset(wend_vicinity *vicinity) {
  wend_halo_reset(&vicinity->halo);
  free(vicinity->place);
  free(vicinity->merged);
  wend_merge_reset(&vicinity->order);
  free(vicinity->tree.lo);
  free(vicinity->tree.hi);
  memset(vicinity, 0, sizeof *vicinity);
}
