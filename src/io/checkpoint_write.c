/* SPDX-License-Identifier: LGPL-3.0-or-later
 * checkpoint_write.c: writes checkpoints.
 *
 * An HDF5 file: groups /columns and /globals with one data set an item, each with its checksum.
 */
#include "checkpoint_parts.h"
#include "hdf.h"
#include "machine.h"
#include "version_text.h"
#include <stdio.h>
#include <string.h>

hid_t wend_checkpoint_type(wend_value_type type) {
  switch (type) {
  case WEND_VALUE_DOUBLE:
    return H5T_NATIVE_DOUBLE;
  case WEND_VALUE_UINT64:
    return H5T_NATIVE_UINT64;
  case WEND_VALUE_INT64:
    return H5T_NATIVE_INT64;
  }
  return -1;
}

static bool same_everywhere(wend_team *team, uint64_t value) {
  const uint64_t mine[2] = {value, ~value};
  uint64_t least[2] = {value, ~value};
  if (MPI_Allreduce(mine, least, 2, MPI_UINT64_T, MPI_MIN, team->comm) != MPI_SUCCESS)
    wend_fail(team, WEND_ERR_MPI, "ranks could not compare a checksum");
  return least[0] == ~least[1];
}

/* The machine of rank 0; where others differ it matches no machine on reading. */
static void describe(wend_team *team, size_t size, char *processor, char *math,
                     uint64_t *print) {
  wend_machine_processor(size, processor);
  wend_machine_math(size, math);
  *print = wend_machine_fingerprint();
  uint64_t hash = *print;
  for (const char *c = processor; *c != '\0'; c++)
    hash = wend_machine_mix(hash ^ (unsigned char)*c);
  const bool same = same_everywhere(team, hash);
  const size_t used = strlen(processor);
  if (!same) snprintf(processor + used, size - used, " and others");
  if (MPI_Bcast(processor, (int)size, MPI_CHAR, 0, team->comm) != MPI_SUCCESS ||
      MPI_Bcast(math, (int)size, MPI_CHAR, 0, team->comm) != MPI_SUCCESS ||
      MPI_Bcast(print, 1, MPI_UINT64_T, 0, team->comm) != MPI_SUCCESS)
    wend_fail(team, WEND_ERR_MPI, "ranks could not agree on the machine");
}

static void put_facts(wend_hdf *hdf, const wend_checkpoint *from, int64_t total) {
  const int64_t format = WEND_CHECKPOINT_FORMAT;
  char processor[WEND_CHECKPOINT_TEXT], math[WEND_CHECKPOINT_TEXT];
  uint64_t print;
  describe(hdf->team, WEND_CHECKPOINT_TEXT, processor, math, &print);
  wend_hdf_put(hdf, hdf->file, "wend_checkpoint", H5T_NATIVE_INT64, 0, &format);
  wend_hdf_put(hdf, hdf->file, "setup_hash", H5T_NATIVE_UINT64, 0, &from->setup_hash);
  wend_hdf_put(hdf, hdf->file, "rows", H5T_NATIVE_INT64, 0, &total);
  wend_hdf_put_text(hdf, hdf->file, "version", wend_version_text());
  wend_hdf_put_text(hdf, hdf->file, "git", WEND_GIT_TEXT);
  wend_hdf_put_text(hdf, hdf->file, "processor", processor);
  wend_hdf_put_text(hdf, hdf->file, "math_library", math);
  wend_hdf_put(hdf, hdf->file, "math_fingerprint", H5T_NATIVE_UINT64, 0, &print);
}

static wend_status put_item(wend_hdf *hdf, hid_t group, const wend_checkpoint_item *item,
                            const wend_hdf_block *block) {
  hid_t set = -1;
  const uint64_t sum =
      wend_hdf_summed(hdf->team, wend_hdf_checksum(item->data, block->first, block->n));
  const wend_status status = wend_hdf_write(hdf, group, item->name, block, item->data, &set);
  if (set < 0) return status;
  wend_hdf_put(hdf, set, "checksum", H5T_NATIVE_UINT64, 0, &sum);
  H5Dclose(set);
  return status;
}

static wend_status put_columns(wend_hdf *hdf, const wend_checkpoint *from,
                               wend_hdf_block block) {
  wend_status status = WEND_OK;
  const hid_t group = wend_hdf_group(hdf, hdf->file, "columns");
  for (int k = 0; k < from->columns; k++) {
    block.type = wend_checkpoint_type(from->column[k].type);
    WEND_TRY(put_item(hdf, group, &from->column[k], &block));
  }
done:
  if (group >= 0) H5Gclose(group);
  return status;
}

/* Rank 0 writes them; the checksum shows whether the others hold the same. */
static wend_status put_globals(wend_hdf *hdf, const wend_checkpoint *from) {
  wend_status status = WEND_OK;
  const hid_t group = wend_hdf_group(hdf, hdf->file, "globals");
  for (int k = 0; k < from->globals; k++) {
    const wend_checkpoint_item *item = &from->global[k];
    if (!same_everywhere(hdf->team,
                         wend_hdf_checksum(item->data, 0, item->n) + (uint64_t)item->n))
      wend_fail(hdf->team, WEND_ERR_ARGUMENT, "%s: %s differs among ranks", hdf->path,
                item->name);
    WEND_TRY(wend_agree(hdf->team));
    const wend_hdf_block block = {.type = wend_checkpoint_type(item->type),
                                  .total = item->n,
                                  .n = hdf->team->rank == 0 ? item->n : 0};
    WEND_TRY(put_item(hdf, group, item, &block));
  }
done:
  if (group >= 0) H5Gclose(group);
  return status;
}

wend_status wend_checkpoint_write(wend_team *team, const char *path,
                                  const wend_checkpoint *from) {
  wend_status status;
  wend_hdf hdf = {.team = NULL};
  WEND_TRY(wend_hdf_create(team, path, &hdf));
  const wend_hdf_block block = wend_hdf_share(team, H5T_NATIVE_DOUBLE, from->rows);
  put_facts(&hdf, from, block.total);
  WEND_TRY(wend_agree(team));
  WEND_TRY(put_columns(&hdf, from, block));
  WEND_TRY(put_globals(&hdf, from));
  WEND_TRY(wend_hdf_publish(&hdf));
done:
  wend_hdf_close(&hdf);
  return status;
}
