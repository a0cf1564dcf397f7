/* SPDX-License-Identifier: GPL-3.0-or-later
 * scene.h: built-in problems with exact answers, and how their figures are judged. */
#ifndef WEND_SCENES_SCENE_H
#define WEND_SCENES_SCENE_H

#include "team.h"
#include <stdbool.h>
#include <stdint.h>

/** What a user may choose; 0 means the scene's own choice, and with it the scene's own bars. */
typedef struct wend_scene_options {
  bool full;                 /**< also the long cases */
  int side;                  /**< particles a side */
  int seed_first, seed_last; /**< seeds of the jitter */
  double jitter;             /**< in spacings; negative: the scene's own */
  double time;               /**< end time */
} wend_scene_options;

/** A scene: a row of the table. */
typedef struct wend_scene {
  const char *name;
  const char *help; /**< one line */
  /** Runs its cases and prints figures and verdicts on rank 0. Collective. WEND_ERR_PROOF where
   * a bar was missed. */
  wend_status (*prove)(wend_team *team, const wend_scene_options *options);
} wend_scene;

/** Finds a scene by name; NULL where there is none. Local. */
const wend_scene *wend_scene_find(const char *name);
/** The k-th scene; NULL beyond the last. Local. */
const wend_scene *wend_scene_at(int k);

/** Prints on rank 0 at once. Local. */
void wend_scene_say(const wend_team *team, const char *format, ...)
    __attribute__((format(printf, 2, 3)));

/** Bars held and missed so far. */
typedef struct wend_verdict {
  int held, missed;
} wend_verdict;

/** Judges one figure: prints it with its bar, and counts it. A NaN misses. Local; figures are
 * the same on all ranks. */
void wend_verdict_most(const wend_team *team, wend_verdict *verdict, double figure, double bar,
                       const char *format, ...) __attribute__((format(printf, 5, 6)));
void wend_verdict_least(const wend_team *team, wend_verdict *verdict, double figure, double bar,
                        const char *format, ...) __attribute__((format(printf, 5, 6)));
/** Sums up: WEND_OK, or WEND_ERR_PROOF with the count in the text. Collective. */
wend_status wend_verdict_close(wend_team *team, const wend_verdict *verdict, const char *scene);

wend_status wend_ring_prove(wend_team *team, const wend_scene_options *options);
wend_status wend_blob_prove(wend_team *team, const wend_scene_options *options);
wend_status wend_wave_prove(wend_team *team, const wend_scene_options *options);
wend_status wend_triangle_prove(wend_team *team, const wend_scene_options *options);
wend_status wend_ball_prove(wend_team *team, const wend_scene_options *options);

#endif
