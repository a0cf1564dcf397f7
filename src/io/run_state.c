/* SPDX-License-Identifier: LGPL-3.0-or-later
 * run_state.c: checkpoints of a run.
 *
 * Columns are the particles as they stand, supports and volumes among them, so that the
 * geometry is built anew with the same bits; globals are the box, the march and the output
 * cursor. What can be computed from these is not stored, but the rate of change is checked. */
#include "run_state.h"
#include "box.h"
#include "checkpoint.h"
#include "hdf.h"
#include "records.h"
#include <errno.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

enum { PATH_MOST = 4096, NAME_MOST = 64, BOX = 8, COUNTS = 9, GLOBALS = 6 };

/* The small arrays of a checkpoint. */
typedef struct globals {
  double box[BOX];       /* lower, upper corner; thickness; start */
  int64_t count[COUNTS]; /* axes, boundaries, outputs, columns of the particle file, volumes */
  wend_march_state march;
  uint64_t rate; /* checksum of the rate of change */
} globals;

static void column_name(wend_column column, char name[NAME_MOST]) {
  const wend_record *record = wend_record_of(column);
  if (record->components == 1)
    snprintf(name, NAME_MOST, "%s", record->name);
  else
    snprintf(name, NAME_MOST, "%s_%c", record->name, "xyz"[column - record->column]);
}

static uint64_t rate_checksum(wend_team *team, const wend_run *run) {
  const int64_t n = run->particles.n;
  const wend_hdf_block share = wend_hdf_share(team, H5T_NATIVE_DOUBLE, n);
  return wend_hdf_summed(team, wend_hdf_checksum(run->march.rate_0, share.first, n));
}

static void gather(wend_team *team, const wend_run *run, globals *g) {
  const wend_domain *d = &run->domain;
  for (int a = 0; a < 3; a++) {
    g->box[a] = d->lo[a];
    g->box[3 + a] = d->hi[a];
    g->count[1 + a] = a < d->dim ? wend_box_boundary(d, a) : 0;
  }
  g->box[6] = d->thickness;
  g->box[7] = run->start;
  g->count[0] = d->dim;
  g->count[4] = run->outputs.files;
  g->count[5] = run->outputs.rounds;
  g->count[6] = run->outputs.entries;
  g->count[7] = (int64_t)run->file_records;
  g->count[8] = run->volumes;
  wend_march_save(&run->march, &g->march);
  g->rate = rate_checksum(team, run);
}

/* What a global is called, and where it lies. */
static void list_globals(globals *g, wend_checkpoint_item item[GLOBALS]) {
  const wend_checkpoint_item all[GLOBALS] = {
      {"box", WEND_VALUE_DOUBLE, BOX, g->box},
      {"counts", WEND_VALUE_INT64, COUNTS, g->count},
      {"march_numbers", WEND_VALUE_DOUBLE, WEND_MARCH_NUMBERS, g->march.number},
      {"march_counts", WEND_VALUE_INT64, WEND_MARCH_COUNTS, g->march.count},
      {"books", WEND_VALUE_INT64, WEND_MARCH_LIMBS, g->march.limb},
      {"rate", WEND_VALUE_UINT64, 1, &g->rate}};
  memcpy(item, all, sizeof all);
}

wend_status wend_run_save(wend_team *team, const wend_run *run) {
  wend_status status;
  char path[PATH_MOST], name[WEND_COLUMNS][NAME_MOST];
  globals g;
  wend_checkpoint_item column[WEND_COLUMNS + 1], global[GLOBALS];
  wend_checkpoint checkpoint = {.setup_hash = wend_setup_hash(&run->setup),
                                .rows = run->particles.n,
                                .globals = GLOBALS,
                                .column = column,
                                .global = global};
  wend_run_path(team, run, sizeof path, path, "_checkpoint.h5");
  WEND_TRY(wend_agree(team));
  column[checkpoint.columns++] = (wend_checkpoint_item){
      .name = "id", .type = WEND_VALUE_UINT64, .data = run->particles.id};
  for (int c = 0; c < WEND_COLUMNS; c++) {
    if (run->particles.column[c] == NULL) continue;
    column_name((wend_column)c, name[c]);
    column[checkpoint.columns++] = (wend_checkpoint_item){
        .name = name[c], .type = WEND_VALUE_DOUBLE, .data = run->particles.column[c]};
  }
  gather(team, run, &g);
  list_globals(&g, global);
  WEND_TRY(wend_checkpoint_write(team, path, &checkpoint));
done:
  return status;
}

