/* SPDX-License-Identifier: GPL-3.0-or-later
 * run_report.c: what `wend run` says at its end. */
#include "run_report.h"
#include "resolution.h"
#include "total.h"
#include <errno.h>
#include <inttypes.h>
#include <stdlib.h>
#include <string.h>

enum { PATH_MOST = 4096 };

/* A Julian megayear in seconds. */
static const double megayear = 1e6 * 365.25 * 86400;

/* What the ranks measured, brought together. */
typedef struct figures {
  double supports, pairs, faces, stage; /* seconds, of the slowest rank */
  int64_t memory;                       /* peak of all ranks together, kB */
  double filled;                        /* volumes of all particles over that of the box */
  wend_resolution resolution;
} figures;

double wend_run_myr(const wend_run *run, double time) {
  return time * run->setup.units.time / megayear;
}

/* Peak resident memory of this process, kB; 0 where the system does not tell. */
static int64_t peak_memory(void) {
  char line[256];
  long long peak = 0;
  FILE *status = fopen("/proc/self/status", "r");
  while (status != NULL && fgets(line, sizeof line, status) != NULL)
    if (sscanf(line, "VmHWM: %lld", &peak) == 1) break;
  if (status != NULL) fclose(status);
  return peak;
}

static double filled(wend_team *team, const wend_run *run) {
  const wend_domain *d = &run->domain;
  double box = d->thickness;
  for (int a = 0; a < d->dim; a++) box *= d->hi[a] - d->lo[a];
  return wend_total_of(team, run->particles.n, run->geometry.volume) / box;
}

static wend_status measure(wend_team *team, const wend_run *run, double stage, figures *f) {
  const wend_geometry_report *g = &run->geometry.report;
  double seconds[4] = {g->seconds_supports, g->seconds_pairs, g->seconds_faces, stage};
  f->memory = peak_memory(); /* before the report takes its own */
  wend_team_max(team, 4, seconds);
  wend_team_count(team, 1, &f->memory);
  f->filled = filled(team, run);
  f->supports = seconds[0];
  f->pairs = seconds[1];
  f->faces = seconds[2];
  f->stage = seconds[3];
  return wend_resolution_measure(team, &run->transport, run->march.energy, &f->resolution);
}

static void put_books(FILE *out, const wend_run *run) {
  const wend_ledger *books = &run->march.ledger;
  const double erg = wend_units_erg(&run->setup.units);
  fprintf(out, "CR energy, erg\n");
  for (int a = 0; a < WEND_ACCOUNTS; a++) {
    const wend_account_row *row = &wend_account_table[a];
    const double balance = erg * wend_ledger_balance(books, (wend_account)a);
    if (balance != 0 || a == WEND_ACCOUNT_INITIAL)
      fprintf(out, "  %-16s %23.15e   %s\n", row->name, row->sign * balance, row->meaning);
  }
  fprintf(out, "  %-16s %23.15e   CR energy at the end\n", "now", erg * wend_ledger_now(books));
  fprintf(out, "  %-16s %23.15e   what is missing: %.1e of all that came in\n", "closure",
          erg * wend_ledger_closure(books), wend_ledger_relative(books));
}

static void put_steps(FILE *out, const wend_run *run) {
  const wend_march *m = &run->march;
  fprintf(out, "\n%" PRId64 " super-steps of %" PRId64 " stages, to %.6g Myr\n", m->steps,
          m->stages, wend_run_myr(run, m->time));
  fprintf(out, "  length set by   ");
  for (int c = 0; c < WEND_CAUSES; c++)
    if (m->control.steps[c] > 0)
      fprintf(out, " %s %" PRId64, wend_cause_text((wend_cause)c), m->control.steps[c]);
  fprintf(out, "\n  made again       bounds %" PRId64 ", error %" PRId64 "\n",
          m->control.redone_bounds, m->control.redone_error);
}

static void put_costs(FILE *out, const wend_team *team, const wend_run *run, const figures *f) {
  fprintf(out,
          "\n%" PRId64 " particles, %" PRId64
          " pairs, %d rank%s (most pairs %.2f of the mean)\n",
          run->total, run->geometry.report.pairs, team->size, team->size > 1 ? "s" : "",
          run->imbalance);
  fprintf(out, "  seconds          supports %.3g, pairs %.3g, faces %.3g, a stage %.3g\n",
          f->supports, f->pairs, f->faces, f->stage);
  fprintf(out, "  peak memory      %.3g kB a particle, %.3g MB in all\n",
          (double)f->memory / (double)run->total, (double)f->memory / 1024);
}

static const char *volume_text(wend_volume_origin origin) {
  static const char *const text[] = {"record of the particle file",
                                     "mass over density of the particle file", "kernel sum"};
  return text[origin];
}

static void put_resolution(FILE *out, const wend_run *run, const figures *f) {
  const wend_resolution *r = &f->resolution;
  const wend_geometry_report *g = &run->geometry.report;
  const double cgs = 1e4 * wend_units_scale(&run->setup.units,
                                            wend_quantity_find(WEND_Q_DIFFUSIVITY)->dimension);
  fprintf(out, "\nresolution at the end (means over CR energy)\n");
  fprintf(out,
          "  unresolved       %.3g of the CR energy lies where the support exceeds |e/g|\n",
          r->unresolved);
  fprintf(out,
          "  across the field %.3g cm^2/s numerical, %.3g cm^2/s physical; along %.3g cm^2/s\n",
          cgs * r->smearing, cgs * r->kappa_perp, cgs * r->kappa_par);
  fprintf(
      out,
      "                   numerical: %.2g kappa_par (H/s)^2, s = e/|grad_perp e|: scaled from\n"
      "                   2.3e-4 at s = 6.4 spacings in 2-D, as measured by `wend prove "
      "blob`\n",
      wend_resolution_smearing);
  fprintf(out, "  faces            closure %.2e, raw %.2e\n", g->closure, g->closure_raw);
  fprintf(out, "  volume condition mean %.5f, raw %.5f, rms %.2e\n", g->span_mean, g->span_raw,
          g->span_rms);
  fprintf(out, "  volumes          %s: %.4f of the box\n", volume_text(run->volumes),
          f->filled);
  fprintf(out, "  gradients        %.3g of the particles fell back to the isotropic form\n",
          (double)g->fallbacks / (double)run->total);
  fprintf(out, "  limiter          works on %.3g of the pairs\n", r->limited);
}

static void put_all(FILE *out, const wend_team *team, const wend_run *run, const figures *f) {
  put_books(out, run);
  put_steps(out, run);
  put_costs(out, team, run, f);
  put_resolution(out, run, f);
}

wend_status wend_run_report(wend_team *team, const wend_run *run, double stage) {
  char path[PATH_MOST];
  figures f;
  const wend_status status = measure(team, run, stage, &f);
  if (status != WEND_OK) return status;
  if (team->rank == 0 &&
      wend_run_path(team, run, sizeof path, path, "_report.txt") == WEND_OK) {
    put_all(stdout, team, run, &f);
    FILE *out = fopen(path, "w");
    if (out != NULL) put_all(out, team, run, &f);
    if (out == NULL || fclose(out) != 0)
      wend_fail(team, WEND_ERR_FILE, "%s cannot be written: %s", path, strerror(errno));
  }
  return wend_agree(team);
}
