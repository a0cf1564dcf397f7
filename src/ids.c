/* SPDX-License-Identifier: LGPL-3.0-or-later
 * ids.c: checks that no particle id is used twice.
 *
 * Each id is sent to a rank chosen by a hash of it, so that equal ids meet and the load is
 * level whatever ids the user numbers particles by. Sorted there, equal ids are neighbours. */
#include "ids.h"
#include "deal.h"
#include <stdlib.h>

/* Finaliser of the splitmix64 generator (Steele, Lea & Flood 2014, OOPSLA). */
static int owner(uint64_t id, int ranks) {
  id = (id ^ id >> 30) * 0xbf58476d1ce4e5b9u;
  id = (id ^ id >> 27) * 0x94d049bb133111ebu;
  return (int)((id ^ id >> 31) % (uint64_t)ranks);
}

static int compare(const void *a, const void *b) {
  const uint64_t x = *(const uint64_t *)a, y = *(const uint64_t *)b;
  return (x > y) - (x < y);
}

/* Counts the ids that occur again, and finds the smallest of them. */
static int64_t repeated(int32_t n, uint64_t *id, uint64_t *smallest) {
  int64_t count = 0;
  if (n > 1) qsort(id, (size_t)n, sizeof *id, compare);
  for (int32_t i = 1; i < n; i++)
    if (id[i] == id[i - 1] && count++ == 0) *smallest = id[i];
  return count;
}

static void group_by_owner(const wend_deal *deal, int ranks, int32_t n, const uint64_t *id,
                           int *next, uint64_t *grouped) {
  for (int r = 0; r < ranks; r++) next[r] = deal->send_first[r];
  for (int32_t i = 0; i < n; i++) grouped[next[owner(id[i], ranks)]++] = id[i];
}

static wend_status report(wend_team *team, int64_t count, uint64_t smallest) {
  wend_team_count(team, 1, &count);
  if (MPI_Allreduce(MPI_IN_PLACE, &smallest, 1, MPI_UINT64_T, MPI_MIN, team->comm) !=
      MPI_SUCCESS)
    wend_fail(team, WEND_ERR_MPI, "ranks could not compare particle ids");
  if (count > 0)
    wend_fail(team, WEND_ERR_PARTICLES,
              "particle id %llu is used more than once (ids used again: %lld): give every "
              "particle an id of its own",
              (unsigned long long)smallest, (long long)count);
  return wend_agree(team);
}

wend_status wend_ids_unique(wend_team *team, int32_t n, const uint64_t *id) {
  wend_status status = WEND_OK;
  wend_deal deal = {0};
  uint64_t *grouped = NULL, *met = NULL;
  int *next = NULL;
  WEND_TRY(wend_deal_init(team, &deal));
  for (int32_t i = 0; i < n; i++) deal.send_count[owner(id[i], team->size)]++;
  WEND_TRY(wend_deal_begin(team, &deal));
  grouped = wend_allocate(team, n, sizeof *grouped);
  met = wend_allocate(team, deal.received, sizeof *met);
  next = wend_allocate(team, team->size, sizeof *next);
  WEND_TRY(wend_agree(team));
  group_by_owner(&deal, team->size, n, id, next, grouped);
  wend_deal_column(team, &deal, grouped, met);
  uint64_t smallest = UINT64_MAX;
  const int64_t count = repeated(deal.received, met, &smallest);
  WEND_TRY(report(team, count, smallest));
done:
  free(next);
  free(met);
  free(grouped);
  wend_deal_reset(&deal);
  return status;
}
