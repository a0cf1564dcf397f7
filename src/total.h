/* SPDX-License-Identifier: LGPL-3.0-or-later
 * total.h: exact sums over all particles of all ranks: the same bits on any number of ranks. */
#ifndef WEND_SRC_TOTAL_H
#define WEND_SRC_TOTAL_H

#include "sum.h"
#include "team.h"

/** Adds n sums over ranks in one message; every rank receives the totals. Collective. */
void wend_total(wend_team *team, int n, wend_sum *sum);

/** Exact total of one column of n values, rounded once. Collective. */
double wend_total_of(wend_team *team, int64_t n, const double *value);

#endif
