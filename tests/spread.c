/* SPDX-License-Identifier: GPL-3.0-or-later
 * spread.c: sets of particles dealt out to ranks in good and bad ways. */
#include "spread.h"
#include "cloud.h"

#include <math.h>
#include <mpi.h>
#include <stdlib.h>
#include <string.h>

static int allocations_left = -1;

spread spread_create(int kind, int dim, unsigned periodic, int32_t n, uint64_t seed) {
  spread s = {.n = n, .domain = {.dim = dim, .thickness = 1}};
  for (int a = 0; a < 3; a++) {
    const bool wraps = (periodic >> a & 1u) != 0 && a < dim;
    s.domain.hi[a] = a < dim ? 1 : 0;
    s.domain.period[a] = wraps ? 1 : 0;
    s.domain.half[a] = wraps ? 0.5 : INFINITY;
  }
  s.place = calloc((size_t)n + 1, sizeof *s.place);
  cloud_kinds[kind].fill(dim, n, s.place, seed);
  return s;
}

void spread_destroy(spread *s) { free(s->place); }

int spread_rank(const spread *s, spread_way way, int32_t i, int ranks) {
  uint64_t seed = (uint64_t)i;
  const int chance = (int)(cloud_random(&seed) * ranks);
  switch (way) {
  case SPREAD_TURNS:
    return (int)(i % ranks);
  case SPREAD_RANDOM:
    return chance;
  case SPREAD_BLOCKS:
    return (int)(s->place[i][0] * ranks);
  case SPREAD_HOLE:
    return chance == ranks / 2 ? 0 : chance;
  case SPREAD_LAST:
    return ranks - 1;
  default:
    return 0;
  }
}

/* The two factors are inverse to each other modulo 2^64. */
uint64_t spread_id(int32_t i) { return (uint64_t)(i + 1) * 0x9e3779b97f4a7c15u; }

int32_t spread_index(uint64_t id) { return (int32_t)(id * 0xf1de83e19937733du - 1); }

double spread_value(const spread *s, wend_column c, int32_t i) {
  if (c <= WEND_Z) return s->place[i][c - WEND_X];
  return c == WEND_SUPPORT ? s->place[i][3] : 1000.0 * c + 1.0 / (i + 1);
}

wend_particles spread_particles(wend_team *team, const spread *s, spread_way way) {
  const uint64_t mask =
      7u << WEND_X | 1u << WEND_SUPPORT | 1u << WEND_ENERGY | 1u << WEND_SOURCE;
  wend_particles p;
  int32_t n = 0;
  for (int32_t i = 0; i < s->n; i++) n += spread_rank(s, way, i, team->size) == team->rank;
  wend_particles_init(team, &p, n, mask);
  n = 0;
  for (int32_t i = 0; i < s->n; i++) {
    if (spread_rank(s, way, i, team->size) != team->rank) continue;
    p.id[n] = spread_id(i);
    for (int c = 0; c < WEND_COLUMNS; c++)
      if (p.column[c] != NULL) p.column[c][n] = spread_value(s, (wend_column)c, i);
    n++;
  }
  return p;
}

bool spread_everywhere(bool here) {
  int all = here;
  MPI_Allreduce(MPI_IN_PLACE, &all, 1, MPI_INT, MPI_MIN, MPI_COMM_WORLD);
  return all != 0;
}

bool spread_same_text(const char *text) {
  char first[WEND_TEXT_LENGTH] = "";
  strncpy(first, text, sizeof first - 1);
  MPI_Bcast(first, sizeof first, MPI_CHAR, 0, MPI_COMM_WORLD);
  return spread_everywhere(strcmp(first, text) == 0);
}

void spread_break(int number) { allocations_left = number; }

void *spread_allocate(size_t n, size_t size) {
  if (allocations_left == 0) return NULL;
  if (allocations_left > 0) allocations_left--;
  return calloc(n, size);
}
