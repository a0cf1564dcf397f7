/* SPDX-License-Identifier: GPL-3.0-or-later
 * lattice.c: particles on a jittered lattice. */
#include "lattice.h"
#include "random.h"
#include <math.h>

wend_domain wend_scene_domain(int dim, const double lo[3], const double hi[3], bool periodic) {
  wend_domain d = {.dim = dim, .thickness = 1};
  for (int a = 0; a < 3; a++) {
    const bool used = a < dim;
    d.lo[a] = used ? lo[a] : 0;
    d.hi[a] = used ? hi[a] : 0;
    d.period[a] = used && periodic ? hi[a] - lo[a] : 0;
    d.half[a] = used && periodic ? d.period[a] / 2 : INFINITY;
  }
  return d;
}

/* Back into [lo, hi): around a periodic axis, reflected at the border of another. */
static double settle(const wend_domain *d, int axis, double x) {
  const double lo = d->lo[axis], hi = d->hi[axis];
  if (d->period[axis] > 0) {
    if (x < lo) x += d->period[axis];
    if (x >= hi) x -= d->period[axis];
    return x < lo ? lo : x;
  }
  if (x < lo) return 2 * lo - x;
  return x >= hi ? 2 * hi - x : x;
}

wend_status wend_lattice_fill(wend_team *team, const wend_domain *domain,
                              const wend_lattice *lattice, uint64_t mask,
                              wend_particles *particles) {
  const int64_t all = (int64_t)lattice->side[0] * lattice->side[1] * lattice->side[2];
  const int64_t begin = all * team->rank / team->size,
                end = all * (team->rank + 1) / team->size;
  mask |= 1u << WEND_X | 1u << WEND_Y | 1u << WEND_Z;
  wend_particles_init(team, particles, (int32_t)(end - begin), mask);
  const wend_status status = wend_agree(team);
  if (status != WEND_OK) return status;
  for (int64_t k = begin; k < end; k++) {
    int64_t rest = k;
    particles->id[k - begin] = (uint64_t)k + 1;
    for (int a = 0; a < domain->dim; a++) {
      const double spacing = (domain->hi[a] - domain->lo[a]) / lattice->side[a];
      const double cell = (double)(rest % lattice->side[a]);
      const double push =
          lattice->jitter * (2 * wend_random(lattice->seed, (uint64_t)k + 1, (uint64_t)a) - 1);
      rest /= lattice->side[a];
      particles->column[WEND_X + a][k - begin] =
          settle(domain, a, domain->lo[a] + (cell + 0.5 + push) * spacing);
    }
  }
  return WEND_OK;
}

wend_status wend_lattice_join(wend_team *team, wend_particles *particles,
                              const wend_particles *more) {
  wend_particles all;
  const int32_t n = particles->n, m = more->n;
  wend_particles_init(team, &all, n + m, wend_particles_mask(particles));
  const wend_status status = wend_agree(team);
  if (status != WEND_OK) {
    wend_particles_reset(&all);
    return status;
  }
  for (int32_t i = 0; i < n + m; i++) {
    const wend_particles *from = i < n ? particles : more;
    const int32_t k = i < n ? i : i - n;
    all.id[i] = from->id[k];
    for (int c = 0; c < WEND_COLUMNS; c++)
      if (all.column[c] != NULL) all.column[c][i] = from->column[c][k];
  }
  wend_particles_reset(particles);
  *particles = all;
  return WEND_OK;
}
