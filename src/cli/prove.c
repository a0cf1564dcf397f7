/* SPDX-License-Identifier: GPL-3.0-or-later
 * prove.c: `wend prove SCENE`: runs a built-in problem with a known answer and judges the
 * figures. */
#include "command.h"
#include "scene.h"
#include <getopt.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static void print_help(void) {
  printf("usage: wend prove SCENE [OPTION...]\n\n"
         "Runs a problem whose answer is known, prints the figures and judges them against "
         "their bars.\n"
         "With an option that changes the problem, figures are printed without "
         "bars.\n\nscenes:\n");
  for (int k = 0; wend_scene_at(k) != NULL; k++)
    printf("  %-12s %s\n", wend_scene_at(k)->name, wend_scene_at(k)->help);
  printf("\noptions:\n"
         "  --full        also the long cases (minutes to an hour)\n"
         "  --side N      particles a side\n"
         "  --seeds A-B   seeds of the jitter\n"
         "  --jitter X    jitter in spacings\n"
         "  --time T      end time\n\n"
         "examples:\n"
         "  wend prove ring\n"
         "  mpirun -n 2 wend prove ring --side 100 --seeds 1-3 --time 20\n");
}

static bool read_number(const char *text, double *value) {
  char *end;
  *value = strtod(text, &end);
  return end != text && *end == '\0';
}

static bool read_seeds(const char *text, wend_scene_options *options) {
  char rest;
  const int read = sscanf(text, "%d-%d%c", &options->seed_first, &options->seed_last, &rest);
  if (read == 1) options->seed_last = options->seed_first;
  return (read == 1 || read == 2) && options->seed_first > 0 &&
         options->seed_last >= options->seed_first;
}

static int read_options(wend_team *team, int argc, char **argv, wend_scene_options *options) {
  static const struct option known[] = {
      {"full", no_argument, NULL, 'f'},        {"side", required_argument, NULL, 'n'},
      {"seeds", required_argument, NULL, 's'}, {"jitter", required_argument, NULL, 'j'},
      {"time", required_argument, NULL, 't'},  {NULL, 0, NULL, 0}};
  *options = (wend_scene_options){.jitter = -1};
  opterr = 0;
  optind = 1;
  for (int o; (o = getopt_long(argc, argv, "", known, NULL)) != -1;) {
    double value = 0;
    bool good = o != '?';
    if (o == 'f') options->full = true;
    if (o == 's') good = read_seeds(optarg, options);
    if (o == 'n' || o == 'j' || o == 't') good = read_number(optarg, &value) && value >= 0;
    if (o == 'n') options->side = (int)value;
    if (o == 'j') options->jitter = value;
    if (o == 't') options->time = value;
    if (!good || (o == 'n' && (value < 8 || value > 4096)) || (o == 't' && !(value > 0)))
      return wend_command_usage(
          team, "prove: option %s is unknown or has no sense here: wend prove --help",
          argv[optind - 1]);
  }
  return WEND_OK;
}

int wend_prove_command(wend_team *team, int argc, char **argv) {
  if (argc < 2 || strcmp(argv[1], "--help") == 0) {
    if (argc < 2)
      return wend_command_usage(team, "prove: which scene? wend prove --help lists them");
    if (team->rank == 0) print_help();
    return WEND_OK;
  }
  const wend_scene *scene = wend_scene_find(argv[1]);
  if (scene == NULL)
    return wend_command_usage(team, "prove: there is no scene %s: wend prove --help lists them",
                              argv[1]);
  wend_scene_options options;
  const int status = read_options(team, argc - 1, argv + 1, &options);
  return status == WEND_OK ? (int)scene->prove(team, &options) : status;
}
