/* SPDX-License-Identifier: LGPL-3.0-or-later
 * hdf.c: opening, creating and publishing HDF5 files that all ranks share.
 *
 * A file is written to path.part, synced by every rank (each may hold its own cache of a file
 * system), renamed by one, and the folder synced: a reader sees the old file or the new one,
 * never half of one. */
#include "hdf.h"
#include <errno.h>
#include <fcntl.h>
#include <libgen.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

enum { AT_ONCE = 1 << 27 }; /* 1 GB of doubles: MPI counts bytes in an int */

static herr_t innermost(unsigned n, const H5E_error2_t *error, void *text) {
  if (n == 0 && error->desc != NULL) snprintf(text, 160, "%s", error->desc);
  return 0;
}

wend_status wend_hdf_fail(const wend_hdf *hdf, const char *what, const char *object) {
  char reason[160] = "no reason given";
  H5Ewalk2(H5E_DEFAULT, H5E_WALK_UPWARD, innermost, reason);
  return wend_fail(hdf->team, WEND_ERR_FILE, "%s: %s %s: HDF5 says: %s", hdf->path, what,
                   object, reason);
}

static void begin(wend_team *team, const char *path, wend_hdf *hdf) {
  *hdf = (wend_hdf){.team = team, .path = path, .file = -1, .at_once = AT_ONCE};
  H5Eget_auto2(H5E_DEFAULT, &hdf->talk, &hdf->talk_data);
  H5Eset_auto2(H5E_DEFAULT, NULL, NULL);
}

/* One rank looks first: its words are clearer than what MPI makes of the same failure. */
static void look_before_open(wend_team *team, const char *path) {
  struct stat facts;
  if (stat(path, &facts) != 0)
    wend_fail(team, WEND_ERR_FILE, "%s cannot be opened: %s", path, strerror(errno));
  else if (!S_ISREG(facts.st_mode))
    wend_fail(team, WEND_ERR_FILE, "%s is no file", path);
  else if (access(path, R_OK) != 0)
    wend_fail(team, WEND_ERR_FILE, "%s cannot be read: %s", path, strerror(errno));
  else if (H5Fis_hdf5(path) <= 0)
    wend_fail(team, WEND_ERR_FILE, "%s is no HDF5 file, or a damaged one", path);
}

static hid_t shared_access(wend_team *team) {
  const hid_t access = H5Pcreate(H5P_FILE_ACCESS);
  if (access < 0 || H5Pset_fapl_mpio(access, team->comm, MPI_INFO_NULL) < 0 ||
      H5Pset_all_coll_metadata_ops(access, true) < 0 ||
      H5Pset_coll_metadata_write(access, true) < 0)
    wend_fail(team, WEND_ERR_FILE, "HDF5 offers no parallel access: use its MPI build");
  return access;
}

wend_status wend_hdf_open(wend_team *team, const char *path, wend_hdf *hdf) {
  wend_status status;
  begin(team, path, hdf);
  hid_t access = -1;
  if (team->rank == 0) look_before_open(team, path);
  WEND_TRY(wend_agree(team));
  access = shared_access(team);
  WEND_TRY(wend_agree(team));
  hdf->file = H5Fopen(path, H5F_ACC_RDONLY, access);
  if (hdf->file < 0) wend_hdf_fail(hdf, "cannot open", "the file");
  WEND_TRY(wend_agree(team));
done:
  if (access >= 0) H5Pclose(access);
  if (status != WEND_OK) wend_hdf_close(hdf);
  return status;
}

static void look_before_create(wend_team *team, const char *path, const char *part) {
  struct stat facts;
  if (stat(path, &facts) == 0 && !S_ISREG(facts.st_mode)) {
    wend_fail(team, WEND_ERR_FILE, "%s cannot be written: something else has that name", path);
    return;
  }
  const int file = open(part, O_WRONLY | O_CREAT, 0666);
  if (file < 0)
    wend_fail(team, WEND_ERR_FILE, "%s cannot be written: %s", part, strerror(errno));
  else
    close(file);
}

