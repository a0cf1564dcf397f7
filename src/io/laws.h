/* SPDX-License-Identifier: LGPL-3.0-or-later
 * laws.h: fills columns of coefficients from the laws of a setup. */
#ifndef WEND_IO_LAWS_H
#define WEND_IO_LAWS_H

#include "particles.h"
#include "setup.h"

/** Fills WEND_KPAR and WEND_KPERP as the setup says. Collective.
 *
 *  A record that a law needs and the particles lack is WEND_ERR_FILE and names the key, the
 * record and the particle file. */
wend_status wend_laws_apply(wend_team *team, const wend_setup *setup,
                            wend_particles *particles);
/** Frees columns that hold the same value everywhere by law: the setup says it all. Local. */
void wend_laws_drop_constant(const wend_setup *setup, wend_particles *particles);

#endif
