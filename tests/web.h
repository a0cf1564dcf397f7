/* SPDX-License-Identifier: GPL-3.0-or-later
 * web.h: particles on a jittered lattice with their lists, volumes, gradients and faces, for
 * the tests of kernels. */
#ifndef WEND_TESTS_WEB_H
#define WEND_TESTS_WEB_H

#include "faces.h"
#include "lists.h"

/** How the particles of a web stand. */
typedef struct web_plan {
  int dim;
  unsigned periodic; /**< bit a set: axis a is periodic */
  int side;          /**< particles an axis of the box [-1, 1]^dim */
  double jitter;     /**< in spacings; 1 is nearly random */
  double support;    /**< mean H in spacings; supports vary by +-20% */
  int32_t extra;     /**< padding a row beyond what slices need */
} web_plan;

typedef struct web {
  lists l; /**< every particle is a row */
  double *volume;
  double (*inverse)[6];
  unsigned char *surface;
  wend_faces faces;
  double (*diagonal)[2];
  double (*unknown)[4];
} web;

/** Builds volumes, inverse matrices, surface marks and raw faces; unknowns are 0. */
web web_create(const web_plan *plan, uint64_t seed);
void web_destroy(web *w);

wend_face_source web_source(const web *w);
/** Entries of a pair column, padding included. */
int64_t web_entries(const web *w);
/** A pair column of zeros; to be freed. */
float *web_column(const web *w);
/** Entry of the pair (j, i), where entry k of row i is (i, j). */
int64_t web_twin(const web *w, int32_t i, int64_t k);

/** Makes Chebyshev sweeps of the unknowns for eigenvalues in [lowest, 4], both conditions on.
 */
void web_sweep(web *w, double lowest, int sweeps);
/** Residual [rows][4] of both conditions; to be freed. */
double (*web_residual(const web *w))[4];

/** Same bits? */
bool web_same_float(float a, float b);
bool web_same(double a, double b);

#endif
