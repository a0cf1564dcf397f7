/* SPDX-License-Identifier: LGPL-3.0-or-later
 * checkpoint.c: reads checkpoints, and finds what they hold. */
#include "checkpoint.h"
#include "checkpoint_parts.h"
#include "hdf.h"
#include "machine.h"
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static void take_facts(wend_hdf *hdf, uint64_t setup_hash, wend_checkpoint *into) {
  wend_team *team = hdf->team;
  int64_t format = 0;
  uint64_t print = 0;
  char version[WEND_CHECKPOINT_TEXT] = "", processor[WEND_CHECKPOINT_TEXT] = "",
       math[WEND_CHECKPOINT_TEXT] = "", here[WEND_CHECKPOINT_TEXT];
  if (!wend_hdf_get(hdf, hdf->file, "wend_checkpoint", H5T_NATIVE_INT64, 1, &format) ||
      format != WEND_CHECKPOINT_FORMAT ||
      !wend_hdf_get(hdf, hdf->file, "setup_hash", H5T_NATIVE_UINT64, 1, &into->setup_hash) ||
      !wend_hdf_get(hdf, hdf->file, "rows", H5T_NATIVE_INT64, 1, &into->total) ||
      !wend_hdf_get(hdf, hdf->file, "math_fingerprint", H5T_NATIVE_UINT64, 1, &print) ||
      !wend_hdf_get_text(hdf, hdf->file, "version", WEND_CHECKPOINT_TEXT, version) ||
      !wend_hdf_get_text(hdf, hdf->file, "processor", WEND_CHECKPOINT_TEXT, processor) ||
      !wend_hdf_get_text(hdf, hdf->file, "math_library", WEND_CHECKPOINT_TEXT, math)) {
    wend_fail(team, WEND_ERR_FILE, "%s is no checkpoint that this version of wend can read",
              hdf->path);
    return;
  }
  if (into->setup_hash != setup_hash)
    wend_fail(team, WEND_ERR_FILE,
              "%s belongs to another setup: restore the setup it was made with, or start anew",
              hdf->path);
  wend_machine_processor(WEND_CHECKPOINT_TEXT, here);
  into->other_processor = strcmp(here, processor) != 0;
  wend_machine_math(WEND_CHECKPOINT_TEXT, here);
  into->other_math = strcmp(here, math) != 0 || print != wend_machine_fingerprint();
  into->other_version = strcmp(version, wend_version_text()) != 0;
  snprintf(into->made_by, sizeof into->made_by, "wend %.40s on %.100s with %.60s", version,
           processor, math);
}

/* What one rank sees counts for all. */
static void share_flags(wend_team *team, wend_checkpoint *into) {
  double flag[2] = {into->other_processor, into->other_math};
  wend_team_max(team, 2, flag);
  into->other_processor = flag[0] != 0;
  into->other_math = flag[1] != 0;
}

typedef struct name_list {
  int n;
  wend_checkpoint_item *item;
  bool failed;
} name_list;

static herr_t note_name(hid_t group, const char *name, const H5L_info_t *info, void *to) {
  (void)group;
  (void)info;
  name_list *list = to;
  wend_checkpoint_item *more = realloc(list->item, ((size_t)list->n + 1) * sizeof *more);
  char *copy = malloc(strlen(name) + 1);
  if (more != NULL) list->item = more;
  if (more == NULL || copy == NULL) {
    free(copy);
    list->failed = true;
    return -1;
  }
  list->item[list->n++] = (wend_checkpoint_item){.name = strcpy(copy, name)};
  return 0;
}

static bool find_type(hid_t set, wend_value_type *type) {
  const hid_t stored = H5Dget_type(set);
  bool found = false;
  for (int t = WEND_VALUE_DOUBLE; t <= WEND_VALUE_INT64 && !found; t++) {
    found = H5Tequal(stored, wend_checkpoint_type((wend_value_type)t)) > 0;
    if (found) *type = (wend_value_type)t;
  }
  H5Tclose(stored);
  return found;
}

