/* SPDX-License-Identifier: GPL-3.0-or-later
 * example.c: `wend example FOLDER`: writes a particle file and a setup to try `wend run` on. */
#include "arch.h"
#include "command.h"
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

/* Particles a side of the box. */
enum { SIDE = 32, SIDE_LEAST = 8, SIDE_MOST = 512 };

static void print_help(void) {
  printf("usage: wend example FOLDER [SIDE]\n\n"
         "Writes FOLDER/arch.h5 (SIDE^3 particles, %d^3 by default) and FOLDER/arch.yaml: an "
         "invented\n"
         "magnetic arch above a gas layer, with cosmic rays at its foot.\n\n"
         "example:\n"
         "  wend example tour && mpirun -n 2 wend run tour/arch.yaml\n",
         SIDE);
}

int wend_example_command(wend_team *team, int argc, char **argv) {
  if (argc == 2 && strcmp(argv[1], "--help") == 0) {
    if (team->rank == 0) print_help();
    return WEND_OK;
  }
  if (argc < 2 || argc > 3 || argv[1][0] == '-')
    return wend_command_usage(team, "example: where to? wend example FOLDER [SIDE]");
  char *end = "";
  const long side = argc == 3 ? strtol(argv[2], &end, 10) : SIDE;
  if (*end != '\0' || side < SIDE_LEAST || side > SIDE_MOST)
    return wend_command_usage(team,
                              "example: %s is no number of particles a side from %d to %d",
                              argv[2], SIDE_LEAST, SIDE_MOST);
  const wend_status status = wend_arch_write(team, argv[1], (int)side);
  if (status == WEND_OK && team->rank == 0)
    printf("wrote %s/arch.h5 and %s/arch.yaml; next: wend run %s/arch.yaml\n", argv[1], argv[1],
           argv[1]);
  return status;
}
