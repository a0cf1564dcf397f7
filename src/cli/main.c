/* SPDX-License-Identifier: GPL-3.0-or-later
 * main.c: the `wend` program: starts MPI, picks the subcommand, turns its status into an exit
 * status.
 *
 * 0: done; 1: failed; 2: called wrongly. An error is one line on stderr, from rank 0 alone. */
#include "command.h"
#include "version_git.h"
#include <stdio.h>
#include <string.h>

static void print_help(void) {
  printf("usage: wend COMMAND [ARGUMENT...]\n"
         "       mpirun -n RANKS wend COMMAND [ARGUMENT...]\n\n"
         "Cosmic-ray transport on the particles of a Lagrangian code.\n\n");
  for (int k = 0; wend_command_at(k) != NULL; k++)
    printf("  %-12s %s\n", wend_command_at(k)->name, wend_command_at(k)->help);
  printf("  %-12s %s\n", "--help", "print this");
  printf("  %-12s %s\n", "--version", "print the version");
}

static int dispatch(wend_team *team, int argc, char **argv) {
  if (argc < 2) return wend_command_usage(team, "no command given: wend --help lists them");
  const bool speaks = team->rank == 0;
  if (strcmp(argv[1], "--help") == 0 || strcmp(argv[1], "-h") == 0) {
    if (speaks) print_help();
    return WEND_OK;
  }
  if (strcmp(argv[1], "--version") == 0) {
    if (speaks) printf("wend %s (%s)\n", wend_version_text(), WEND_GIT_TEXT);
    return WEND_OK;
  }
  const wend_command *command = wend_command_find(argv[1]);
  if (command == NULL)
    return wend_command_usage(team, "there is no command %s: wend --help lists them", argv[1]);
  return command->run(team, argc - 1, argv + 1);
}

int main(int argc, char **argv) {
  int threads;
  if (MPI_Init_thread(&argc, &argv, MPI_THREAD_FUNNELED, &threads) != MPI_SUCCESS) return 1;
  wend_team team;
  int outcome = wend_team_init(&team, MPI_COMM_WORLD);
  if (outcome == WEND_OK) {
    outcome = dispatch(&team, argc, argv);
    if (outcome != WEND_OK && team.rank == 0) fprintf(stderr, "wend: %s\n", team.text);
    wend_team_reset(&team);
  } else {
    fprintf(stderr, "wend: %s\n", wend_status_text((wend_status)outcome));
  }
  MPI_Finalize();
  return outcome == WEND_OK ? 0 : outcome == WEND_USAGE ? 2 : 1;
}
