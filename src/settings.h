/* SPDX-License-Identifier: LGPL-3.0-or-later
 * settings.h: the numerical choices of a run, with their defaults. */
#ifndef WEND_SRC_SETTINGS_H
#define WEND_SRC_SETTINGS_H

#include <stdbool.h>

typedef struct wend_settings {
  const char *smoothing; /**< smoothing kernel, by name */
  double neighbours;     /**< target number, self included; 0: 22 in 2-D, 48 in 3-D */
  double closure;        /**< faces are swept until their closure is below this */
  int sweeps;            /**< sweeps at most */
  bool close_faces;      /**< sum_j A_ij = 0; off only to show what it is worth */
  bool fix_volumes;      /**< sum_j A_ij.r_ij = 2 D V_i; off only to show what it is worth */
  double angle_power;    /**< p: power of the squared cosine in the low-order exchange */
  double angle_share;    /**< phi: share of it that is kept along the field */
  bool sharpen;          /**< undo the second-order smoothing of slopes and faces; not beside
                           streaming, whose saturated flux has no modes to sharpen */
  bool limited;          /**< flux limiter; off only in tests of the linear operator */
  bool isotropic_unmagnetised; /**< where B = 0: (kappa_par + 2 kappa_perp) / 3, else none */
  double streaming_length;     /**< ell, absolute; 0: not so */
  double streaming_supports;   /**< ell in supports H; 0: not so. Both 0: no streaming */
  double alfven_ceiling;       /**< v_A at most; 0: no ceiling */
  const char *supertime;       /**< time-stepping family, by name */
  int stages;                  /**< stages a super-step at most */
  double margin;               /**< share of the stable length that is used */
  double tolerance;            /**< error a super-step, L1 over the total energy */
  double first_step;           /**< first super-step; 0: one explicit step */
  double fixed_step; /**< super-steps of this length without error control; 0: controlled */
  bool local_bounds; /**< also test bounds from s layers of neighbours (costs s halo exchanges)
                      */
} wend_settings;

/** The defaults. Local. */
wend_settings wend_settings_default(void);

#endif
