/* SPDX-License-Identifier: GPL-3.0-or-later
 * ring.h: the exact solution of the ring problem. */
#ifndef WEND_SCENES_RING_H
#define WEND_SCENES_RING_H

/** Value at place x and time t >= 0; at t = 0 the patch itself. Local. */
double wend_ring_exact(const double x[3], double t);

#endif
