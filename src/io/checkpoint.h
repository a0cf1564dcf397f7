/* SPDX-License-Identifier: LGPL-3.0-or-later
 * checkpoint.h: a container for everything that decides the future of a run, to the bit.
 *
 * A checkpoint holds columns, one value a particle in canonical order, and globals, small
 * arrays that are the same on all ranks. It knows its setup, and the processor and math library
 * it was made with. */
#ifndef WEND_IO_CHECKPOINT_H
#define WEND_IO_CHECKPOINT_H

#include "team.h"
#include <stdint.h>

typedef enum wend_value_type {
  WEND_VALUE_DOUBLE,
  WEND_VALUE_UINT64,
  WEND_VALUE_INT64
} wend_value_type;

/** A named array. */
typedef struct wend_checkpoint_item {
  const char *name; /**< letters, digits and underscore; unlike all others of its kind */
  wend_value_type type;
  int64_t n;  /**< values; of a column written it is not read: a value a row */
  void *data; /**< [n] */
} wend_checkpoint_item;

typedef struct wend_checkpoint {
  uint64_t setup_hash;          /**< wend_setup_hash of the run */
  int64_t rows;                 /**< particles of this rank */
  int columns, globals;         /**< numbers of items */
  wend_checkpoint_item *column; /**< [columns] the same names on all ranks */
  wend_checkpoint_item *global; /**< [globals] the same on all ranks, values too */
  /* Filled by read: */
  int64_t first, total; /**< this rank's rows are [first, first + rows) of total */
  bool other_processor; /**< bits may change: another processor than on some rank now */
  bool other_math; /**< bits may change: another math library, or one that rounds differently */
  bool other_version; /**< bits may change: another version of wend */
  char made_by[256];  /**< version, processor and math library of the writer */
} wend_checkpoint;

/** Writes a checkpoint. Collective.
 *
 *  Written to path.part, synced and renamed: the previous checkpoint of that name lives until
 * the new one is complete. The bytes of the arrays do not depend on the number of ranks. A
 * global that differs among ranks is WEND_ERR_ARGUMENT and is named. The items are the
 * caller's. */
wend_status wend_checkpoint_write(wend_team *team, const char *path,
                                  const wend_checkpoint *from);

/** Reads a whole checkpoint. Collective.
 *
 *  Rows are dealt out in blocks of equal length (longer by one on the first ranks), in order. A
 * damaged file (every array carries a checksum) or one of another setup is WEND_ERR_FILE. The
 * arrays belong to *into until wend_checkpoint_reset; on failure it is reset. */
wend_status wend_checkpoint_read(wend_team *team, const char *path, uint64_t setup_hash,
                                 wend_checkpoint *into);

/** Finds a column or global that was read; n is its expected number of values, -1: any. A
 * missing one, or one of another type or length, is WEND_ERR_FILE, recorded, and gives NULL; an
 * array of no values is not NULL. Local, but the same on all ranks. */
void *wend_checkpoint_column(wend_team *team, const wend_checkpoint *from, const char *name,
                             wend_value_type type);
void *wend_checkpoint_global(wend_team *team, const wend_checkpoint *from, const char *name,
                             wend_value_type type, int64_t n);

/** Gives away the array of a column that was read, to be freed with free(); NULL where there is
 * none of that name and type. Local, but the same on all ranks. */
void *wend_checkpoint_take(wend_checkpoint *from, const char *name, wend_value_type type);

/** Frees what read allocated and zeroes the struct. Local. */
void wend_checkpoint_reset(wend_checkpoint *checkpoint);

#endif
