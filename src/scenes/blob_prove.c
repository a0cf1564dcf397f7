/* SPDX-License-Identifier: GPL-3.0-or-later
 * blob_prove.c: the cases of the oblique Gaussian and their bars. */
#include "blob.h"
#include "scene.h"
#include <math.h>

/* Bars: 0 means none. Off: |mean of kappa_eff/kappa - 1|; worst: the same for the worst seed.
 */
typedef struct blob_row {
  const char *name;
  wend_blob_case c;
  double off_bar, worst_bar, across_bar, l1_bar;
  bool isotropic; /* across is expected to be 1, not 0 */
} blob_row;

static const blob_row rows[] = {
    {"jitter 0.2",
     {128, 0.2, WEND_BLOB_EVEN, WEND_BLOB_EXACT, true, 1, 0},
     0,
     0.003,
     8e-4,
     3.6e-4,
     false},
    {"jitter 0.5",
     {128, 0.5, WEND_BLOB_EVEN, WEND_BLOB_EXACT, true, 1, 0},
     0,
     0.015,
     0,
     0,
     false},
    {"jitter 1.0",
     {128, 1.0, WEND_BLOB_EVEN, WEND_BLOB_EXACT, true, 1, 0},
     0.05,
     0,
     0,
     2e-3,
     false},
    {"spacing varies by 4",
     {128, 0.2, WEND_BLOB_SMOOTH, WEND_BLOB_EXACT, true, 1, 0},
     0,
     0.005,
     0,
     0,
     false},
    {"spacing jumps by 3",
     {64, 0.2, WEND_BLOB_JUMP, WEND_BLOB_EXACT, true, 1, 0},
     0,
     0.01,
     0,
     0,
     false},
    {"across only",
     {128, 0.2, WEND_BLOB_EVEN, WEND_BLOB_EXACT, true, 0, 1},
     0,
     0.003,
     8e-4,
     3.6e-4,
     false},
    {"both alike",
     {128, 0.2, WEND_BLOB_EVEN, WEND_BLOB_EXACT, true, 1, 1},
     0,
     0.003,
     0,
     3.6e-4,
     true},
    {"no field",
     {128, 0.2, WEND_BLOB_EVEN, WEND_BLOB_EXACT, false, 1, 1},
     0,
     0.003,
     0,
     3.6e-4,
     true},
    {"raw faces", {128, 0.2, WEND_BLOB_EVEN, WEND_BLOB_RAW, true, 1, 0}, 0, 0, 0, 0, false},
    {"closed faces",
     {128, 0.2, WEND_BLOB_EVEN, WEND_BLOB_CLOSED, true, 1, 0},
     0,
     0,
     0,
     0,
     false},
};

typedef struct blob_summary {
  double mean, worst, across, l1, beyond;
} blob_summary;

static wend_status run_row(wend_team *team, const blob_row *row, int first, int last,
                           blob_summary *s) {
  wend_blob_figures f = {0};
  const double begun = MPI_Wtime();
  const int seeds = last - first + 1;
  double sum = 0;
  *s = (blob_summary){0};
  for (int seed = first; seed <= last; seed++) {
    const wend_status status = wend_blob_run(team, &row->c, seed, &f);
    if (status != WEND_OK) return status;
    sum += f.kappa;
    s->worst = fmax(s->worst, fabs(f.kappa - 1));
    s->across = fmax(s->across, fabs(row->isotropic ? f.across - 1 : f.across));
    s->l1 = fmax(s->l1, f.l1);
    s->beyond = fmax(s->beyond, f.beyond);
  }
  s->mean = sum / seeds;
  wend_scene_say(
      team, "%-20s %7.4f  %7.4f  %8.1e  %8.1e  %8.1e  %7.1e %6.4f  %5lld %6lld %6.1f\n",
      row->name, s->mean, s->worst, s->across, s->l1, s->beyond, f.report.closure,
      f.report.span_mean, (long long)f.steps, (long long)f.stages, MPI_Wtime() - begun);
  return WEND_OK;
}

static void judge_row(const wend_team *team, const blob_row *row, const blob_summary *s,
                      wend_verdict *verdict) {
  if (row->off_bar > 0)
    wend_verdict_most(team, verdict, fabs(s->mean - 1), row->off_bar,
                      "%s: |kappa_eff - 1|, mean of seeds", row->name);
  if (row->worst_bar > 0)
    wend_verdict_most(team, verdict, s->worst, row->worst_bar,
                      "%s: |kappa_eff - 1|, worst seed", row->name);
  if (row->worst_bar > 0 && row->isotropic)
    wend_verdict_most(team, verdict, s->across, 2 * row->worst_bar,
                      "%s: |kappa_across/kappa_along - 1|", row->name);
  if (row->across_bar > 0)
    wend_verdict_most(team, verdict, s->across, row->across_bar, "%s: spreading the wrong way",
                      row->name);
  if (row->l1_bar > 0)
    wend_verdict_most(team, verdict, s->l1, row->l1_bar, "%s: L1, worst seed", row->name);
  if (row->worst_bar > 0 || row->off_bar > 0)
    wend_verdict_most(team, verdict, s->beyond, 1e-13, "%s: beyond the range at the start",
                      row->name);
}

wend_status wend_blob_prove(wend_team *team, const wend_scene_options *options) {
  enum { ROWS = sizeof rows / sizeof rows[0] };
  const bool own = options->side > 0 || options->seed_first > 0;
  const int first = options->seed_first > 0 ? options->seed_first : 1;
  const int last = options->seed_first > 0 ? options->seed_last : 5;
  blob_summary summary[ROWS];
  wend_verdict verdict = {0, 0};
  wend_scene_say(team, "blob: oblique Gaussian, t = 1; kappa_eff over kappa; across: spreading "
                       "the wrong way over the "
                       "right one (isotropic cases: off equality)\n"
                       "case                 kappa   worst off  across    L1        beyond   "
                       "closure  span   steps "
                       "stages seconds\n");
  for (int k = 0; k < ROWS; k++) {
    blob_row row = rows[k];
    if (options->side > 0) row.c.side = options->side;
    const wend_status status = run_row(team, &row, first, last, &summary[k]);
    if (status != WEND_OK) return status;
  }
  if (own) return WEND_OK;
  for (int k = 0; k < ROWS; k++) judge_row(team, &rows[k], &summary[k], &verdict);
  return wend_verdict_close(team, &verdict, "blob");
}
