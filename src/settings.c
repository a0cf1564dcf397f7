/* SPDX-License-Identifier: LGPL-3.0-or-later
 * settings.c: the defaults of the numerical choices. */
#include "settings.h"

wend_settings wend_settings_default(void) {
  return (wend_settings){
      .smoothing = "wendland-c2",
      .neighbours = 0,
      .closure = 5e-4,
      .sweeps = 32,
      .close_faces = true,
      .fix_volumes = true,
      .angle_power = 8,
      .angle_share = 0.6,
      .sharpen = true,
      .limited = true,
      .isotropic_unmagnetised = true,
      .supertime = "rkg2",
      .stages = 21,
      .margin = 0.95,
      .tolerance = 1e-5,
      .first_step = 0,
      .fixed_step = 0,
      .local_bounds = false,
  };
}
