/* SPDX-License-Identifier: LGPL-3.0-or-later
 * merge.c: owned particles and ghosts as one line in canonical order. */
#include "merge.h"
#include "order.h"
#include <stdlib.h>
#include <string.h>

wend_status wend_merge_init(wend_team *team, int32_t owned, int32_t ghosts, const uint64_t *key,
                            const uint64_t *id, wend_merge *merge) {
  memset(merge, 0, sizeof *merge);
  merge->n = owned + ghosts;
  merge->rows = owned;
  merge->store = wend_allocate(team, merge->n, sizeof *merge->store);
  merge->row = wend_allocate(team, owned, sizeof *merge->row);
  if (team->status != WEND_OK) return team->status;
  wend_order(team, merge->n, key, id, merge->store);
  if (team->status != WEND_OK) return team->status;
  int32_t rows = 0;
  for (int32_t m = 0; m < merge->n; m++) {
    if (merge->store[m] >= owned) continue;
    if (merge->store[m] != rows)
      return wend_fail(team, WEND_ERR_ARGUMENT,
                       "rank %d holds its particles out of order: sort them by (key, id)",
                       team->rank);
    merge->row[rows++] = m;
  }
  return WEND_OK;
}

void wend_merge_gather(const wend_merge *merge, int width, const double *restrict stored,
                       double *restrict merged) {
  for (int32_t m = 0; m < merge->n; m++)
    for (int k = 0; k < width; k++)
      merged[(int64_t)m * width + k] = stored[(int64_t)merge->store[m] * width + k];
}

void wend_merge_reset(wend_merge *merge) {
  free(merge->store);
  free(merge->row);
  memset(merge, 0, sizeof *merge);
}
