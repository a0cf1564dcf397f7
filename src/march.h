/* SPDX-License-Identifier: LGPL-3.0-or-later
 * march.h: marches the CR energies in time by super-steps, with error control, bounds and
 * books. */
#ifndef WEND_SRC_MARCH_H
#define WEND_SRC_MARCH_H

#include "control.h"
#include "ledger.h"
#include "transport.h"

typedef struct wend_march {
  wend_settings settings;
  const wend_supertime *family;
  wend_transport *transport;
  double *energy; /**< [owned] E, borrowed from the particles */
  double time;
  int64_t steps;              /**< super-steps made */
  int64_t stages;             /**< stages made, thrown-away ones included */
  double low, high;           /**< range of e that may not be left */
  double seen_low, seen_high; /**< range of e at the ends of all super-steps so far */
  wend_control control;
  wend_plan last;    /**< the last super-step made */
  double last_error; /**< its estimated error, relative */
  wend_ledger ledger;
  int unknowns;    /**< E, escaped energy where a surface is open, heat with streaming */
  bool rate_known; /**< rate_0 belongs to the present energies */
  double *rate_0, *rate, *latest, *older, *trial; /**< [unknowns][owned] work space */
} wend_march;

/** Prepares to march energies [owned] from `time`. Collective. The transport and the energies
 * must outlive it. Negative or non-finite energies are an error (without particle id: check
 * them where they are read). */
wend_status wend_march_init(wend_team *team, const wend_settings *settings,
                            wend_transport *transport, double *energy, double time,
                            wend_march *march);

/** Makes one super-step, not beyond `until`; time becomes exactly `until` when it is reached.
 * Collective.
 *
 *  Never returns e < 0 or e beyond the range at the start by more than 1e-13 of max |e|: the
 * super-step is redone in shorter ones, down to forward Euler. WEND_ERR_STEP where even that
 * fails; energies are then unchanged. */
wend_status wend_march_step(wend_team *team, wend_march *march, double until);

/** Lengths of a saved state. */
enum {
  WEND_MARCH_NUMBERS = 9,
  WEND_MARCH_COUNTS = 7 + WEND_CAUSES,
  WEND_MARCH_LIMBS = (WEND_ACCOUNTS + 1) * WEND_SUM_LIMBS
};

/** What decides the future of a march, beside its energies: plain numbers for a checkpoint. The
 * same on every rank. */
typedef struct wend_march_state {
  double number[WEND_MARCH_NUMBERS];
  int64_t count[WEND_MARCH_COUNTS];
  int64_t limb[WEND_MARCH_LIMBS]; /**< of the books */
} wend_march_state;

/** Writes down the state of a march between two super-steps. Local. */
void wend_march_save(const wend_march *march, wend_march_state *state);
/** Puts a march that was prepared with the energies of that moment into the saved state, and
 * computes its rate. Collective. *same tells whether the explicit step is the saved one to the
 * bit, as it is where geometry and coefficients are. Numbers that no march can have are
 * WEND_ERR_ARGUMENT. */
wend_status wend_march_restore(wend_team *team, wend_march *march,
                               const wend_march_state *state, bool *same);

/** Computes the rates of all unknowns, [unknowns][owned], from energies [owned]. Collective. */
wend_status wend_march_rate(wend_team *team, wend_march *march, const double *energy,
                            double *rate);

/** Frees the work space. Local. */
void wend_march_reset(wend_march *march);

#endif
