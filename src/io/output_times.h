/* SPDX-License-Identifier: LGPL-3.0-or-later
 * output_times.h: which output comes next, and when. Pure decisions on numbers that all ranks
 * share. */
#ifndef WEND_IO_OUTPUT_TIMES_H
#define WEND_IO_OUTPUT_TIMES_H

#include "setup.h"

/** How far a run got with its outputs. */
typedef struct wend_output_cursor {
  int64_t files;   /**< written so far: the number of the next one */
  int64_t rounds;  /**< multiples of output.every that lie behind */
  int64_t entries; /**< entries of output.times that lie behind */
} wend_output_cursor;

/** Next output time after the cursor: the next multiple of `every` from the start, the next
 * entry of `times`, or the end of the run. Local. */
double wend_output_next(const wend_setup *setup, double start,
                        const wend_output_cursor *cursor);
/** Moves the cursor past all output times up to `time`, or just after it: two times closer than
 * a billionth of the run are one. Local. */
void wend_output_pass(const wend_setup *setup, double start, double time,
                      wend_output_cursor *cursor);

#endif
