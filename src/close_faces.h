/* SPDX-License-Identifier: LGPL-3.0-or-later
 * close_faces.h: sweeps over all ranks until faces close and span their volumes. */
#ifndef WEND_SRC_CLOSE_FACES_H
#define WEND_SRC_CLOSE_FACES_H

#include "geometry.h"

/** Computes the raw faces of a geometry whose volumes and inverse matrices are complete, sweeps
 * until the closure is below settings->closure or settings->sweeps were made, and applies the
 * change. Fills the face figures of the report. Collective. */
wend_status wend_close_faces(wend_team *team, const wend_settings *settings,
                             wend_geometry *geometry);

#endif
