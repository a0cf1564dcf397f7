/* SPDX-License-Identifier: GPL-3.0-or-later
 * gas.h: the same particles on any number of ranks, from places to the transport operator, for
 * the tests of the library. */
#ifndef WEND_TESTS_GAS_H
#define WEND_TESTS_GAS_H

#include "spread.h"
#include "transport.h"

/** What the gas is like: a jittered lattice in [-1, 1]^dim. */
typedef struct gas_plan {
  int dim;
  unsigned periodic; /**< bit a set: axis a is periodic */
  bool open;         /**< other axes are open, else closed */
  int side;          /**< particles an axis */
  double jitter;     /**< in spacings */
  bool across;       /**< kappa_perp > 0 somewhere */
  bool unmagnetised; /**< B = 0 everywhere, else in one region */
} gas_plan;

typedef struct gas {
  wend_domain domain;
  wend_settings settings;
  int32_t all;              /**< particles on all ranks; ids are 1 to this */
  wend_particles particles; /**< with B, kappa_par, kappa_perp, density and energy */
  wend_geometry geometry;
  wend_transport transport;
} gas;

/** Cut along the Hilbert curve, instead of one of the ways of spread.h. */
#define GAS_CUT SPREAD_WAYS

/** Makes the particles, dealt out to the ranks in some way, in canonical order. Collective; the
 * gas must be zero. */
wend_status gas_fill(wend_team *team, const gas_plan *plan, spread_way way, gas *g);
/** Fills, and builds geometry and transport by the settings of the gas. Collective. */
wend_status gas_build(wend_team *team, const gas_plan *plan, spread_way way,
                      const wend_settings *settings, gas *g);
void gas_reset(gas *g);

/** Kinds of states: smooth; over 12 decades with a region at 0; few values with jumps;
 * constant.
 */
typedef enum gas_state {
  GAS_SMOOTH,
  GAS_DECADES,
  GAS_JUMPS,
  GAS_CONSTANT,
  GAS_STATES
} gas_state;

/** Sets E = e V. Local. */
void gas_energise(gas *g, gas_state state);

/** Bits of `width` doubles a particle from all ranks, by id: [all][width], to be freed.
 * Collective. */
uint64_t *gas_gather(wend_team *team, const gas *g, int width, const double *value);

/** One rank alone, whatever MPI_COMM_WORLD is. */
wend_team gas_alone(void);

#endif
