/* SPDX-License-Identifier: GPL-3.0-or-later
 * command.h: the subcommands of the `wend` program. */
#ifndef WEND_CLI_COMMAND_H
#define WEND_CLI_COMMAND_H

#include "team.h"

/** What a subcommand returns, beside the codes of wend_status, when it was called wrongly. */
#define WEND_USAGE (-1)

/** A subcommand: a row of the table. */
typedef struct wend_command {
  const char *name;
  const char *help; /**< what it does, in one line */
  /** Runs it. Collective. argv[0] is the subcommand's name. Returns a wend_status or
   * WEND_USAGE, the same on every rank, with the reason in team->text. Prints results on rank
   * 0, and no error. */
  int (*run)(wend_team *team, int argc, char **argv);
} wend_command;

/** Finds a subcommand by name; NULL where there is none. Local. */
const wend_command *wend_command_find(const char *name);
/** The k-th subcommand; NULL beyond the last. Local. */
const wend_command *wend_command_at(int k);

/** Writes down how a subcommand was called wrongly; returns WEND_USAGE. Local: every rank calls
 * it. */
int wend_command_usage(wend_team *team, const char *format, ...)
    __attribute__((format(printf, 2, 3)));

/** The subcommands, one file each. Collective. */
int wend_example_command(wend_team *team, int argc, char **argv);
int wend_prove_command(wend_team *team, int argc, char **argv);
int wend_run_command(wend_team *team, int argc, char **argv);

#endif
