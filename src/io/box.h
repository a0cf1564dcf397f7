/* SPDX-License-Identifier: LGPL-3.0-or-later
 * box.h: the domain as people write it: corners and the names of boundaries. */
#ifndef WEND_IO_BOX_H
#define WEND_IO_BOX_H

#include "domain.h"

typedef enum wend_boundary {
  WEND_BOUNDARY_PERIODIC,
  WEND_BOUNDARY_CLOSED,
  WEND_BOUNDARY_OPEN,
  WEND_BOUNDARIES
} wend_boundary;

/** "periodic", "closed", "open". Local; lives for ever. */
const char *wend_boundary_name(wend_boundary boundary);
/** Finds a boundary by name; -1 where there is none of that name. Local. */
int wend_boundary_find(const char *name);

/** Makes a domain of dim axes (2 or 3) with lo < hi. Local.
 *  lo, hi, boundary [dim]; thickness counts in 2-D only. */
wend_domain wend_box_make(int dim, const double *lo, const double *hi,
                          const wend_boundary *boundary, double thickness);
/** Boundary of an axis of a domain. Local. */
wend_boundary wend_box_boundary(const wend_domain *domain, int axis);

#endif
