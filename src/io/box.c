/* SPDX-License-Identifier: LGPL-3.0-or-later
 * box.c: the domain as people write it: corners and the names of boundaries. */
#include "box.h"
#include <string.h>

static const char *const names[WEND_BOUNDARIES] = {"periodic", "closed", "open"};

const char *wend_boundary_name(wend_boundary boundary) { return names[boundary]; }

int wend_boundary_find(const char *name) {
  for (int b = 0; b < WEND_BOUNDARIES; b++)
    if (strcmp(names[b], name) == 0) return b;
  return -1;
}

wend_domain wend_box_make(int dim, const double *lo, const double *hi,
                          const wend_boundary *boundary, double thickness) {
  wend_domain domain = {.dim = dim, .thickness = dim == 2 ? thickness : 1};
  for (int a = 0; a < 3; a++) domain.half[a] = INFINITY;
  for (int a = 0; a < dim; a++) {
    domain.lo[a] = lo[a];
    domain.hi[a] = hi[a];
    domain.open[a] = boundary[a] == WEND_BOUNDARY_OPEN;
    if (boundary[a] != WEND_BOUNDARY_PERIODIC) continue;
    domain.period[a] = hi[a] - lo[a];
    domain.half[a] = domain.period[a] / 2;
  }
  return domain;
}

wend_boundary wend_box_boundary(const wend_domain *domain, int axis) {
  if (domain->period[axis] > 0) return WEND_BOUNDARY_PERIODIC;
  return domain->open[axis] ? WEND_BOUNDARY_OPEN : WEND_BOUNDARY_CLOSED;
}
