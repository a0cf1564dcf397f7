/* SPDX-License-Identifier: LGPL-3.0-or-later
 * order.h: the canonical order of particles, (Hilbert key, id). */
#ifndef WEND_SRC_ORDER_H
#define WEND_SRC_ORDER_H

#include "team.h"
#include <stdint.h>

/** Finds the canonical order: index [n] receives 0..n-1 sorted by (key, id).
 *
 * Costs n log2(runs) where the input falls into ascending runs: linear for sorted input, cheap
 * for a few sorted parts one after the other (what ranks send). Needs 48 bytes a particle
 * meanwhile. Local; a failing allocation is recorded and returned. */
wend_status wend_order(wend_team *team, int32_t n, const uint64_t *key, const uint64_t *id,
                       int32_t *index);

#endif