static void take_columns(wend_team *team, wend_checkpoint *from, wend_particles *p) {
  char name[NAME_MOST];
  memset(p, 0, sizeof *p);
  if (wend_checkpoint_column(team, from, "id", WEND_VALUE_UINT64) == NULL) return;
  if (from->rows > INT32_MAX) {
    wend_fail(team, WEND_ERR_ARGUMENT, "the checkpoint holds too many particles for %d ranks",
              team->size);
    return;
  }
  p->n = (int32_t)from->rows;
  p->id = wend_checkpoint_take(from, "id", WEND_VALUE_UINT64);
  p->key = wend_allocate(team, p->n, sizeof *p->key);
  for (int c = 0; c < WEND_COLUMNS; c++) {
    column_name((wend_column)c, name);
    p->column[c] = wend_checkpoint_take(from, name, WEND_VALUE_DOUBLE);
  }
}

static void take_globals(wend_team *team, const wend_checkpoint *from, globals *g) {
  wend_checkpoint_item item[GLOBALS];
  list_globals(g, item);
  for (int k = 0; k < GLOBALS; k++) {
    const void *found =
        wend_checkpoint_global(team, from, item[k].name, item[k].type, item[k].n);
    if (found != NULL) memcpy(item[k].data, found, (size_t)item[k].n * sizeof(double));
  }
}

static void scatter(wend_team *team, const globals *g, wend_run *run) {
  wend_boundary boundary[3];
  const int64_t dim = g->count[0];
  bool good = dim == 2 || dim == 3;
  for (int a = 0; a < 3; a++) {
    good = good && g->count[1 + a] >= 0 && g->count[1 + a] < WEND_BOUNDARIES;
    boundary[a] = (wend_boundary)g->count[1 + a];
  }
  for (int k = 4; k < 7; k++) good = good && g->count[k] >= 0;
  good = good && g->count[8] >= 0 && g->count[8] <= WEND_VOLUME_KERNEL;
  if (!good) {
    wend_fail(team, WEND_ERR_FILE, "the checkpoint holds nonsense");
    return;
  }
  run->domain = wend_box_make((int)dim, g->box, g->box + 3, boundary, g->box[6]);
  run->start = g->box[7];
  run->outputs = (wend_output_cursor){g->count[4], g->count[5], g->count[6]};
  run->file_records = (uint64_t)g->count[7];
  run->volumes = (wend_volume_origin)g->count[8];
}

static void say_if_other(const wend_checkpoint *from, bool same, size_t size, char *made_by) {
  made_by[0] = '\0';
  if (from->other_processor || from->other_math || from->other_version || !same)
    snprintf(
        made_by, size,
        "the checkpoint was made by %s: the last digits may differ from an undisturbed run",
        from->made_by);
}

wend_status wend_run_restore(wend_team *team, wend_run *run, size_t size, char *made_by) {
  wend_status status;
  char path[PATH_MOST];
  wend_checkpoint from = {.rows = 0};
  globals g;
  bool same;
  wend_run_path(team, run, sizeof path, path, "_checkpoint.h5");
  WEND_TRY(wend_agree(team));
  WEND_TRY(wend_checkpoint_read(team, path, wend_setup_hash(&run->setup), &from));
  run->total = from.total;
  take_columns(team, &from, &run->particles);
  take_globals(team, &from, &g);
  WEND_TRY(wend_agree(team));
  scatter(team, &g, run);
  WEND_TRY(wend_agree(team));
  WEND_TRY(wend_run_build(team, run));
  WEND_TRY(wend_march_restore(team, &run->march, &g.march, &same));
  same = rate_checksum(team, run) == g.rate && same;
  WEND_TRY(wend_agree(team));
  say_if_other(&from, same, size, made_by);
done:
  wend_checkpoint_reset(&from);
  return status;
}

wend_status wend_run_saved(wend_team *team, const wend_run *run, bool *there) {
  char path[PATH_MOST];
  struct stat facts;
  double found = 0;
  if (wend_run_path(team, run, sizeof path, path, "_checkpoint.h5") == WEND_OK &&
      team->rank == 0)
    found = stat(path, &facts) == 0;
  wend_team_max(team, 1, &found);
  *there = found > 0;
  return wend_agree(team);
}

wend_status wend_run_forget(wend_team *team, const wend_run *run) {
  char path[PATH_MOST];
  if (wend_run_path(team, run, sizeof path, path, "_checkpoint.h5") == WEND_OK &&
      team->rank == 0 && unlink(path) != 0 && errno != ENOENT)
    wend_fail(team, WEND_ERR_FILE, "%s cannot be removed: %s", path, strerror(errno));
  return wend_agree(team);
}
