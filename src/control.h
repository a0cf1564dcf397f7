/* SPDX-License-Identifier: LGPL-3.0-or-later
 * control.h: how long the next super-step is, and why. Pure decisions on numbers that all ranks
 * share. */
#ifndef WEND_SRC_CONTROL_H
#define WEND_SRC_CONTROL_H

#include "settings.h"
#include "supertime.h"
#include <stdint.h>

/** What set the length of a super-step. */
typedef enum wend_cause {
  WEND_CAUSE_START,    /**< first step after a start */
  WEND_CAUSE_ACCURACY, /**< error estimate */
  WEND_CAUSE_STAGES,   /**< most stages allowed */
  WEND_CAUSE_BOUNDS,   /**< a longer one left the bounds and was redone */
  WEND_CAUSE_OUTPUT,   /**< output or end time */
  WEND_CAUSE_FIXED,    /**< set by the user */
  WEND_CAUSES
} wend_cause;

/** Names a cause in one word. Local. */
const char *wend_cause_text(wend_cause cause);

typedef struct wend_control {
  double wanted;              /**< length that accuracy asks for */
  wend_cause cause;           /**< why `wanted` is what it is: start, accuracy or bounds */
  int64_t steps[WEND_CAUSES]; /**< super-steps made, by what set them */
  int64_t redone_bounds;      /**< attempts thrown away because they left the bounds */
  int64_t redone_error;       /**< attempts thrown away because the error was too large */
} wend_control;

/** One planned super-step. */
typedef struct wend_plan {
  double step;
  int stages; /**< 1: a forward-Euler step */
  wend_cause cause;
} wend_plan;

/** Starts a controller. explicit_step is the forward-Euler limit. */
wend_control wend_control_begin(const wend_settings *settings, double explicit_step);

/** Plans the next super-step: as accuracy asks, within the stages allowed, not beyond
 * `remaining`. */
wend_plan wend_control_plan(const wend_control *control, const wend_settings *settings,
                            const wend_supertime *family, double explicit_step,
                            double remaining);

/** Shortens a plan that left the bounds: half as long, down to an eighth of one forward-Euler
 * step. Returns false where there is nothing shorter. The controller remembers. */
bool wend_control_shorten(wend_control *control, const wend_settings *settings,
                          const wend_supertime *family, double explicit_step, wend_plan *plan);

/** Judges the error of an attempt: true where it is accepted, and the next length is set; false
 * where the plan was shortened and must be tried again. Steps no longer than the shortest
 * super-step of the family are always accepted, and accuracy asks for nothing shorter. */
bool wend_control_judge(wend_control *control, const wend_settings *settings,
                        const wend_supertime *family, double explicit_step, double error,
                        wend_plan *plan);

#endif
