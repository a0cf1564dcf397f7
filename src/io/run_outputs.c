/* SPDX-License-Identifier: LGPL-3.0-or-later
 * run_outputs.c: the output files of a run, FOLDER/NAME_000000.h5 and on. */
#include "particle_file.h"
#include "run.h"
#include <ctype.h>
#include <dirent.h>
#include <errno.h>
#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

enum { PATH_MOST = 4096 };

wend_status wend_run_path(wend_team *team, const wend_run *run, size_t size, char *text,
                          const char *tail, ...) {
  const int length = snprintf(text, size, "%s/%s", run->setup.folder, run->setup.name);
  int more = 0;
  if (length >= 0 && (size_t)length < size) {
    va_list arguments;
    va_start(arguments, tail);
    more = vsnprintf(text + length, size - (size_t)length, tail, arguments);
    va_end(arguments);
  }
  if (length < 0 || more < 0 || (size_t)(length + more) >= size)
    wend_fail(team, WEND_ERR_ARGUMENT, "%s: output.folder and output.name are too long",
              run->setup.path);
  return team->status;
}

/* Makes each folder of the path that is missing. */
static void make_folders(wend_team *team, const wend_run *run) {
  char path[PATH_MOST];
  const int length = snprintf(path, sizeof path, "%s", run->setup.folder);
  if (length >= PATH_MOST) {
    wend_fail(team, WEND_ERR_ARGUMENT, "%s: output.folder is too long", run->setup.path);
    return;
  }
  for (int k = 1; k <= length; k++) {
    if (path[k] != '/' && path[k] != '\0') continue;
    const char kept = path[k];
    path[k] = '\0';
    struct stat facts;
    const int trouble = mkdir(path, 0777) == 0 ? 0 : errno;
    const bool there = stat(path, &facts) == 0;
    if (trouble != 0 && !(there && S_ISDIR(facts.st_mode))) {
      wend_fail(team, WEND_ERR_FILE, "%s: output.folder: %s cannot be made: %s",
                run->setup.path, path, strerror(there ? ENOTDIR : trouble));
      return;
    }
    path[k] = kept;
  }
}

/* Number in NAME_<digits>.h5, .xmf or either with .part; -1 for any other file. */
static int64_t number_of(const char *file, const char *name) {
  static const char *const tail[] = {".h5", ".xmf", ".h5.part", ".xmf.part"};
  const size_t length = strlen(name);
  if (strncmp(file, name, length) != 0 || file[length] != '_' ||
      !isdigit((unsigned char)file[length + 1]))
    return -1;
  char *end;
  const long long number = strtoll(file + length + 1, &end, 10);
  for (size_t k = 0; k < sizeof tail / sizeof tail[0]; k++)
    if (strcmp(end, tail[k]) == 0 && end - file >= (ptrdiff_t)length + 7) return number;
  return -1;
}

/* A run that starts from an output of that name would replace its own input. */
static void spare_input(wend_team *team, const wend_run *run) {
  struct stat input, facts;
  DIR *list = stat(run->setup.particles, &input) == 0 ? opendir(run->setup.folder) : NULL;
  for (struct dirent *entry; list != NULL && (entry = readdir(list)) != NULL;) {
    char path[PATH_MOST];
    if (number_of(entry->d_name, run->setup.name) < 0) continue;
    snprintf(path, sizeof path, "%s/%s", run->setup.folder, entry->d_name);
    if (stat(path, &facts) == 0 && facts.st_dev == input.st_dev && facts.st_ino == input.st_ino)
      wend_fail(team, WEND_ERR_SETUP,
                "%s: output.name: the outputs would replace the particle file %s: choose "
                "another name or folder",
                run->setup.path, run->setup.particles);
  }
  if (list != NULL) closedir(list);
}

static void try_folder(wend_team *team, const wend_run *run) {
  char path[PATH_MOST];
  if (wend_run_path(team, run, sizeof path, path, "_try_%ld.part", (long)getpid()) != WEND_OK)
    return;
  FILE *file = fopen(path, "w");
  if (file == NULL)
    wend_fail(team, WEND_ERR_FILE, "%s: output.folder: nothing can be written to %s: %s",
              run->setup.path, run->setup.folder, strerror(errno));
  else
    fclose(file);
  unlink(path);
}

wend_status wend_run_make_folder(wend_team *team, const wend_run *run) {
  if (team->rank == 0) {
    make_folders(team, run);
    if (team->status == WEND_OK) spare_input(team, run);
    if (team->status == WEND_OK) try_folder(team, run);
  }
  return wend_agree(team);
}

wend_status wend_run_write_output(wend_team *team, wend_run *run) {
  wend_status status;
  char path[PATH_MOST];
  const wend_file_facts facts = {.iteration = run->outputs.files,
                                 .time = run->march.time,
                                 .dt = run->march.last.step,
                                 .domain_given = true,
                                 .domain = run->domain,
                                 .setup = run->setup.text};
  wend_run_path(team, run, sizeof path, path, "_%06lld.h5", (long long)run->outputs.files);
  WEND_TRY(wend_agree(team));
  WEND_TRY(wend_particle_file_write(team, path, &run->setup.units, &run->particles, &facts));
  run->outputs.files++;
  wend_output_pass(&run->setup, run->start, run->march.time, &run->outputs);
done:
  return status;
}

static int64_t drop(wend_team *team, const wend_run *run, int64_t from) {
  int64_t removed = 0;
  DIR *list = opendir(run->setup.folder);
  if (list == NULL) return 0;
  for (struct dirent *entry; (entry = readdir(list)) != NULL;) {
    char path[PATH_MOST];
    if (number_of(entry->d_name, run->setup.name) < from) continue;
    snprintf(path, sizeof path, "%s/%s", run->setup.folder, entry->d_name);
    if (unlink(path) != 0)
      wend_fail(team, WEND_ERR_FILE, "%s cannot be removed: %s", path, strerror(errno));
    const size_t length = strlen(path);
    removed += length > 3 && strcmp(path + length - 3, ".h5") == 0;
  }
  closedir(list);
  return removed;
}

wend_status wend_run_drop_outputs(wend_team *team, const wend_run *run, int64_t from,
                                  int64_t *removed) {
  int64_t count = team->rank == 0 ? drop(team, run, from) : 0;
  wend_team_count(team, 1, &count);
  if (removed != NULL) *removed = count;
  return wend_agree(team);
}
