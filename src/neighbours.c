/* SPDX-License-Identifier: LGPL-3.0-or-later
 * neighbours.c: pair lists, trimmed halos, and which slices can work while a halo is in flight.
 */
#include "neighbours.h"
#include "vicinity.h"
#include <stdlib.h>
#include <string.h>

/* Entries a row that the first allocation foresees; more are fetched as needed. */
enum { FORESEEN = 32 };

/* Room for what all slices will need, judged by those done so far. */
static int64_t more_room(int32_t done, int32_t slices, int64_t used, int64_t capacity) {
  const int64_t judged = done > 0 ? used / done * slices : 0;
  return (judged > capacity ? judged : capacity) + capacity / 8 + 4096;
}

static wend_status search(wend_team *team, const wend_search *search, wend_neighbours *nb) {
  const int32_t slices = (search->rows + WEND_LANES - 1) / WEND_LANES;
  int64_t capacity = (int64_t)slices * WEND_LANES * FORESEEN + 4096, used = 0;
  nb->first = wend_allocate(team, slices + 1, sizeof *nb->first);
  nb->count = wend_allocate(team, (int64_t)slices * WEND_LANES, sizeof *nb->count);
  nb->index = malloc((size_t)capacity * sizeof *nb->index);
  for (int32_t done = 0; team->status == WEND_OK && done < slices;) {
    if (nb->index != NULL)
      done = wend_search_pairs(search, done, nb->index, capacity, &used, nb->first, nb->count);
    if (nb->index != NULL && done == slices) break;
    capacity = more_room(done, slices, used, capacity);
    int32_t *grown = realloc(nb->index, (size_t)capacity * sizeof *grown);
    if (grown == NULL)
      wend_fail(team, WEND_ERR_MEMORY, "rank %d: no memory for neighbour lists: use more ranks",
                team->rank);
    else
      nb->index = grown;
  }
  if (used > 0 && team->status == WEND_OK) {
    int32_t *fitted = realloc(nb->index, (size_t)used * sizeof *fitted);
    if (fitted != NULL) nb->index = fitted;
  }
  nb->pairs = (wend_pairs){search->rows, slices, nb->first, nb->count, nb->index};
  return wend_agree(team);
}

/* Drops ghosts that no pair needs, and gives the rest their new numbers. */
static wend_status trim(wend_team *team, wend_vicinity *vicinity, wend_neighbours *nb) {
  wend_status status = WEND_OK;
  const int32_t owned = nb->owned, ghosts = vicinity->halo.ghosts;
  const int64_t entries = wend_neighbours_entries(nb);
  bool *used = wend_allocate(team, ghosts, sizeof *used);
  int32_t *renumber = wend_allocate(team, ghosts, sizeof *renumber);
  WEND_TRY(wend_agree(team));
  for (int64_t k = 0; k < entries; k++)
    if (nb->index[k] >= owned) used[nb->index[k] - owned] = true;
  WEND_TRY(wend_halo_trim(team, &vicinity->halo, used, renumber));
  for (int64_t k = 0; k < entries; k++)
    if (nb->index[k] >= owned) nb->index[k] = owned + renumber[nb->index[k] - owned];
  for (int32_t g = 0; g < ghosts; g++)
    if (renumber[g] >= 0)
      memcpy(vicinity->place[owned + renumber[g]], vicinity->place[owned + g],
             sizeof *vicinity->place);
done:
  free(used);
  free(renumber);
  return status;
}

static bool sees_ghost(const wend_pairs *p, int32_t slice) {
  for (int64_t k = p->first[slice]; k < p->first[slice + 1]; k++)
    if (p->index[k] >= p->rows) return true;
  return false;
}

static wend_status sort_slices(wend_team *team, wend_neighbours *nb) {
  const int32_t slices = nb->pairs.slices;
  nb->slice = wend_allocate(team, slices, sizeof *nb->slice);
  bool *border = wend_allocate(team, slices, sizeof *border);
  const wend_status status = wend_agree(team);
  int32_t inside = 0, outside = 0;
  if (status == WEND_OK) {
    for (int32_t s = 0; s < slices; s++) inside += !(border[s] = sees_ghost(&nb->pairs, s));
    outside = inside;
    inside = 0;
    for (int32_t s = 0; s < slices; s++) nb->slice[border[s] ? outside++ : inside++] = s;
    nb->interior = (wend_slices){inside, nb->slice};
    nb->border = (wend_slices){slices - inside, slices > 0 ? nb->slice + inside : NULL};
    nb->all = (wend_slices){slices, nb->slice};
  }
  free(border);
  return status;
}

wend_status wend_neighbours_init(wend_team *team, const wend_domain *domain,
                                 const wend_particles *particles, const double (*place)[4],
                                 wend_neighbours *neighbours) {
  wend_status status = WEND_OK;
  wend_vicinity vicinity = {0};
  memset(neighbours, 0, sizeof *neighbours);
  neighbours->owned = particles->n;
  WEND_TRY(wend_vicinity_init(team, domain, particles->n, place, particles->key, particles->id,
                              &vicinity));
  WEND_TRY(search(team, &vicinity.search, neighbours));
  WEND_TRY(trim(team, &vicinity, neighbours));
  WEND_TRY(sort_slices(team, neighbours));
  neighbours->halo = vicinity.halo;
  neighbours->place = vicinity.place;
  neighbours->local = particles->n + neighbours->halo.ghosts;
  memset(&vicinity.halo, 0, sizeof vicinity.halo);
  vicinity.place = NULL;
done:
  wend_vicinity_reset(&vicinity);
  if (status != WEND_OK) wend_neighbours_reset(neighbours);
  return status;
}

void wend_neighbours_reset(wend_neighbours *neighbours) {
  wend_halo_reset(&neighbours->halo);
  free(neighbours->place);
  free(neighbours->first);
  free(neighbours->count);
  free(neighbours->index);
  free(neighbours->slice);
  memset(neighbours, 0, sizeof *neighbours);
}

int64_t wend_neighbours_entries(const wend_neighbours *neighbours) {
  return neighbours->pairs.slices > 0 ? neighbours->first[neighbours->pairs.slices] : 0;
}
