/* SPDX-License-Identifier: LGPL-3.0-or-later
 * faces.h: pair areas that close around every particle and span its exact volume.
 *
 * Raw areas A_ij = V_i c_ij - V_j c_ji come from the moving-least-squares gradient. On
 * disordered particles they neither close nor span the volume: the first deposits noise from a
 * uniform flux, the second biases the diffusion coefficient at every resolution. Both
 * conditions,
 *
 *     sum_j A_ij = 0,      sum_j A_ij.r_ij = 2 D V_i,
 *
 * are met by the smallest weighted change A_ij += omega_ij [(l_i - l_j) + (s_i + s_j) r_ij]
 * with omega_ij = (w_ij + w_ji)(V_i + V_j)/(H_i^2 + H_j^2): a vector l and a scalar s a
 * particle, found by Chebyshev sweeps on the Jacobi-scaled system (virtual faces from a
 * weighted graph Laplacian: Trask, Bochev & Perego 2020, arXiv:1903.04621; the volume condition
 * is ours). Areas are antisymmetric bit for bit: both ends evaluate the same products and sums
 * up to sign. */
#ifndef WEND_KERNELS_FACES_H
#define WEND_KERNELS_FACES_H

#include "domain.h"
#include "pairs.h"
#include "smoothing.h"

/** What faces are made of; arrays run over owned particles, then ghosts. */
typedef struct wend_face_source {
  const wend_domain *domain;
  const wend_smoothing *smoothing;
  const double (*place)[4];   /**< x, y, z, H */
  const double *volume;       /**< V */
  const double (*inverse)[6]; /**< M^-1 as xx, xy, xz, yy, yz, zz */
} wend_face_source;

/** Pair columns of the faces, [entries] each, in the order of pairs.h. */
typedef struct wend_faces {
  float *area[3]; /**< A_ij, pointing from i to j */
  float *arm[3];  /**< r_ij */
  float *weight;  /**< omega_ij; 0 on padding */
} wend_faces;

/** Computes raw areas, arms and weights of the rows in `slices`, and the Jacobi diagonal
 *  [rows][2]: sum_j omega and sum_j omega r^2. Local, no overlap. */
void wend_faces_raw(const wend_pairs *pairs, wend_slices slices, const wend_face_source *source,
                    const wend_faces *faces, double (*restrict diagonal)[2]);

/** Computes the residual of both conditions, [rows][4]: -sum_j A_ij and 2 D V_i - sum_j
 * A_ij.r_ij, with the unknowns [n][4] = l, s applied to the areas. Local, no overlap. */
void wend_faces_residual(const wend_pairs *pairs, wend_slices slices, int dim,
                         const wend_faces *faces, const double *restrict volume,
                         const double (*restrict unknown)[4], double (*restrict residual)[4]);

/** Computes sum_j |A_ij| [rows], with the unknowns applied: the yardstick of closure. */
void wend_faces_extent(const wend_pairs *pairs, wend_slices slices, const wend_faces *faces,
                       const double (*restrict unknown)[4], double *restrict extent);

/** Adds the change that the unknowns describe to the areas, in place. */
void wend_faces_apply(const wend_pairs *pairs, wend_slices slices, const wend_faces *faces,
                      const double (*restrict unknown)[4]);

/** The Chebyshev recurrence for eigenvalues in [lowest, highest]: direction = carry direction +
 * gain (scaled residual). */
typedef struct wend_chebyshev {
  double sigma, delta, rho;
  double carry, gain;
} wend_chebyshev;

/** Prepares the first sweep. Eigenvalues of the Jacobi-scaled system lie below 4 by counting: a
 * pair's energy is at most four times the sum of its parts (Saad 2003, Iterative methods,
 * algorithm 12.1). */
wend_chebyshev wend_chebyshev_begin(double lowest, double highest);
/** Moves on to the next sweep. */
void wend_chebyshev_next(wend_chebyshev *chebyshev);

/** One sweep's update of n rows: direction [n][4] and unknown [n][4] in place. `scale` switches
 * the vector part (closure) and the scalar part (volume) on (1) or off (0); rows with surface
 * set stay at zero. */
void wend_faces_update(int32_t n, const wend_chebyshev *chebyshev, const double scale[2],
                       const double (*restrict diagonal)[2],
                       const double (*restrict residual)[4],
                       const unsigned char *restrict surface, double (*restrict direction)[4],
                       double (*restrict unknown)[4]);

#endif
