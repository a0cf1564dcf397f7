/* SPDX-License-Identifier: LGPL-3.0-or-later
 * split.c: where to cut a sorted line of keys so that the parts weigh the same.
 *
 * All cuts are sought at once, four bits of the key a round: every rank weighs its keys below
 * 15 probes a cut, one sum of integers over ranks, and each cut keeps the last probe that does
 * not lie beyond its ideal place. */
#include "split.h"
#include <stdlib.h>

enum { BITS = 4, PROBES = (1 << BITS) - 1 };

int32_t wend_split_count(int32_t n, const uint64_t *key, uint64_t bound) {
  int32_t first = 0, last = n;
  while (first < last) {
    const int32_t middle = first + (last - first) / 2;
    if (key[middle] < bound)
      first = middle + 1;
    else
      last = middle;
  }
  return first;
}

/* total * r / ranks, without the product overflowing. */
static int64_t ideal(int64_t total, int r, int ranks) {
  return total / ranks * r + total % ranks * r / ranks;
}

/* One round: moves start[1..size-1] forward by a multiple of 2^shift. */
static void refine(wend_team *team, int shift, int32_t n, const uint64_t *key,
                   const int64_t *before, int64_t total, int64_t *below, uint64_t *start) {
  const int cuts = team->size - 1;
  for (int c = 0; c < cuts; c++)
    for (int m = 0; m < PROBES; m++)
      below[c * PROBES + m] =
          before[wend_split_count(n, key, start[c + 1] + ((uint64_t)(m + 1) << shift))];
  wend_team_count(team, cuts * PROBES, below);
  for (int c = 0; c < cuts; c++) {
    const int64_t goal = ideal(total, c + 1, team->size);
    uint64_t steps = 0;
    while (steps < PROBES && below[c * PROBES + (int)steps] <= goal) steps++;
    start[c + 1] += steps << shift;
  }
}

/* The ideal place lies inside the keys equal to start: puts them on the side that is nearer. */
static void round_off(wend_team *team, int32_t n, const uint64_t *key, const int64_t *before,
                      int64_t total, int64_t *below, uint64_t *start) {
  const int cuts = team->size - 1;
  for (int c = 0; c < cuts; c++) {
    below[2 * c] = before[wend_split_count(n, key, start[c + 1])];
    below[2 * c + 1] = before[wend_split_count(n, key, start[c + 1] + 1)];
  }
  wend_team_count(team, 2 * cuts, below);
  for (int c = 0; c < cuts; c++) {
    const int64_t goal = ideal(total, c + 1, team->size);
    if (below[2 * c + 1] - goal < goal - below[2 * c]) start[c + 1]++;
  }
}

wend_status wend_split(wend_team *team, int32_t n, const uint64_t *key, const int64_t *before,
                       uint64_t *start) {
  int64_t total = before[n];
  int64_t *below = wend_allocate(team, (int64_t)(team->size - 1) * PROBES, sizeof *below);
  wend_status status = WEND_OK;
  WEND_TRY(wend_agree(team));
  wend_team_count(team, 1, &total);
  for (int r = 0; r < team->size; r++) start[r] = 0;
  for (int shift = 64 - BITS; shift >= 0; shift -= BITS)
    refine(team, shift, n, key, before, total, below, start);
  round_off(team, n, key, before, total, below, start);
  WEND_TRY(wend_agree(team));
done:
  free(below);
  return status;
}
