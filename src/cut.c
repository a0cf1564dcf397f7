/* SPDX-License-Identifier: LGPL-3.0-or-later
 * cut.c: cuts the particles among ranks along the Hilbert curve.
 *
 * The new table is made beside the old one, which is given up only when every rank has all of
 * its new particles: whatever fails, the particles stay as they were. */
#include "cut.h"
#include "deal.h"
#include "hilbert.h"
#include "ids.h"
#include "order.h"
#include "split.h"
#include <stdlib.h>
#include <string.h>

enum { WORD = sizeof(uint64_t) };

typedef struct cut_work {
  uint64_t *key;      /* [n] as the particles stand */
  int32_t *order;     /* [n] canonical order of the particles as they stand */
  uint64_t *line;     /* [n] keys in that order */
  int64_t *before;    /* [n + 1] weight before each of them */
  uint64_t *start;    /* [size] first key of each rank */
  uint64_t *send;     /* [n] one column, in canonical order */
  uint64_t *recv;     /* [received] one column, grouped by sender */
  int32_t *arrival;   /* [received] canonical order of what arrived */
  wend_deal deal;     /* who sends how many to whom */
  wend_particles now; /* the new table */
} cut_work;

static void reset(cut_work *work) {
  free(work->key);
  free(work->order);
  free(work->line);
  free(work->before);
  free(work->start);
  free(work->send);
  free(work->recv);
  free(work->arrival);
  wend_deal_reset(&work->deal);
  wend_particles_reset(&work->now);
}

/* The columns present must be the same on all ranks, or a column would go to a rank that lacks
 * it. */
static wend_status check_columns(wend_team *team, const wend_domain *domain,
                                 const wend_particles *particles) {
  const uint64_t mask = wend_particles_mask(particles);
  uint64_t both[2] = {mask, ~mask};
  if (MPI_Allreduce(MPI_IN_PLACE, both, 2, MPI_UINT64_T, MPI_BAND, team->comm) != MPI_SUCCESS)
    wend_fail(team, WEND_ERR_MPI, "ranks could not compare their columns");
  if ((both[0] | both[1]) != UINT64_MAX)
    wend_fail(team, WEND_ERR_ARGUMENT,
              "ranks hold different columns of particles: add the missing ones everywhere");
  const uint64_t needed = domain->dim == 3 ? 7 : 3;
  if ((mask >> WEND_X & needed) != needed)
    wend_fail(team, WEND_ERR_ARGUMENT, "the particles have no positions: add the columns");
  int64_t total = particles->n;
  wend_team_count(team, 1, &total);
  if (total <= 0)
    wend_fail(team, WEND_ERR_PARTICLES, "there are no particles at all: nothing can be cut");
  return wend_agree(team);
}

static bool inside(const wend_domain *domain, const double *place) {
  for (int a = 0; a < domain->dim; a++) {
    if (!(place[a] >= domain->lo[a] && place[a] <= domain->hi[a])) return false;
    if (domain->period[a] > 0 && place[a] == domain->hi[a]) return false;
  }
  return true;
}

static void check_places(wend_team *team, const wend_domain *domain, int32_t n,
                         const double (*place)[4], const uint64_t *id) {
  for (int32_t i = 0; i < n; i++) {
    const double *p = place[i];
    if (inside(domain, p)) continue;
    wend_fail(
        team, WEND_ERR_PARTICLES,
        "particle %llu at (%.9g, %.9g, %.9g) is outside the domain, (%.9g, %.9g, %.9g) to "
        "(%.9g, %.9g, %.9g): wrap periodic positions, or enlarge the domain",
        (unsigned long long)id[i], p[0], p[1], p[2], domain->lo[0], domain->lo[1],
        domain->lo[2], domain->hi[0], domain->hi[1], domain->hi[2]);
    return;
  }
}

/* Keys in blocks: columns are gathered into places without a second copy of the positions. */
static void make_keys(wend_team *team, const wend_domain *domain,
                      const wend_particles *particles, uint64_t *key) {
  enum { BLOCK = 256 };
  double place[BLOCK][4];
  const double *const z = domain->dim == 3 ? particles->column[WEND_Z] : NULL;
  for (int32_t first = 0; first < particles->n; first += BLOCK) {
    const int32_t n = particles->n - first < BLOCK ? particles->n - first : BLOCK;
    for (int32_t i = 0; i < n; i++) {
      place[i][0] = particles->column[WEND_X][first + i];
      place[i][1] = particles->column[WEND_Y][first + i];
      place[i][2] = z != NULL ? z[first + i] : 0;
      place[i][3] = 0;
    }
    check_places(team, domain, n, (const double(*)[4])place, particles->id + first);
    wend_hilbert_keys(domain, n, (const double(*)[4])place, key + first);
  }
}

