/* SPDX-License-Identifier: GPL-3.0-or-later
 * gas.c: the same particles on any number of ranks, from places to the transport operator. */
#include "gas.h"

#include "cloud.h"
#include "cut.h"
#include "lattice.h"
#include "lists.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

/* A number in [0, 1) of a particle's own. */
static double chance(uint64_t id, uint64_t channel) {
  uint64_t seed = id * 16 + channel;
  cloud_random(&seed);
  return cloud_random(&seed);
}

/* Circles about a point off the middle, tilted in 3-D, their strength over a decade; no field
 * in a corner. Coefficients scatter little here, over two decades there. */
static void dress(const gas_plan *plan, wend_particles *p) {
  double **column = p->column;
  for (int32_t i = 0; i < p->n; i++) {
    const double x = column[WEND_X][i] - 0.2, y = column[WEND_Y][i] + 0.1;
    const double strength = pow(10, chance(p->id[i], 1));
    const bool none = plan->unmagnetised || (x > 0.3 && y < -0.3);
    column[WEND_BX][i] = none ? 0 : -y * strength;
    column[WEND_BY][i] = none ? 0 : x * strength;
    column[WEND_BZ][i] = none || plan->dim == 2 ? 0 : (0.3 + x * y) * strength;
    const double u = chance(p->id[i], 2);
    column[WEND_KPAR][i] = y > 0.2 ? 0.03 * pow(10, 2 * u - 1) : 1 + 0.1 * u;
    column[WEND_KPERP][i] = plan->across ? 0.05 * chance(p->id[i], 3) : 0;
    if (none && !plan->across && !plan->unmagnetised) column[WEND_KPAR][i] = 0;
    column[WEND_DENSITY][i] = 1 + chance(p->id[i], 5);
  }
}

/* All particles in canonical order, on one rank alone. */
static wend_status fill_alone(const gas_plan *plan, const wend_domain *domain,
                              wend_particles *p) {
  const wend_lattice lattice = {
      {plan->side, plan->side, plan->dim == 3 ? plan->side : 1}, plan->jitter, 7};
  uint64_t mask = 0;
  for (int a = 0; a < 3; a++) mask |= UINT64_C(1) << (WEND_BX + a);
  mask |= UINT64_C(1) << WEND_KPAR | UINT64_C(1) << WEND_KPERP | UINT64_C(1) << WEND_ENERGY |
          UINT64_C(1) << WEND_DENSITY;
  wend_team alone = gas_alone();
  wend_status status = wend_lattice_fill(&alone, domain, &lattice, mask, p);
  if (status == WEND_OK) dress(plan, p);
  if (status == WEND_OK) status = wend_cut_particles(&alone, domain, p, NULL);
  wend_team_reset(&alone);
  return status;
}

/* Keeps this rank's share: any, where the cut is to find the owners. */
static void keep_share(const wend_team *team, spread_way way, wend_particles *p) {
  const spread none = {.n = 0};
  int32_t kept = 0;
  for (int32_t i = 0; i < p->n; i++) {
    const int32_t number = (int32_t)p->id[i] - 1;
    const spread_way share = way == GAS_CUT ? SPREAD_RANDOM : way;
    if (spread_rank(&none, share, number, team->size) != team->rank) continue;
    p->id[kept] = p->id[i];
    p->key[kept] = p->key[i];
    for (int c = 0; c < WEND_COLUMNS; c++)
      if (p->column[c] != NULL) p->column[c][kept] = p->column[c][i];
    kept++;
  }
  p->n = kept;
}

wend_status gas_fill(wend_team *team, const gas_plan *plan, spread_way way, gas *g) {
  g->domain = lists_box(plan->dim, plan->periodic);
  g->settings = wend_settings_default();
  for (int a = 0; a < plan->dim; a++)
    g->domain.open[a] = plan->open && g->domain.period[a] == 0;
  const wend_status status = fill_alone(plan, &g->domain, &g->particles);
  if (status != WEND_OK) return status;
  g->all = g->particles.n;
  keep_share(team, way, &g->particles);
  if (way != GAS_CUT) return WEND_OK;
  return wend_cut_particles(team, &g->domain, &g->particles, NULL);
}

wend_status gas_build(wend_team *team, const gas_plan *plan, spread_way way,
                      const wend_settings *settings, gas *g) {
  wend_status status = gas_fill(team, plan, way, g);
  g->settings = *settings;
  if (status == WEND_OK)
    status = wend_geometry_init(team, &g->domain, &g->settings, &g->particles, &g->geometry);
  if (status == WEND_OK)
    status =
        wend_transport_init(team, &g->settings, &g->particles, &g->geometry, &g->transport);
  return status;
}

void gas_reset(gas *g) {
  wend_transport_reset(&g->transport);
  wend_geometry_reset(&g->geometry);
  wend_particles_reset(&g->particles);
}

static double density(gas_state state, uint64_t id, double x, double y) {
  const double u = chance(id, 4);
  switch (state) {
  case GAS_SMOOTH:
    return 2 + sin(M_PI * x) * cos(M_PI * y + 1);
  case GAS_DECADES:
    return x > 0.4 ? 0 : pow(10, -12 * u);
  case GAS_JUMPS:
    return fabs(x) < 0.4 && fabs(y) < 0.5 ? 12 : u < 0.1 ? 11 : 10;
  default:
    return 0.1;
  }
}

void gas_energise(gas *g, gas_state state) {
  const wend_particles *p = &g->particles;
  for (int32_t i = 0; i < p->n; i++)
    p->column[WEND_ENERGY][i] =
        density(state, p->id[i], p->column[WEND_X][i], p->column[WEND_Y][i]) *
        g->geometry.volume[i];
}

uint64_t *gas_gather(wend_team *team, const gas *g, int width, const double *value) {
  const int count = g->all * width;
  uint64_t *bits = calloc((size_t)count + 1, sizeof *bits);
  for (int32_t i = 0; i < g->particles.n; i++)
    memcpy(&bits[(int64_t)(g->particles.id[i] - 1) * width], &value[(int64_t)i * width],
           (size_t)width * sizeof *bits);
  MPI_Allreduce(MPI_IN_PLACE, bits, count, MPI_UINT64_T, MPI_BOR, team->comm);
  return bits;
}

wend_team gas_alone(void) {
  wend_team alone;
  wend_team_init(&alone, MPI_COMM_SELF);
  return alone;
}
