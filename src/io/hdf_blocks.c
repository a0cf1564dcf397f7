/* SPDX-License-Identifier: LGPL-3.0-or-later
 * hdf_blocks.c: one-dimensional data sets, each rank moving its own block.
 *
 * A data set is contiguous, without fill values or time stamps, and each item is written once:
 * its bytes depend on the data alone. Large blocks go in several transfers, as many on every
 * rank. */
#include "hdf.h"
#include "machine.h"
#include <string.h>

wend_hdf_block wend_hdf_share(wend_team *team, hid_t type, int64_t n) {
  wend_hdf_block block = {.type = type, .n = n, .total = n};
  int64_t before = 0;
  if (MPI_Exscan(&n, &before, 1, MPI_INT64_T, MPI_SUM, team->comm) != MPI_SUCCESS)
    wend_fail(team, WEND_ERR_MPI, "ranks could not count their particles");
  block.first = team->rank > 0 ? before : 0;
  wend_team_count(team, 1, &block.total);
  return block;
}

void wend_hdf_deal(const wend_team *team, int64_t total, int64_t *first, int64_t *n) {
  const int64_t share = total / team->size, rest = total % team->size, rank = team->rank;
  *first = rank * share + (rank < rest ? rank : rest);
  *n = share + (rank < rest);
}

/* Transfers needed by the rank with the largest block. */
static int64_t rounds(const wend_hdf *hdf, const wend_hdf_block *block) {
  double most = (double)block->n;
  wend_team_max(hdf->team, 1, &most);
  return ((int64_t)most + hdf->at_once - 1) / hdf->at_once;
}

/* Items [first, first + n) of memory or file; none is a valid choice. */
static hid_t selection(int64_t total, int64_t first, int64_t n) {
  const hsize_t extent = (hsize_t)total, start = (hsize_t)first, count = (hsize_t)n;
  const hid_t space = H5Screate_simple(1, &extent, NULL);
  if (space < 0) return space;
  if (n == 0)
    H5Sselect_none(space);
  else
    H5Sselect_hyperslab(space, H5S_SELECT_SET, &start, NULL, &count, NULL);
  return space;
}

/* Moves one piece; an empty rank takes part with a valid address. */
static herr_t move(hid_t set, const wend_hdf_block *block, int64_t done, int64_t n,
                   hid_t transfer, void *to, const void *from) {
  char nothing[16] = {0};
  const hid_t memory = selection(n > 0 ? n : 1, 0, n);
  const hid_t file = selection(block->total, block->first + done, n);
  const size_t skip = (size_t)done * H5Tget_size(block->type);
  herr_t good = -1;
  if (memory >= 0 && file >= 0 && from != NULL)
    good = H5Dwrite(set, block->type, memory, file, transfer, (const char *)from + skip);
  else if (memory >= 0 && file >= 0)
    good = H5Dread(set, block->type, memory, file, transfer,
                   to != NULL ? (char *)to + skip : nothing);
  if (memory >= 0) H5Sclose(memory);
  if (file >= 0) H5Sclose(file);
  return good;
}

static wend_status move_all(wend_hdf *hdf, hid_t set, const wend_hdf_block *block, void *to,
                            const void *from) {
  wend_status status = WEND_OK;
  const hid_t transfer = H5Pcreate(H5P_DATASET_XFER);
  if (transfer < 0 || H5Pset_dxpl_mpio(transfer, H5FD_MPIO_COLLECTIVE) < 0)
    wend_hdf_fail(hdf, "cannot prepare", "a transfer");
  WEND_TRY(wend_agree(hdf->team));
  const int64_t turns = rounds(hdf, block);
  for (int64_t k = 0, done = 0; k < turns; k++) {
    const int64_t left = block->n - done, n = left < hdf->at_once ? left : hdf->at_once;
    if (move(set, block, done, n, transfer, to, from) < 0)
      wend_hdf_fail(hdf, from != NULL ? "cannot write" : "cannot read", "a block");
    WEND_TRY(wend_agree(hdf->team));
    done += n;
  }
done:
  if (transfer >= 0) H5Pclose(transfer);
  return status;
}

wend_status wend_hdf_write(wend_hdf *hdf, hid_t parent, const char *name,
                           const wend_hdf_block *block, const void *data, hid_t *set) {
  static const char nothing[16];
  wend_status status;
  *set = -1;
  WEND_TRY(wend_agree(hdf->team));
  const hsize_t extent = (hsize_t)block->total;
  const hid_t space = H5Screate_simple(1, &extent, NULL), how = H5Pcreate(H5P_DATASET_CREATE);
  H5Pset_fill_time(how, H5D_FILL_TIME_NEVER);
  H5Pset_obj_track_times(how, false);
  *set = H5Dcreate2(parent, name, block->type, space, H5P_DEFAULT, how, H5P_DEFAULT);
  if (*set < 0) wend_hdf_fail(hdf, "cannot make data set", name);
  H5Pclose(how);
  H5Sclose(space);
  WEND_TRY(wend_agree(hdf->team));
  WEND_TRY(move_all(hdf, *set, block, NULL, data != NULL ? data : nothing));
done:
  if (status != WEND_OK && *set >= 0) {
    H5Dclose(*set);
    *set = -1;
  }
  return status;
}

wend_status wend_hdf_read(wend_hdf *hdf, hid_t set, const wend_hdf_block *block, void *data) {
  return move_all(hdf, set, block, data, NULL);
}

int64_t wend_hdf_length(hid_t set) {
  hsize_t extent = 0;
  const hid_t space = H5Dget_space(set);
  const bool line = space >= 0 && H5Sget_simple_extent_ndims(space) == 1;
  if (line) H5Sget_simple_extent_dims(space, &extent, NULL);
  if (space >= 0) H5Sclose(space);
  return line ? (int64_t)extent : -1;
}

uint64_t wend_hdf_checksum(const void *data, int64_t first, int64_t n) {
  uint64_t sum = 0;
  for (int64_t i = 0; i < n; i++) {
    uint64_t bits;
    memcpy(&bits, (const char *)data + (size_t)i * sizeof bits, sizeof bits);
    sum += wend_machine_mix(bits ^ wend_machine_mix((uint64_t)(first + i)));
  }
  return sum;
}

uint64_t wend_hdf_summed(wend_team *team, uint64_t part) {
  uint64_t sum = part;
  if (MPI_Allreduce(&part, &sum, 1, MPI_UINT64_T, MPI_SUM, team->comm) != MPI_SUCCESS)
    wend_fail(team, WEND_ERR_MPI, "ranks could not add up a checksum");
  return sum;
}
