/* SPDX-License-Identifier: LGPL-3.0-or-later
 * run_state.h: checkpoints of a run, from which it goes on with the same bits. */
#ifndef WEND_IO_RUN_STATE_H
#define WEND_IO_RUN_STATE_H

#include "run.h"

/** Writes FOLDER/NAME_checkpoint.h5 in place of an earlier one. The rows of the ledger up to
 * now must be on the disk. Collective. */
wend_status wend_run_save(wend_team *team, const wend_run *run);

/** Is there a checkpoint of the run? Collective. */
wend_status wend_run_saved(wend_team *team, const wend_run *run, bool *there);
/** Removes the checkpoint of an earlier run. Collective. */
wend_status wend_run_forget(wend_team *team, const wend_run *run);

/** Restores a run whose setup was read from its checkpoint, and builds it. Collective.
 *
 *  The ranks may be any number. A damaged checkpoint, or one of another setup, is
 * WEND_ERR_FILE. made_by [size] receives a sentence where the rest may differ in bits from an
 * undisturbed run, because another machine or version made the checkpoint; else it is empty. */
wend_status wend_run_restore(wend_team *team, wend_run *run, size_t size, char *made_by);

#endif