/* Reads one item; a column is read in blocks, a global whole by every rank. Collective. */
static wend_status take_item(wend_hdf *hdf, hid_t group, wend_checkpoint_item *item,
                             const wend_checkpoint *rows) {
  wend_status status;
  wend_hdf_block block = {.total = rows != NULL ? rows->total : 0};
  uint64_t expected = 0;
  const hid_t set = H5Dopen2(group, item->name, H5P_DEFAULT);
  const int64_t length = set >= 0 ? wend_hdf_length(set) : -1;
  if (set < 0 || length < 0 || !find_type(set, &item->type) ||
      !wend_hdf_get(hdf, set, "checksum", H5T_NATIVE_UINT64, 1, &expected) ||
      (rows != NULL && length != rows->total))
    wend_fail(hdf->team, WEND_ERR_FILE, "%s: %s is damaged", hdf->path, item->name);
  block.total = length;
  block.first = rows != NULL ? rows->first : 0;
  block.n = item->n = rows != NULL ? rows->rows : length;
  block.type = wend_checkpoint_type(item->type);
  item->data = wend_allocate(hdf->team, block.n > 0 ? block.n : 1, sizeof(double));
  WEND_TRY(wend_agree(hdf->team));
  WEND_TRY(wend_hdf_read(hdf, set, &block, item->data));
  const uint64_t part = wend_hdf_checksum(item->data, block.first, block.n);
  if ((rows != NULL ? wend_hdf_summed(hdf->team, part) : part) != expected)
    wend_fail(hdf->team, WEND_ERR_FILE, "%s: %s is damaged: its checksum is wrong", hdf->path,
              item->name);
  WEND_TRY(wend_agree(hdf->team));
done:
  if (set >= 0) H5Dclose(set);
  return status;
}

static wend_status take_group(wend_hdf *hdf, const char *name, const wend_checkpoint *rows,
                              int *n, wend_checkpoint_item **item) {
  wend_status status;
  name_list list = {.n = 0};
  const hid_t group = H5Gopen2(hdf->file, name, H5P_DEFAULT);
  if (group < 0 || H5Literate(group, H5_INDEX_NAME, H5_ITER_INC, NULL, note_name, &list) < 0)
    wend_fail(hdf->team, list.failed ? WEND_ERR_MEMORY : WEND_ERR_FILE,
              "%s: group /%s cannot be read", hdf->path, name);
  *n = list.n;
  *item = list.item;
  WEND_TRY(wend_agree(hdf->team));
  for (int k = 0; k < list.n; k++) WEND_TRY(take_item(hdf, group, &list.item[k], rows));
done:
  if (group >= 0) H5Gclose(group);
  return status;
}

wend_status wend_checkpoint_read(wend_team *team, const char *path, uint64_t setup_hash,
                                 wend_checkpoint *into) {
  wend_status status;
  wend_hdf hdf = {.team = NULL};
  memset(into, 0, sizeof *into);
  WEND_TRY(wend_hdf_open(team, path, &hdf));
  take_facts(&hdf, setup_hash, into);
  WEND_TRY(wend_agree(team));
  share_flags(team, into);
  wend_hdf_deal(team, into->total, &into->first, &into->rows);
  WEND_TRY(take_group(&hdf, "columns", into, &into->columns, &into->column));
  WEND_TRY(take_group(&hdf, "globals", NULL, &into->globals, &into->global));
done:
  wend_hdf_close(&hdf);
  if (status != WEND_OK) wend_checkpoint_reset(into);
  return status;
}

static void *find(wend_team *team, const char *kind, int items,
                  const wend_checkpoint_item *item, const char *name, wend_value_type type,
                  int64_t n) {
  for (int k = 0; k < items; k++) {
    if (strcmp(item[k].name, name) != 0) continue;
    if (item[k].type == type && (n < 0 || item[k].n == n)) return item[k].data;
    wend_fail(team, WEND_ERR_FILE,
              "the checkpoint's %s %s has another type or length than expected", kind, name);
    return NULL;
  }
  wend_fail(team, WEND_ERR_FILE, "the checkpoint lacks the %s %s", kind, name);
  return NULL;
}

void *wend_checkpoint_column(wend_team *team, const wend_checkpoint *from, const char *name,
                             wend_value_type type) {
  return find(team, "column", from->columns, from->column, name, type, from->rows);
}

void *wend_checkpoint_global(wend_team *team, const wend_checkpoint *from, const char *name,
                             wend_value_type type, int64_t n) {
  return find(team, "global", from->globals, from->global, name, type, n);
}

void *wend_checkpoint_take(wend_checkpoint *from, const char *name, wend_value_type type) {
  for (int k = 0; k < from->columns; k++) {
    wend_checkpoint_item *item = &from->column[k];
    if (strcmp(item->name, name) != 0 || item->type != type) continue;
    void *const data = item->data;
    item->data = NULL;
    return data;
  }
  return NULL;
}

static void free_items(int n, wend_checkpoint_item *item) {
  for (int k = 0; k < n; k++) {
    free((char *)item[k].name);
    free(item[k].data);
  }
  free(item);
}

void wend_checkpoint_reset(wend_checkpoint *checkpoint) {
  free_items(checkpoint->columns, checkpoint->column);
  free_items(checkpoint->globals, checkpoint->global);
  memset(checkpoint, 0, sizeof *checkpoint);
}
