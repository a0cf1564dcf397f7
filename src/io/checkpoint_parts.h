/* SPDX-License-Identifier: LGPL-3.0-or-later
 * checkpoint_parts.h: what writing and reading checkpoints share. Private. */
#ifndef WEND_IO_CHECKPOINT_PARTS_H
#define WEND_IO_CHECKPOINT_PARTS_H

#include "checkpoint.h"
#include <hdf5.h>

#define WEND_CHECKPOINT_FORMAT 1 /* raised when old checkpoints cannot be read any more */
#define WEND_CHECKPOINT_TEXT 128 /* bytes of a text attribute at most */

/** Native HDF5 type of a value. Local. */
hid_t wend_checkpoint_type(wend_value_type type);

#endif
