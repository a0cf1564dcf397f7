/* SPDX-License-Identifier: LGPL-3.0-or-later
 * team.c: ranks that work together, agreement on failures, reductions that keep bits. */
#include "team.h"
#include <math.h>
#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

wend_status wend_team_init(wend_team *team, MPI_Comm comm) {
  memset(team, 0, sizeof *team);
  team->allocate = calloc;
  if (MPI_Comm_dup(comm, &team->comm) != MPI_SUCCESS) return WEND_ERR_MPI;
  MPI_Comm_set_errhandler(team->comm, MPI_ERRORS_RETURN);
  MPI_Comm_rank(team->comm, &team->rank);
  MPI_Comm_size(team->comm, &team->size);
  return WEND_OK;
}

void wend_team_reset(wend_team *team) {
  if (team->size > 0) MPI_Comm_free(&team->comm);
  memset(team, 0, sizeof *team);
}

wend_status wend_fail(wend_team *team, wend_status status, const char *format, ...) {
  if (team->status != WEND_OK) return team->status;
  va_list arguments;
  va_start(arguments, format);
  vsnprintf(team->text, sizeof team->text, format, arguments);
  va_end(arguments);
  return team->status = status;
}

wend_status wend_agree(wend_team *team) {
  int pending[2] = {team->status == WEND_OK ? team->size : team->rank, (int)team->status};
  int first = pending[0];
  if (MPI_Allreduce(pending, &first, 1, MPI_INT, MPI_MIN, team->comm) != MPI_SUCCESS)
    return wend_fail(team, WEND_ERR_MPI, "ranks could not agree: the message layer failed");
  team->status = WEND_OK;
  if (first == team->size) return WEND_OK;
  MPI_Bcast(&pending[1], 1, MPI_INT, first, team->comm);
  MPI_Bcast(team->text, WEND_TEXT_LENGTH, MPI_CHAR, first, team->comm);
  return (wend_status)pending[1];
}

enum { AT_ONCE = 32 }; /* values a reduction carries; more go in several */

/* MPI_MAX and MPI_MIN leave NaN undefined, so a NaN travels as a flag beside the values. */
static void reduce_some(wend_team *team, int n, double *value, MPI_Op op, double neutral) {
  double mine[2 * AT_ONCE] = {0}, all[2 * AT_ONCE] = {0};
  const double flag = op == MPI_MAX ? 1 : -1;
  for (int k = 0; k < n; k++) {
    mine[k] = isnan(value[k]) ? neutral : value[k];
    mine[n + k] = isnan(value[k]) ? flag : 0;
  }
  if (MPI_Allreduce(mine, all, 2 * n, MPI_DOUBLE, op, team->comm) != MPI_SUCCESS)
    wend_fail(team, WEND_ERR_MPI, "a reduction over ranks failed");
  for (int k = 0; k < n; k++) value[k] = all[n + k] != 0 ? NAN : all[k];
}

static void reduce(wend_team *team, int n, double *value, MPI_Op op, double neutral) {
  for (int k = 0; k < n; k += AT_ONCE)
    reduce_some(team, n - k < AT_ONCE ? n - k : AT_ONCE, value + k, op, neutral);
}

void wend_team_max(wend_team *team, int n, double *value) {
  reduce(team, n, value, MPI_MAX, -INFINITY);
}

void wend_team_min(wend_team *team, int n, double *value) {
  reduce(team, n, value, MPI_MIN, INFINITY);
}

void wend_team_count(wend_team *team, int n, int64_t *value) {
  if (MPI_Allreduce(MPI_IN_PLACE, value, n, MPI_INT64_T, MPI_SUM, team->comm) != MPI_SUCCESS)
    wend_fail(team, WEND_ERR_MPI, "a count over ranks failed");
}

void *wend_allocate(wend_team *team, int64_t n, size_t size) {
  if (n <= 0) return NULL;
  void *memory =
      team->allocate != NULL ? team->allocate((size_t)n, size) : calloc((size_t)n, size);
  if (memory == NULL)
    wend_fail(team, WEND_ERR_MEMORY, "rank %d could not get %.3g MB of memory: use more ranks",
              team->rank, (double)n * (double)size / 1e6);
  return memory;
}
