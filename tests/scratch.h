/* SPDX-License-Identifier: GPL-3.0-or-later
 * scratch.h: a folder of its own for the files of one test program, shared by its ranks. */
#ifndef WEND_TESTS_SCRATCH_H
#define WEND_TESTS_SCRATCH_H

#include <stddef.h>

/** Makes an empty folder below $TMPDIR or /tmp. Collective over MPI_COMM_WORLD. */
void scratch_begin(void);
/** Removes it with the files in it. Collective. */
void scratch_end(void);
/** Path of a file in it; the text lives until the eighth next call. Local. */
const char *scratch_path(const char *name);
/** Writes a file on rank 0, and waits for all ranks. Collective. */
void scratch_write(const char *name, size_t size, const void *data);
/** Reads a whole file, ended by a 0 byte; NULL where there is none; to be freed. Local. */
char *scratch_read(const char *name, size_t *size);
/** Number of files in the folder. Local. */
int scratch_files(void);

#endif
