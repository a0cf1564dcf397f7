/* SPDX-License-Identifier: LGPL-3.0-or-later
 * hdf.h: parallel HDF5 with checked calls: whole files, attributes, blocks of one-dimensional
 * data sets. Private.
 *
 * Calls marked Matched must be made by all ranks in the same order, since HDF5 may talk among
 * them; a failure is recorded in the team, and the call is skipped while one is pending. Calls
 * marked Collective agree on failures themselves. A failure that strikes one rank alone must be
 * agreed on before the next Matched call: attribute and group calls fail alike on all ranks,
 * blocks agree, allocations are the caller's care. HDF5 prints nothing between open or create
 * and close. */
#ifndef WEND_IO_HDF_H
#define WEND_IO_HDF_H

#include "team.h"
#include <hdf5.h>
#include <stdint.h>

typedef struct wend_hdf {
  wend_team *team;
  const char *path; /**< as the caller named it; borrowed until close */
  char *part;       /**< what is written until the file is whole; NULL when reading */
  hid_t file;
  int64_t at_once;  /**< items of a block moved in one transfer; small only in tests */
  H5E_auto2_t talk; /**< the caller's error printing, restored at close */
  void *talk_data;
} wend_hdf;

/** Opens a file for reading by all ranks. Missing, unreadable and foreign files are
 * WEND_ERR_FILE. Collective. */
wend_status wend_hdf_open(wend_team *team, const char *path, wend_hdf *hdf);
/** Creates path.part for writing by all ranks. Collective. */
wend_status wend_hdf_create(wend_team *team, const char *path, wend_hdf *hdf);
/** Closes what open or create gave, also half of it. A file that was not published is removed.
 * Collective. */
void wend_hdf_close(wend_hdf *hdf);
/** Closes a created file, syncs it, gives it its name and syncs the folder. Collective. */
wend_status wend_hdf_publish(wend_hdf *hdf);

/** Records a failure as "path: what object: HDF5's reason". Local. */
wend_status wend_hdf_fail(const wend_hdf *hdf, const char *what, const char *object);

/** Makes a group; close it with H5Gclose. -1 on failure. Matched. */
hid_t wend_hdf_group(wend_hdf *hdf, hid_t parent, const char *name);
/** Writes an attribute: fixed-length ASCII text. Matched. */
void wend_hdf_put_text(wend_hdf *hdf, hid_t object, const char *name, const char *text);
/** Writes an attribute of n numbers of a native type, n = 0: a scalar. Matched. */
void wend_hdf_put(wend_hdf *hdf, hid_t object, const char *name, hid_t type, int n,
                  const void *value);

/** Is there a link of this path (parents included)? Matched. */
bool wend_hdf_has(wend_hdf *hdf, hid_t parent, const char *path);
/** Reads a text attribute, of fixed or variable length; false where there is none. Matched. */
bool wend_hdf_get_text(wend_hdf *hdf, hid_t object, const char *name, size_t size, char *text);
/** Reads an attribute of exactly n numbers of any type into a native type; false where there is
 * none, or none of that kind. Matched. */
bool wend_hdf_get(wend_hdf *hdf, hid_t object, const char *name, hid_t type, int n,
                  void *value);

/** A block of a one-dimensional data set: items [first, first + n) of `total`. */
typedef struct wend_hdf_block {
  hid_t type; /**< native type in memory; also in a file that is written */
  int64_t total, first, n;
} wend_hdf_block;

/** The block of this rank where each has n items, in rank order. Collective. */
wend_hdf_block wend_hdf_share(wend_team *team, hid_t type, int64_t n);

/** Deals `total` items out in blocks of equal length, longer by one on the first ranks. Local.
 */
void wend_hdf_deal(const wend_team *team, int64_t total, int64_t *first, int64_t *n);

/** Makes a contiguous data set of block.total items and writes each rank's block. Collective.
 *  *set is open for attributes until H5Dclose, -1 on failure. */
wend_status wend_hdf_write(wend_hdf *hdf, hid_t parent, const char *name,
                           const wend_hdf_block *block, const void *data, hid_t *set);
/** Reads each rank's block of an open data set. Collective. */
wend_status wend_hdf_read(wend_hdf *hdf, hid_t set, const wend_hdf_block *block, void *data);
/** Items of an open one-dimensional data set; -1 where it has another rank. Matched. */
int64_t wend_hdf_length(hid_t set);

/** Checksum of n 8-byte values whose places in the whole array are first, first + 1...: the sum
 * over values of a hash of place and bits, modulo 2^64, so that parts may be added in any
 * order. Local. */
uint64_t wend_hdf_checksum(const void *data, int64_t first, int64_t n);
/** Sum of the parts of a checksum over ranks. Collective. */
uint64_t wend_hdf_summed(wend_team *team, uint64_t part);

#endif