wend_status wend_hdf_create(wend_team *team, const char *path, wend_hdf *hdf) {
  wend_status status;
  begin(team, path, hdf);
  hid_t access = -1;
  char *part = wend_allocate(team, (int64_t)strlen(path) + 6, 1);
  if (part != NULL) sprintf(part, "%s.part", path);
  if (part != NULL && team->rank == 0) look_before_create(team, path, part);
  WEND_TRY(wend_agree(team));
  hdf->part = part;
  part = NULL;
  access = shared_access(team);
  WEND_TRY(wend_agree(team));
  hdf->file = H5Fcreate(hdf->part, H5F_ACC_TRUNC, H5P_DEFAULT, access);
  if (hdf->file < 0) wend_hdf_fail(hdf, "cannot create", "the file");
  WEND_TRY(wend_agree(team));
done:
  free(part);
  if (access >= 0) H5Pclose(access);
  if (status != WEND_OK) wend_hdf_close(hdf);
  return status;
}

/* Objects left open would keep the file open: they are closed with it. */
static void close_file(wend_hdf *hdf) {
  if (hdf->file < 0) return;
  hid_t open[64];
  const unsigned kinds = H5F_OBJ_DATASET | H5F_OBJ_GROUP | H5F_OBJ_DATATYPE | H5F_OBJ_LOCAL;
  const ssize_t n = H5Fget_obj_ids(hdf->file, kinds, 64, open);
  for (ssize_t k = 0; k < n; k++) H5Oclose(open[k]);
  if (H5Fclose(hdf->file) < 0) wend_hdf_fail(hdf, "cannot close", "the file");
  hdf->file = -1;
}

void wend_hdf_close(wend_hdf *hdf) {
  if (hdf->team == NULL) return;
  const bool failing = hdf->team->status != WEND_OK;
  close_file(hdf);
  if (!failing)
    hdf->team->status = WEND_OK; /* nothing was lost by a bad close of a file that was read */
  if (hdf->part != NULL && hdf->team->rank == 0) unlink(hdf->part);
  free(hdf->part);
  H5Eset_auto2(H5E_DEFAULT, hdf->talk, hdf->talk_data);
  memset(hdf, 0, sizeof *hdf);
  hdf->file = -1;
}

static void sync_path(wend_hdf *hdf, const char *path) {
  const int file = open(path, O_RDONLY);
  /* Some file systems cannot sync a folder and say EINVAL: nothing more can be done there. */
  if (file < 0 || (fsync(file) != 0 && errno != EINVAL))
    wend_fail(hdf->team, WEND_ERR_FILE, "%s: cannot sync %s: %s", hdf->path, path,
              strerror(errno));
  if (file >= 0) close(file);
}

static void give_name(wend_hdf *hdf) {
  char *copy = wend_allocate(hdf->team, (int64_t)strlen(hdf->path) + 1, 1);
  if (copy == NULL) return;
  strcpy(copy, hdf->path);
  if (rename(hdf->part, hdf->path) != 0)
    wend_fail(hdf->team, WEND_ERR_FILE, "%s cannot be renamed to %s: %s", hdf->part, hdf->path,
              strerror(errno));
  else
    sync_path(hdf, dirname(copy));
  free(copy);
}

wend_status wend_hdf_publish(wend_hdf *hdf) {
  wend_status status;
  wend_team *team = hdf->team;
  if (team->status == WEND_OK && H5Fflush(hdf->file, H5F_SCOPE_LOCAL) < 0)
    wend_hdf_fail(hdf, "cannot flush", "the file");
  close_file(hdf);
  WEND_TRY(wend_agree(team));
  sync_path(hdf, hdf->part);
  WEND_TRY(wend_agree(team));
  if (team->rank == 0) give_name(hdf);
  WEND_TRY(wend_agree(team));
  free(hdf->part);
  hdf->part = NULL;
done:
  wend_hdf_close(hdf);
  return status;
}
