/* SPDX-License-Identifier: GPL-3.0-or-later
 * command.c: the table of subcommands. A new one is a file of its own and a row here. */
#include "command.h"
#include <stdarg.h>
#include <stdio.h>
#include <string.h>

static const wend_command table[] = {
    {"example", "write a particle file and a setup to try", wend_example_command},
    {"prove", "run a problem with a known answer and judge the figures", wend_prove_command},
    {"run", "carry a setup file through to its outputs", wend_run_command},
    {NULL, NULL, NULL},
};

const wend_command *wend_command_at(int k) {
  const int known = (int)(sizeof table / sizeof table[0]) - 1;
  return k >= 0 && k < known ? &table[k] : NULL;
}

const wend_command *wend_command_find(const char *name) {
  for (const wend_command *c = table; c->name != NULL; c++)
    if (strcmp(c->name, name) == 0) return c;
  return NULL;
}

int wend_command_usage(wend_team *team, const char *format, ...) {
  va_list arguments;
  va_start(arguments, format);
  vsnprintf(team->text, sizeof team->text, format, arguments);
  va_end(arguments);
  return WEND_USAGE;
}
