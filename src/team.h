/* SPDX-License-Identifier: LGPL-3.0-or-later
 * team.h: the ranks that work together, and how an error on one becomes an error on all.
 *
 * A local failure is recorded with wend_fail and execution goes on to the next wend_agree,
 * where every rank learns the failure of the lowest failing rank: all return the same status
 * together. */
#ifndef WEND_SRC_TEAM_H
#define WEND_SRC_TEAM_H

#include "wend.h"
#include <mpi.h>
#include <stdbool.h>

#define WEND_TEXT_LENGTH 1024

typedef struct wend_team {
  MPI_Comm comm;
  int rank, size;
  wend_status status;          /**< first failure of this rank since the last agreement */
  char text[WEND_TEXT_LENGTH]; /**< what went wrong, where, and what to do */
  void *(*allocate)(size_t n, size_t size); /**< calloc, unless a test replaces it */
} wend_team;

/** Duplicates the communicator, with errors returned. Collective. */
wend_status wend_team_init(wend_team *team, MPI_Comm comm);
/** Frees the duplicate. Collective. */
void wend_team_reset(wend_team *team);

/** Records a failure of this rank (the first since the last agreement counts); returns it.
 * Local. */
wend_status wend_fail(wend_team *team, wend_status status, const char *format, ...)
    __attribute__((format(printf, 3, 4)));

/** Agrees on the failure of the lowest failing rank, copies its text to all, clears the pending
 *  failure and returns the status: the same on every rank. Collective. */
wend_status wend_agree(wend_team *team);

/** Largest and smallest over ranks, in place. A NaN on any rank gives a NaN on all. Collective.
 */
void wend_team_max(wend_team *team, int n, double *value);
void wend_team_min(wend_team *team, int n, double *value);
/** Sum of 64-bit counts over ranks, in place. Collective. */
void wend_team_count(wend_team *team, int n, int64_t *value);

/** Allocates n items of `size` bytes, zeroed; NULL for none; records WEND_ERR_MEMORY. Local. */
void *wend_allocate(wend_team *team, int64_t n, size_t size);

/** Leaves the enclosing function through its `done:` label when a call fails. */
#define WEND_TRY(call)                                                                         \
  do {                                                                                         \
    status = (call);                                                                           \
    if (status != WEND_OK) goto done;                                                          \
  } while (0)

#endif
