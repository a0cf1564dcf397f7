/* SPDX-License-Identifier: LGPL-3.0-or-later
 * xdmf.h: a small XML file that tells ParaView and VisIt what a particle file holds. Private.
 */
#ifndef WEND_IO_XDMF_H
#define WEND_IO_XDMF_H

#include "records.h"

/** What the companion of a particle file says. */
typedef struct wend_xdmf {
  const char *path;  /**< the particle file; the companion lies beside it */
  int64_t iteration; /**< the N of /data/N */
  double time;       /**< run units */
  int64_t total;     /**< particles in the file */
  int dim;
  int components[WEND_COLUMNS]; /**< of the k-th record in the file; 0: not there */
} wend_xdmf;

/** Writes the companion: the path with .xmf in place of .h5, by way of a temporary file.
 * Collective. */
wend_status wend_xdmf_write(wend_team *team, const wend_xdmf *xdmf);

#endif
