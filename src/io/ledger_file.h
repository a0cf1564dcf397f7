/* SPDX-License-Identifier: LGPL-3.0-or-later
 * ledger_file.h: the books as a table of text, FOLDER/NAME_ledger.tsv: one row a super-step, in
 * erg. */
#ifndef WEND_IO_LEDGER_FILE_H
#define WEND_IO_LEDGER_FILE_H

#include "run.h"
#include <stdio.h>

/** Open on rank 0 only. */
typedef struct wend_ledger_file {
  FILE *out;
  double erg; /**< energy of one run unit */
} wend_ledger_file;

/** Starts the table anew, or, after `steps` > 0 super-steps, goes on with the one that is
 * there: rows beyond are dropped, and missing ones are WEND_ERR_FILE. Collective. */
wend_status wend_ledger_file_open(wend_team *team, const wend_run *run, int64_t steps,
                                  wend_ledger_file *file);
/** Adds the row of the last super-step. Rank 0 writes; a failure shows at the next flush.
 * Local. */
void wend_ledger_file_add(wend_ledger_file *file, const wend_march *march);
/** Brings all rows to the disk. Collective. */
wend_status wend_ledger_file_flush(wend_team *team, const wend_ledger_file *file);
/** Closes it. Local. */
void wend_ledger_file_close(wend_ledger_file *file);

#endif
