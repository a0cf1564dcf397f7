/* SPDX-License-Identifier: GPL-3.0-or-later
 * run.c: `wend run`, the main job: from a setup file to files that a reader can open. */
#include "run.h"
#include "command.h"
#include "ledger_file.h"
#include "run_report.h"
#include "run_state.h"
#include <inttypes.h>
#include <stdarg.h>
#include <stdio.h>
#include <string.h>

/* Seconds between lines of progress. */
static const double pause = 3;

/* One call of the command. */
typedef struct session {
  const char *setup;
  bool resume, explain, quiet, help;
  wend_team *team;
  wend_run run;
  wend_ledger_file ledger;
  double said, marching; /* when progress was last shown; seconds spent in super-steps */
  int64_t stages;        /* stages made before this session */
} session;

static void print_help(void) {
  printf(
      "usage: wend run SETUP.yaml [OPTION...]\n\n"
      "Reads a setup and its particle file, transports the cosmic rays to the end time, and "
      "writes to\noutput.folder, with NAME for output.name:\n"
      "  NAME_000000.h5 ...  particles (openPMD), the first at the start; .xmf for ParaView\n"
      "  NAME_ledger.tsv     where the energy went, a row a super-step, in erg\n"
      "  NAME_report.txt     the closing table: books, costs, resolution\n"
      "  NAME_run.log        versions, machine and setup, for citing and repeating\n"
      "  NAME_checkpoint.h5  what --resume goes on from\n\noptions:\n"
      "  --resume   go on from the checkpoint, on any number of ranks, with the same bits\n"
      "  --quiet    print the closing table only\n"
      "  --explain  print every key of a setup: its default and its meaning\n\n"
      "example:\n  mpirun -n 4 wend run galaxy.yaml\n");
}

static bool understand(int argc, char **argv, session *s) {
  for (int k = 1; k < argc; k++) {
    if (strcmp(argv[k], "--resume") == 0)
      s->resume = true;
    else if (strcmp(argv[k], "--explain") == 0)
      s->explain = true;
    else if (strcmp(argv[k], "--quiet") == 0)
      s->quiet = true;
    else if (strcmp(argv[k], "--help") == 0)
      s->help = true;
    else if (argv[k][0] == '-' || s->setup != NULL)
      return false;
    else
      s->setup = argv[k];
  }
  return s->setup != NULL || s->explain || s->help;
}

/* A line for people, unless they asked for quiet. */
__attribute__((format(printf, 2, 3))) static void say(const session *s, const char *format,
                                                      ...) {
  if (s->quiet || s->team->rank != 0) return;
  va_list arguments;
  va_start(arguments, format);
  vprintf(format, arguments);
  va_end(arguments);
  printf("\n");
  fflush(stdout);
}

static void show_progress(session *s) {
  const wend_march *m = &s->run.march;
  const double now = MPI_Wtime();
  if (now - s->said < pause) return;
  s->said = now;
  const double share = (m->time - s->run.start) / (s->run.setup.end - s->run.start);
  say(s, "step %" PRId64 "  %.6g Myr (%.1f%%)  dt %.3g Myr in %d stages, set by %s", m->steps,
      wend_run_myr(&s->run, m->time), 100 * share, wend_run_myr(&s->run, m->last.step),
      m->last.stages, wend_cause_text(m->last.cause));
}

static bool finished(const wend_run *run) {
  const wend_setup *setup = &run->setup;
  return run->march.time >= setup->end ||
         (setup->steps > 0 && run->march.steps >= setup->steps);
}

static bool checkpoint_due(const wend_run *run) {
  const int every = run->setup.checkpoint_steps;
  return every > 0 && run->march.steps % every == 0;
}

static wend_status advance(session *s, double until) {
  const double begin = MPI_Wtime();
  const wend_status status = wend_march_step(s->team, &s->run.march, until);
  s->marching += MPI_Wtime() - begin;
  if (status == WEND_OK) wend_ledger_file_add(&s->ledger, &s->run.march);
  return status;
}

