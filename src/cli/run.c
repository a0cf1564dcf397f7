/* SPDX-License-Identifier: GPL-3.0-or-later
 * run.c: `wend run`, the main job: from a setup file to files that a reader can open. */
#include "run.h"
#include "command.h"
#include "ledger_file.h"
#include <stdio.h>
#include <string.h>

typedef struct run_options {
  const char *setup;
  bool resume, explain, quiet;
} run_options;

static bool understand(int argc, char **argv, run_options *options) {
  for (int k = 1; k < argc; k++) {
    if (strcmp(argv[k], "--resume") == 0)
      options->resume = true;
    else if (strcmp(argv[k], "--explain") == 0)
      options->explain = true;
    else if (strcmp(argv[k], "--quiet") == 0)
      options->quiet = true;
    else if (argv[k][0] == '-' || options->setup != NULL)
      return false;
    else
      options->setup = argv[k];
  }
  return options->setup != NULL || options->explain;
}

static bool finished(const wend_run *run) {
  const wend_setup *setup = &run->setup;
  return run->march.time >= setup->end ||
         (setup->steps > 0 && run->march.steps >= setup->steps);
}

static wend_status march(wend_team *team, wend_run *run, wend_ledger_file *ledger) {
  wend_status status = WEND_OK;
  while (!finished(run)) {
    const double until = wend_output_next(&run->setup, run->start, &run->outputs);
    WEND_TRY(wend_march_step(team, &run->march, until));
    wend_ledger_file_add(ledger, &run->march);
    if (run->march.time < until && !finished(run)) continue;
    WEND_TRY(wend_ledger_file_flush(team, ledger));
    WEND_TRY(wend_run_write_output(team, run));
  }
done:
  return status;
}

static wend_status carry_out(wend_team *team, const run_options *options, wend_run *run) {
  wend_status status;
  wend_ledger_file ledger = {.out = NULL};
  WEND_TRY(wend_run_read(team, options->setup, run));
  WEND_TRY(wend_run_make_folder(team, run));
  WEND_TRY(wend_run_build(team, run, run->start));
  WEND_TRY(wend_run_drop_outputs(team, run, 0, NULL));
  WEND_TRY(wend_ledger_file_open(team, run, 0, &ledger));
  WEND_TRY(wend_run_write_output(team, run));
  WEND_TRY(march(team, run, &ledger));
done:
  wend_ledger_file_close(&ledger);
  return status;
}

int wend_run_command(wend_team *team, int argc, char **argv) {
  run_options options = {.setup = NULL};
  if (!understand(argc, argv, &options))
    return wend_command_usage(
        team, "call it as: wend run SETUP.yaml [--resume] [--quiet], or wend run --explain");
  if (options.explain) {
    if (team->rank == 0) wend_setup_explain(stdout);
    return WEND_OK;
  }
  wend_run run = {.total = 0};
  const wend_status status = carry_out(team, &options, &run);
  wend_run_reset(&run);
  return (int)status;
}
