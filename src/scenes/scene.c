/* SPDX-License-Identifier: GPL-3.0-or-later
 * scene.c: the table of scenes, and their verdicts. A new scene is a file of its own and a row
 * here. */
#include "scene.h"
#include <stdarg.h>
#include <stdio.h>
#include <string.h>

static const wend_scene table[] = {
    {"ring", "a patch diffusing along circular field lines", wend_ring_prove},
    {"blob", "a Gaussian spreading along an oblique field", wend_blob_prove},
    {"wave", "a mode decaying along the field, and one across it", wend_wave_prove},
    {"triangle", "streaming down a triangle, whose top becomes a plateau", wend_triangle_prove},
    {"ball", "a ball of gas losing energy through its surface", wend_ball_prove},
};

const wend_scene *wend_scene_at(int k) {
  const int known = (int)(sizeof table / sizeof table[0]);
  return k >= 0 && k < known ? &table[k] : NULL;
}

const wend_scene *wend_scene_find(const char *name) {
  for (int k = 0; wend_scene_at(k) != NULL; k++)
    if (strcmp(table[k].name, name) == 0) return &table[k];
  return NULL;
}

void wend_scene_say(const wend_team *team, const char *format, ...) {
  if (team->rank != 0) return;
  va_list arguments;
  va_start(arguments, format);
  vprintf(format, arguments);
  va_end(arguments);
  fflush(stdout);
}

static void judge(const wend_team *team, wend_verdict *verdict, bool held, double figure,
                  const char *relation, double bar, const char *format, va_list arguments) {
  char text[256];
  vsnprintf(text, sizeof text, format, arguments);
  if (held)
    verdict->held++;
  else
    verdict->missed++;
  wend_scene_say(team, "  %-6s  %-58s %10.4g %s %.4g\n", held ? "held" : "MISSED", text, figure,
                 relation, bar);
}

void wend_verdict_most(const wend_team *team, wend_verdict *verdict, double figure, double bar,
                       const char *format, ...) {
  va_list arguments;
  va_start(arguments, format);
  judge(team, verdict, figure <= bar, figure, "<=", bar, format, arguments);
  va_end(arguments);
}

void wend_verdict_least(const wend_team *team, wend_verdict *verdict, double figure, double bar,
                        const char *format, ...) {
  va_list arguments;
  va_start(arguments, format);
  judge(team, verdict, figure >= bar, figure, ">=", bar, format, arguments);
  va_end(arguments);
}

wend_status wend_verdict_close(wend_team *team, const wend_verdict *verdict,
                               const char *scene) {
  wend_scene_say(team, "%s: %d bars held, %d missed\n", scene, verdict->held, verdict->missed);
  if (verdict->missed > 0)
    wend_fail(team, WEND_ERR_PROOF, "%s: %d of %d bars were missed", scene, verdict->missed,
              verdict->held + verdict->missed);
  return wend_agree(team);
}
