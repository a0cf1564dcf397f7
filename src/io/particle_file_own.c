/* SPDX-License-Identifier: LGPL-3.0-or-later
 * particle_file_own.c: says who wrote a particle file: the attributes of the root group, and
 * what the standard has no place for in the group /wend. */
#include "box.h"
#include "particle_writer.h"
#include "version_text.h"
#include <ctype.h>
#include <inttypes.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

enum { NAME_MOST = 256 };

/* The date of this moment, or the one the environment asks for; rank 0's on all ranks. */
static void date_text(wend_team *team, size_t size, char *text) {
  const char *fixed = getenv("SOURCE_DATE_EPOCH");
  const time_t now = fixed != NULL ? (time_t)strtoll(fixed, NULL, 10) : time(NULL);
  struct tm parts;
  gmtime_r(&now, &parts);
  strftime(text, size, "%Y-%m-%d %H:%M:%S +0000", &parts);
  if (MPI_Bcast(text, (int)size, MPI_CHAR, 0, team->comm) != MPI_SUCCESS)
    wend_fail(team, WEND_ERR_MPI, "ranks could not agree on the date");
}

static void author_text(wend_team *team, size_t size, char *text) {
  const char *name = getenv("LOGNAME") != NULL ? getenv("LOGNAME") : getenv("USER");
  snprintf(text, size, "%s", name != NULL && name[0] != '\0' ? name : "unknown");
  if (MPI_Bcast(text, (int)size, MPI_CHAR, 0, team->comm) != MPI_SUCCESS)
    wend_fail(team, WEND_ERR_MPI, "ranks could not agree on the author");
}

/* "NAME_<iteration>.h5", padded with zeros or not, is one of a series: its format goes to text.
 */
static bool series_format(const char *path, int64_t iteration, size_t size, char *text) {
  const char *slash = strrchr(path, '/'), *name = slash != NULL ? slash + 1 : path;
  const size_t length = strlen(name);
  if (length < 5 || strcmp(name + length - 3, ".h5") != 0) return false;
  size_t first = length - 3;
  while (first > 0 && isdigit((unsigned char)name[first - 1])) first--;
  const int digits = (int)(length - 3 - first);
  if (digits == 0 || digits > 18 || first < 2 || name[first - 1] != '_' ||
      strtoll(name + first, NULL, 10) != iteration)
    return false;
  if (name[first] == '0' && digits > 1)
    snprintf(text, size, "%.*s%%0%dT.h5", (int)first, name, digits);
  else
    snprintf(text, size, "%.*s%%T.h5", (int)first, name);
  return true;
}

wend_status wend_particle_put_root(wend_particle_writer *w) {
  wend_hdf *h = &w->hdf;
  const hid_t root = h->file;
  const uint32_t extension = 0;
  char date[64], author[128], format[NAME_MOST] = "/data/%T/", made[160];
  date_text(w->team, sizeof date, date);
  author_text(w->team, sizeof author, author);
  const bool series = series_format(h->path, w->facts->iteration, sizeof format, format);
  unsigned major = 0, minor = 0, patch = 0;
  H5get_libversion(&major, &minor, &patch);
  snprintf(made, sizeof made, "HDF5 %u.%u.%u", major, minor, patch);
  wend_hdf_put_text(h, root, "openPMD", "1.1.0");
  wend_hdf_put(h, root, "openPMDextension", H5T_NATIVE_UINT32, 0, &extension);
  wend_hdf_put_text(h, root, "basePath", "/data/%T/");
  wend_hdf_put_text(h, root, "particlesPath", "particles/");
  wend_hdf_put_text(h, root, "iterationEncoding", series ? "fileBased" : "groupBased");
  wend_hdf_put_text(h, root, "iterationFormat", format);
  wend_hdf_put_text(h, root, "author", author);
  wend_hdf_put_text(h, root, "software", "wend");
  wend_hdf_put_text(h, root, "softwareVersion", wend_version_text());
  wend_hdf_put_text(h, root, "softwareDependencies", made);
  wend_hdf_put_text(h, root, "date", date);
  return wend_agree(w->team);
}

static void put_domain(wend_particle_writer *w, hid_t own) {
  if (!w->facts->domain_given) return;
  const wend_domain *domain = &w->facts->domain;
  const hid_t group = wend_hdf_group(&w->hdf, own, "domain");
  wend_hdf_put(&w->hdf, group, "lower", H5T_NATIVE_DOUBLE, w->dim, domain->lo);
  wend_hdf_put(&w->hdf, group, "upper", H5T_NATIVE_DOUBLE, w->dim, domain->hi);
  wend_hdf_put(&w->hdf, group, "thickness", H5T_NATIVE_DOUBLE, 0, &domain->thickness);
  wend_particle_put_unit(w, group, WEND_Q_LENGTH);
  for (int a = 0; a < w->dim; a++) {
    char name[32];
    snprintf(name, sizeof name, "boundary_%c", "xyz"[a]);
    wend_hdf_put_text(&w->hdf, group, name, wend_boundary_name(wend_box_boundary(domain, a)));
  }
  if (group >= 0) H5Gclose(group);
}

/* The setup as one string of a data set, since an attribute ends at 64 kB; rank 0 writes it. */
static wend_status put_setup(wend_particle_writer *w, hid_t own) {
  const char *text = w->facts->setup;
  hid_t set = -1, type = -1;
  wend_status status = WEND_OK;
  int length = text != NULL ? (int)strlen(text) : 0;
  if (MPI_Bcast(&length, 1, MPI_INT, 0, w->team->comm) != MPI_SUCCESS)
    wend_fail(w->team, WEND_ERR_MPI, "ranks could not agree on the setup text");
  if (length == 0) return wend_agree(w->team);
  type = H5Tcopy(H5T_C_S1);
  H5Tset_size(type, (size_t)length);
  H5Tset_strpad(type, H5T_STR_NULLPAD);
  const wend_hdf_block block = {.type = type, .total = 1, .n = w->team->rank == 0};
  WEND_TRY(wend_hdf_write(&w->hdf, own, "setup", &block, text, &set));
  wend_hdf_put_text(&w->hdf, set, "comment", "the setup of the run, YAML text");
  H5Dclose(set);
done:
  if (type >= 0) H5Tclose(type);
  return status;
}

wend_status wend_particle_put_own(wend_particle_writer *w) {
  wend_status status = WEND_OK;
  const hid_t own = wend_hdf_group(&w->hdf, w->hdf.file, "wend");
  wend_hdf_put_text(&w->hdf, own, "version", wend_version_text());
  wend_hdf_put_text(&w->hdf, own, "git", WEND_GIT_TEXT);
  put_domain(w, own);
  WEND_TRY(wend_agree(w->team));
  WEND_TRY(put_setup(w, own));
done:
  if (own >= 0) H5Gclose(own);
  return status;
}
