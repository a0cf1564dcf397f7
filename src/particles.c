/* SPDX-License-Identifier: LGPL-3.0-or-later
 * particles.c: the table of particles a rank owns. */
#include "particles.h"
#include <stdlib.h>
#include <string.h>

wend_status wend_particles_init(wend_team *team, wend_particles *particles, int32_t n,
                                uint64_t mask) {
  memset(particles, 0, sizeof *particles);
  particles->n = n;
  particles->id = wend_allocate(team, n, sizeof *particles->id);
  particles->key = wend_allocate(team, n, sizeof *particles->key);
  for (int c = 0; c < WEND_COLUMNS; c++)
    if (mask >> c & 1) wend_particles_add(team, particles, (wend_column)c);
  return team->status;
}

/* An empty rank still has its columns: NULL means absent. */
wend_status wend_particles_add(wend_team *team, wend_particles *particles, wend_column column) {
  if (particles->column[column] == NULL)
    particles->column[column] =
        wend_allocate(team, particles->n > 0 ? particles->n : 1, sizeof(double));
  return team->status;
}

void wend_particles_reset(wend_particles *particles) {
  free(particles->id);
  free(particles->key);
  for (int c = 0; c < WEND_COLUMNS; c++) free(particles->column[c]);
  memset(particles, 0, sizeof *particles);
}

uint64_t wend_particles_mask(const wend_particles *particles) {
  uint64_t mask = 0;
  for (int c = 0; c < WEND_COLUMNS; c++)
    if (particles->column[c] != NULL) mask |= (uint64_t)1 << c;
  return mask;
}