/* Sorts what this rank holds and sums its weights along the curve. */
static wend_status line_up(wend_team *team, const wend_domain *domain,
                           const wend_particles *particles, const uint32_t *weight,
                           cut_work *work) {
  const int32_t n = particles->n;
  work->key = wend_allocate(team, n, sizeof *work->key);
  work->order = wend_allocate(team, n, sizeof *work->order);
  work->line = wend_allocate(team, n, sizeof *work->line);
  work->before = wend_allocate(team, (int64_t)n + 1, sizeof *work->before);
  work->start = wend_allocate(team, team->size, sizeof *work->start);
  wend_status status = wend_agree(team);
  if (status != WEND_OK) return status;
  make_keys(team, domain, particles, work->key);
  wend_order(team, n, work->key, particles->id, work->order);
  status = wend_agree(team);
  if (status != WEND_OK) return status;
  for (int32_t k = 0; k < n; k++) {
    const int32_t i = work->order[k];
    const uint32_t own = weight != NULL && weight[i] > 0 ? weight[i] : 1;
    work->line[k] = work->key[i];
    work->before[k + 1] = work->before[k] + own;
  }
  return WEND_OK;
}

/* Finds the cuts, tells every rank how many particles come, and makes room for them. */
static wend_status make_room(wend_team *team, const wend_particles *particles, cut_work *work) {
  const int32_t n = particles->n;
  wend_status status = WEND_OK;
  WEND_TRY(wend_split(team, n, work->line, work->before, work->start));
  WEND_TRY(wend_deal_init(team, &work->deal));
  for (int r = 0; r < team->size; r++) {
    const int32_t first = wend_split_count(n, work->line, work->start[r]);
    const int32_t last =
        r + 1 < team->size ? wend_split_count(n, work->line, work->start[r + 1]) : n;
    work->deal.send_count[r] = last - first;
  }
  WEND_TRY(wend_deal_begin(team, &work->deal));
  const int32_t received = work->deal.received;
  work->send = wend_allocate(team, n, sizeof *work->send);
  work->recv = wend_allocate(team, received, sizeof *work->recv);
  work->arrival = wend_allocate(team, received, sizeof *work->arrival);
  wend_particles_init(team, &work->now, received, wend_particles_mask(particles));
  WEND_TRY(wend_agree(team));
done:
  return status;
}

/* Moves one column of 8-byte values of any type; the result stands in canonical order. */
static void move_column(wend_team *team, const cut_work *work, int32_t n, const void *from,
                        void *to) {
  const char *const old = from;
  char *const new = to;
  for (int32_t k = 0; k < n; k++)
    memcpy(&work->send[k], old + (size_t)work->order[k] * WORD, WORD);
  wend_deal_column(team, &work->deal, work->send, work->recv);
  for (int32_t k = 0; k < work->deal.received; k++)
    memcpy(new + (size_t)k *WORD, &work->recv[work->arrival[k]], WORD);
}

static wend_status move(wend_team *team, const wend_particles *particles, cut_work *work) {
  const int32_t n = particles->n, received = work->deal.received;
  for (int32_t k = 0; k < n; k++) work->send[k] = particles->id[work->order[k]];
  wend_deal_column(team, &work->deal, work->line, work->now.key);
  wend_deal_column(team, &work->deal, work->send, work->now.id);
  wend_order(team, received, work->now.key, work->now.id, work->arrival);
  const wend_status status = wend_agree(team);
  if (status != WEND_OK) return status;
  move_column(team, work, n, work->key, work->now.key);
  move_column(team, work, n, particles->id, work->now.id);
  for (int c = 0; c < WEND_COLUMNS; c++)
    if (particles->column[c] != NULL)
      move_column(team, work, n, particles->column[c], work->now.column[c]);
  return wend_agree(team);
}

wend_status wend_cut_particles(wend_team *team, const wend_domain *domain,
                               wend_particles *particles, const uint32_t *weight) {
  cut_work work = {0};
  wend_status status = WEND_OK;
  WEND_TRY(check_columns(team, domain, particles));
  WEND_TRY(line_up(team, domain, particles, weight, &work));
  WEND_TRY(wend_ids_unique(team, particles->n, particles->id));
  WEND_TRY(make_room(team, particles, &work));
  WEND_TRY(move(team, particles, &work));
  const wend_particles old = *particles;
  *particles = work.now;
  work.now = old;
done:
  reset(&work);
  return status;
}
