/* SPDX-License-Identifier: GPL-3.0-or-later
 * arch.h: an invented example to run: cosmic rays let loose at the foot of a magnetic arch. */
#ifndef WEND_SCENES_ARCH_H
#define WEND_SCENES_ARCH_H

#include "team.h"

/** Writes FOLDER/arch.h5 (side^3 particles) and FOLDER/arch.yaml; makes the folder if it is
 * missing. Collective. WEND_ERR_FILE names what could not be written. */
wend_status wend_arch_write(wend_team *team, const char *folder, int side);

#endif
