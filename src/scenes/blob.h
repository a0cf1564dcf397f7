/* SPDX-License-Identifier: GPL-3.0-or-later
 * blob.h: one run of the oblique Gaussian, and its figures. */
#ifndef WEND_SCENES_BLOB_H
#define WEND_SCENES_BLOB_H

#include "experiment.h"

typedef enum wend_blob_spacing {
  WEND_BLOB_EVEN,
  WEND_BLOB_SMOOTH, /**< varies smoothly by 4 along either axis */
  WEND_BLOB_JUMP    /**< three times finer for x > 0 */
} wend_blob_spacing;

typedef enum wend_blob_faces {
  WEND_BLOB_RAW,
  WEND_BLOB_CLOSED,
  WEND_BLOB_EXACT
} wend_blob_faces;

typedef struct wend_blob_case {
  int side;
  double jitter;
  wend_blob_spacing spacing;
  wend_blob_faces faces;
  bool magnetised;                /**< else B = 0 */
  double parallel, perpendicular; /**< coefficients, in units of 0.01 */
} wend_blob_case;

typedef struct wend_blob_figures {
  double kappa;  /**< effective over true, along the direction that spreads */
  double across; /**< spreading in the other direction over that */
  double l1;
  double beyond; /**< farthest value outside the range at the start */
  int64_t steps, stages;
  wend_geometry_report report;
} wend_blob_figures;

/** Runs one case with one seed. Collective. */
wend_status wend_blob_run(wend_team *team, const wend_blob_case *c, int seed,
                          wend_blob_figures *figures);

#endif