static wend_status march(session *s) {
  wend_status status = WEND_OK;
  wend_run *run = &s->run;
  while (!finished(run)) {
    const double until = wend_output_next(&run->setup, run->start, &run->outputs);
    WEND_TRY(advance(s, until));
    const bool output = run->march.time >= until || finished(run);
    if (output || checkpoint_due(run)) WEND_TRY(wend_ledger_file_flush(s->team, &s->ledger));
    if (output) WEND_TRY(wend_run_write_output(s->team, run));
    if (checkpoint_due(run)) WEND_TRY(wend_run_save(s->team, run));
    show_progress(s);
  }
done:
  return status;
}

/* What an earlier run of that name left goes only when nothing can be wrong with the input any
 * more; its checkpoint goes first, since it belongs to the rest. */
static wend_status start(session *s) {
  wend_status status;
  int64_t removed = 0;
  WEND_TRY(wend_run_read_particles(s->team, &s->run));
  WEND_TRY(wend_run_make_folder(s->team, &s->run));
  WEND_TRY(wend_run_build(s->team, &s->run));
  WEND_TRY(wend_run_forget(s->team, &s->run));
  WEND_TRY(wend_run_drop_outputs(s->team, &s->run, 0, &removed));
  if (removed > 0) say(s, "replacing %" PRId64 " outputs of an earlier run", removed);
  WEND_TRY(wend_ledger_file_open(s->team, &s->run, 0, &s->ledger));
  WEND_TRY(wend_run_write_log(s->team, &s->run, false));
  WEND_TRY(wend_run_write_output(s->team, &s->run));
done:
  return status;
}

static wend_status go_on(session *s) {
  wend_status status;
  char note[512];
  WEND_TRY(wend_run_restore(s->team, &s->run, sizeof note, note));
  if (note[0] != '\0') say(s, "note: %s", note);
  WEND_TRY(wend_ledger_file_open(s->team, &s->run, s->run.march.steps, &s->ledger));
  WEND_TRY(wend_run_drop_outputs(s->team, &s->run, s->run.outputs.files, NULL));
  WEND_TRY(wend_run_write_log(s->team, &s->run, true));
  say(s, "resumed after super-step %" PRId64 " at %.6g Myr", s->run.march.steps,
      wend_run_myr(&s->run, s->run.march.time));
done:
  return status;
}

static wend_status carry_out(session *s) {
  wend_status status;
  bool saved = false;
  WEND_TRY(wend_run_begin(s->team, s->setup, &s->run));
  if (s->resume) WEND_TRY(wend_run_saved(s->team, &s->run, &saved));
  if (s->resume && !saved) say(s, "note: there is no checkpoint: starting from the beginning");
  WEND_TRY(saved ? go_on(s) : start(s));
  say(s, "%" PRId64 " particles, %" PRId64 " pairs, explicit step %.3g Myr", s->run.total,
      s->run.geometry.report.pairs, wend_run_myr(&s->run, s->run.transport.explicit_step));
  s->stages = s->run.march.stages;
  s->said = MPI_Wtime();
  WEND_TRY(march(s));
  const int64_t stages = s->run.march.stages - s->stages;
  WEND_TRY(wend_run_report(s->team, &s->run, stages > 0 ? s->marching / (double)stages : 0));
done:
  return status;
}

int wend_run_command(wend_team *team, int argc, char **argv) {
  session s = {.team = team};
  if (!understand(argc, argv, &s))
    return wend_command_usage(
        team,
        "call it as: wend run SETUP.yaml [--resume] [--quiet]; wend run --help says more");
  if (s.help || s.explain) {
    if (team->rank == 0 && s.help) print_help();
    if (team->rank == 0 && !s.help) wend_setup_explain(stdout);
    return WEND_OK;
  }
  const wend_status status = carry_out(&s);
  wend_ledger_file_close(&s.ledger);
  wend_run_reset(&s.run);
  return (int)status;
}
