/* SPDX-License-Identifier: LGPL-3.0-or-later
 * output_times.c: which output comes next, and when. */
#include "output_times.h"
#include <math.h>

/* 3 x 0.1 and 0.3 differ by a rounding, and no step should be made between them. */
static double same(const wend_setup *setup, double start) {
  return 1e-9 * (setup->end - start);
}

static double next_round(const wend_setup *setup, double start,
                         const wend_output_cursor *cursor) {
  return setup->every > 0 ? start + (double)(cursor->rounds + 1) * setup->every : INFINITY;
}

static double next_entry(const wend_setup *setup, const wend_output_cursor *cursor) {
  return cursor->entries < setup->n_times ? setup->times[cursor->entries] : INFINITY;
}

double wend_output_next(const wend_setup *setup, double start,
                        const wend_output_cursor *cursor) {
  const double next = fmin(next_round(setup, start, cursor), next_entry(setup, cursor));
  return next < setup->end - same(setup, start) ? next : setup->end;
}

void wend_output_pass(const wend_setup *setup, double start, double time,
                      wend_output_cursor *cursor) {
  const double limit = time + same(setup, start);
  if (setup->every > 0 && next_round(setup, start, cursor) <= limit)
    cursor->rounds = (int64_t)floor((limit - start) / setup->every);
  while (next_round(setup, start, cursor) <= limit) cursor->rounds++;
  while (next_entry(setup, cursor) <= limit) cursor->entries++;
}
