/* SPDX-License-Identifier: LGPL-3.0-or-later
 * ledger_file.c: the books as a table of text.
 *
 * Rows are numbered by super-steps, without a gap. A checkpoint is written after its rows have
 * reached the disk, so on resume they are there, and others behind them perhaps. */
#include "ledger_file.h"
#include <errno.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

enum { PATH_MOST = 4096, LINE_MOST = 2048 };

static void put_head(wend_ledger_file *file, const wend_run *run) {
  fprintf(file->out, "# energies in erg; time and dt in units of %.17g s\n",
          run->setup.units.time);
  fprintf(file->out, "step\ttime\tdt\tstages\tcause\terror");
  for (int a = 0; a < WEND_ACCOUNTS; a++)
    fprintf(file->out, "\t%s", wend_account_table[a].name);
  fprintf(file->out, "\tnow\tclosure\n");
}

/* Cuts an old table behind the row of super-step `steps`. */
static void cut_behind(wend_team *team, const char *path, FILE *table, int64_t steps) {
  char line[LINE_MOST];
  int64_t found = 0;
  long end = 0;
  for (int n = 0; found < steps && fgets(line, sizeof line, table) != NULL; n++) {
    if (strchr(line, '\n') == NULL) break;
    if (n >= 2 && strtoll(line, NULL, 10) != ++found) break;
    end = ftell(table);
  }
  if (found < steps || end <= 0)
    wend_fail(
        team, WEND_ERR_FILE,
        "%s lacks rows up to super-step %lld of the checkpoint: restore it, or start anew",
        path, (long long)steps);
  else if (fseek(table, end, SEEK_SET) != 0 || ftruncate(fileno(table), end) != 0)
    wend_fail(team, WEND_ERR_FILE, "%s cannot be shortened: %s", path, strerror(errno));
}

static void open_table(wend_team *team, const wend_run *run, int64_t steps,
                       wend_ledger_file *file) {
  char path[PATH_MOST];
  if (wend_run_path(team, run, sizeof path, path, "_ledger.tsv") != WEND_OK) return;
  file->out = fopen(path, steps > 0 ? "r+" : "w");
  if (file->out == NULL)
    wend_fail(team, WEND_ERR_FILE, "%s cannot be opened: %s", path, strerror(errno));
  else if (steps > 0)
    cut_behind(team, path, file->out, steps);
  else
    put_head(file, run);
}

wend_status wend_ledger_file_open(wend_team *team, const wend_run *run, int64_t steps,
                                  wend_ledger_file *file) {
  *file = (wend_ledger_file){.erg = wend_units_erg(&run->setup.units)};
  if (team->rank == 0) open_table(team, run, steps, file);
  const wend_status status = wend_agree(team);
  if (status != WEND_OK) wend_ledger_file_close(file);
  return status;
}

void wend_ledger_file_add(wend_ledger_file *file, const wend_march *march) {
  if (file->out == NULL) return;
  const wend_ledger *books = &march->ledger;
  fprintf(file->out, "%lld\t%.17g\t%.17g\t%d\t%s\t%.3e", (long long)march->steps, march->time,
          march->last.step, march->last.stages, wend_cause_text(march->last.cause),
          march->last_error);
  for (int a = 0; a < WEND_ACCOUNTS; a++)
    fprintf(file->out, "\t%.17g", file->erg * wend_ledger_balance(books, (wend_account)a));
  fprintf(file->out, "\t%.17g\t%.3e\n", file->erg * wend_ledger_now(books),
          file->erg * wend_ledger_closure(books));
}

wend_status wend_ledger_file_flush(wend_team *team, const wend_ledger_file *file) {
  if (file->out != NULL &&
      (fflush(file->out) != 0 || ferror(file->out) || fsync(fileno(file->out)) != 0))
    wend_fail(team, WEND_ERR_FILE, "the ledger cannot be written: %s", strerror(errno));
  return wend_agree(team);
}

void wend_ledger_file_close(wend_ledger_file *file) {
  if (file->out != NULL) fclose(file->out);
  file->out = NULL;
}
