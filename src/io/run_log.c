/* SPDX-License-Identifier: LGPL-3.0-or-later
 * run_log.c: what a reader needs to cite and to repeat a run. */
#include "hdf.h"
#include "machine.h"
#include "run.h"
#include "version_text.h"
#include <cyaml/cyaml.h>
#include <errno.h>
#include <inttypes.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>
#include <yaml.h>

enum { PATH_MOST = 4096, TEXT_MOST = 256 };

static void put_libraries(FILE *out) {
  char text[MPI_MAX_LIBRARY_VERSION_STRING];
  int length = 0;
  unsigned major = 0, minor = 0, patch = 0;
  wend_machine_processor(TEXT_MOST, text);
  fprintf(out, "processor: %s\n", text);
  wend_machine_math(TEXT_MOST, text);
  fprintf(out, "math library: %s\n", text);
  MPI_Get_library_version(text, &length);
  fprintf(out, "MPI: %.*s\n", (int)strcspn(text, "\n"), text);
  H5get_libversion(&major, &minor, &patch);
  fprintf(out, "HDF5: %u.%u.%u\n", major, minor, patch);
  fprintf(out, "libcyaml: %s\nlibyaml: %s\n", cyaml_version_str, yaml_get_version_string());
  fprintf(out, "compiler: %s\n", __VERSION__);
}

static void put_log(FILE *out, const wend_team *team, const wend_run *run, bool resumed) {
  char date[64], *setup = realpath(run->setup.path, NULL);
  char *particles = realpath(run->setup.particles, NULL);
  const time_t now = time(NULL);
  struct tm parts;
  gmtime_r(&now, &parts);
  strftime(date, sizeof date, "%Y-%m-%d %H:%M:%S UTC", &parts);
  fprintf(out, "%swend: %s (%s)\ndate: %s\n", resumed ? "\n" : "", wend_version_text(),
          WEND_GIT_TEXT, date);
  if (resumed) fprintf(out, "resumed after super-step: %" PRId64 "\n", run->march.steps);
  fprintf(out, "setup: %s\nsetup hash (FNV-1a): %016" PRIx64 "\n",
          setup != NULL ? setup : run->setup.path, wend_setup_hash(&run->setup));
  fprintf(out, "particle file: %s\nparticles: %" PRId64 "\nranks: %d\n",
          particles != NULL ? particles : run->setup.particles, run->total, team->size);
  put_libraries(out);
  free(setup);
  free(particles);
}

wend_status wend_run_write_log(wend_team *team, const wend_run *run, bool resumed) {
  char path[PATH_MOST];
  if (wend_run_path(team, run, sizeof path, path, "_run.log") == WEND_OK && team->rank == 0) {
    FILE *out = fopen(path, resumed ? "a" : "w");
    if (out != NULL) put_log(out, team, run, resumed);
    if (out == NULL || fclose(out) != 0)
      wend_fail(team, WEND_ERR_FILE, "%s cannot be written: %s", path, strerror(errno));
  }
  return wend_agree(team);
}
