/* SPDX-License-Identifier: LGPL-3.0-or-later
 * particle_file_place.c: brings the positions of a file into the domain of the run. */
#include "particle_file.h"
#include <inttypes.h>

/* A place beyond an edge by rounding may land on the other edge itself: hi is outside, lo
 * inside. */
static double wrapped(double x, double lo, double hi, double period) {
  if (x >= hi) x -= period;
  if (x < lo) x += period;
  return x >= hi ? lo : x;
}

static void place_axis(wend_team *team, const char *path, const wend_domain *domain, int axis,
                       wend_particles *particles) {
  double *x = particles->column[WEND_X + axis];
  const double lo = domain->lo[axis], hi = domain->hi[axis], period = domain->period[axis];
  for (int32_t i = 0; i < particles->n; i++) {
    const bool inside = x[i] >= lo - period && x[i] <= hi + period;
    if (!inside) {
      wend_fail(team, WEND_ERR_PARTICLES,
                "%s: particle id %" PRIu64
                " lies outside the box: %c = %.17g is not in [%.17g, %.17g]%s",
                path, particles->id[i], "xyz"[axis], x[i], lo, hi,
                period > 0 ? " nor within a period of it" : "");
      return;
    }
    if (period > 0) x[i] = wrapped(x[i], lo, hi, period);
  }
}

wend_status wend_particle_file_place(wend_team *team, const char *path,
                                     const wend_domain *domain, wend_particles *particles) {
  for (int a = 0; a < 3; a++)
    if (particles->column[WEND_X + a] != NULL) place_axis(team, path, domain, a, particles);
  return wend_agree(team);
}
