/* SPDX-License-Identifier: GPL-3.0-or-later
 * web.h: particles on a jittered lattice with their lists, volumes, gradients and faces, for
 * the tests of kernels. */
#ifndef WEND_TESTS_WEB_H
#define WEND_TESTS_WEB_H

#include "lists.h"
#include "operator.h"

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
  double (*field)[3]; /**< unit field, 0 at first */
  double (*kappa)[2]; /**< 0 at first */
} web;

/** Builds volumes, inverse matrices, surface marks and raw faces; unknowns are 0. */
web web_create(const web_plan *plan, uint64_t seed);
void web_destroy(web *w);

wend_face_source web_source(const web *w);

/** Gives every particle a field and coefficients: smooth, with a jump of direction and of
 * coefficients by 100, a region without field, and kappa_perp = 0 unless `across`. */
void web_magnetise(web *w, bool across, uint64_t seed);
/** Fields and coefficients for the operator kernels, p = 4, phi = 0.6; borrows from the web. */
wend_operator_source web_operator(const web *w);

/** Entries of a pair column, padding included. */
int64_t web_entries(const web *w);
/** A pair column of zeros; to be freed. */
float *web_column(const web *w);
/** Entry of the pair (j, i), where entry k of row i is (i, j). */
int64_t web_twin(const web *w, int32_t i, int64_t k);

/** Makes Chebyshev sweeps of the unknowns for eigenvalues in [lowest, 4], both conditions on.
 */
void web_sweep(web *w, double lowest, int sweeps);
/** Sweeps and applies the change: closed, volume-exact faces to float precision. */
void web_close(web *w);
/** Residual [rows][4] of both conditions; to be freed. */
double (*web_residual(const web *w))[4];

/** Same bits? */
bool web_same_float(float a, float b);
bool web_same(double a, double b);

#endif
