/* SPDX-License-Identifier: GPL-3.0-or-later
 * scratch.c: a folder of its own for the files of one test program, shared by its ranks. */
#include "scratch.h"
#include <dirent.h>
#include <mpi.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

static char folder[256];

static int rank(void) {
  int number;
  MPI_Comm_rank(MPI_COMM_WORLD, &number);
  return number;
}

void scratch_begin(void) {
  if (rank() == 0) {
    const char *above = getenv("TMPDIR") != NULL ? getenv("TMPDIR") : "/tmp";
    snprintf(folder, sizeof folder,
             "%s/wend_test_"
             "XX"
             "XX"
             "XX",
             above);
    if (mkdtemp(folder) == NULL) folder[0] = '\0';
  }
  MPI_Bcast(folder, sizeof folder, MPI_CHAR, 0, MPI_COMM_WORLD);
}

/* Calls act for each file but the folders themselves. */
static int each_file(void (*act)(const char *path)) {
  int n = 0;
  DIR *list = opendir(folder);
  for (struct dirent *entry = NULL; list != NULL && (entry = readdir(list)) != NULL;) {
    if (strcmp(entry->d_name, ".") == 0 || strcmp(entry->d_name, "..") == 0) continue;
    n++;
    if (act != NULL) act(scratch_path(entry->d_name));
  }
  if (list != NULL) closedir(list);
  return n;
}

static void remove_one(const char *path) { remove(path); }

void scratch_end(void) {
  MPI_Barrier(MPI_COMM_WORLD);
  if (rank() != 0) return;
  each_file(remove_one);
  rmdir(folder);
}

int scratch_files(void) { return each_file(NULL); }

const char *scratch_path(const char *name) {
  static char path[8][512];
  static int turn;
  turn = (turn + 1) % 8;
  snprintf(path[turn], sizeof path[turn], "%s/%s", folder, name);
  return path[turn];
}

void scratch_write(const char *name, size_t size, const void *data) {
  MPI_Barrier(MPI_COMM_WORLD);
  if (rank() == 0) {
    FILE *out = fopen(scratch_path(name), "wb");
    if (out != NULL) {
      fwrite(data, 1, size, out);
      fclose(out);
    }
  }
  MPI_Barrier(MPI_COMM_WORLD);
}

char *scratch_read(const char *name, size_t *size) {
  FILE *in = fopen(scratch_path(name), "rb");
  if (in == NULL) return NULL;
  fseek(in, 0, SEEK_END);
  const long length = ftell(in);
  rewind(in);
  char *data = calloc((size_t)length + 1, 1);
  *size = fread(data, 1, (size_t)length, in);
  fclose(in);
  return data;
}
