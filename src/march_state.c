/* SPDX-License-Identifier: LGPL-3.0-or-later
 * march_state.c: saves a march as plain numbers and restores it from them.
 *
 * The rate at the present energies is not among them: computed anew from the same energies it
 * has the same bits. */
#include "march.h"
#include <math.h>
#include <string.h>

enum { EXPLICIT = WEND_MARCH_NUMBERS - 1 };

/* Where each number lives, in the order of the saved state; the explicit step comes behind. */
static void list_numbers(wend_march *m, double *place[EXPLICIT]) {
  double *const all[EXPLICIT] = {&m->time,      &m->low,       &m->high,
                                 &m->seen_low,  &m->seen_high, &m->control.wanted,
                                 &m->last.step, &m->last_error};
  memcpy(place, all, sizeof all);
}

enum { PLAIN = 4, ENUMS = 3 };
_Static_assert(WEND_MARCH_COUNTS == PLAIN + ENUMS + WEND_CAUSES, "each count has a place");

static void list_counts(wend_march *m, int64_t *place[PLAIN]) {
  int64_t *const all[PLAIN] = {&m->steps, &m->stages, &m->control.redone_bounds,
                               &m->control.redone_error};
  memcpy(place, all, sizeof all);
}

void wend_march_save(const wend_march *march, wend_march_state *state) {
  wend_march m = *march;
  double *number[EXPLICIT];
  int64_t *count[PLAIN];
  list_numbers(&m, number);
  list_counts(&m, count);
  for (int k = 0; k < EXPLICIT; k++) state->number[k] = *number[k];
  state->number[EXPLICIT] = m.transport->explicit_step;
  for (int k = 0; k < PLAIN; k++) state->count[k] = *count[k];
  state->count[PLAIN] = m.control.cause;
  state->count[PLAIN + 1] = m.last.cause;
  state->count[PLAIN + 2] = m.last.stages;
  memcpy(&state->count[PLAIN + ENUMS], m.control.steps, sizeof m.control.steps);
  for (int a = 0; a <= WEND_ACCOUNTS; a++)
    memcpy(&state->limb[a * WEND_SUM_LIMBS],
           a < WEND_ACCOUNTS ? m.ledger.account[a].limb : m.ledger.now.limb,
           sizeof m.ledger.now.limb);
}

static bool cause_known(int64_t cause) { return cause >= 0 && cause < WEND_CAUSES; }

static bool plausible(const wend_march_state *state) {
  for (int k = 0; k < EXPLICIT; k++)
    if (isnan(state->number[k])) return false;
  return cause_known(state->count[PLAIN]) && cause_known(state->count[PLAIN + 1]) &&
         state->count[0] >= 0;
}

static void take(wend_march *m, const wend_march_state *state) {
  double *number[EXPLICIT];
  int64_t *count[PLAIN];
  list_numbers(m, number);
  list_counts(m, count);
  for (int k = 0; k < EXPLICIT; k++) *number[k] = state->number[k];
  for (int k = 0; k < PLAIN; k++) *count[k] = state->count[k];
  m->control.cause = (wend_cause)state->count[PLAIN];
  m->last.cause = (wend_cause)state->count[PLAIN + 1];
  m->last.stages = (int)state->count[PLAIN + 2];
  memcpy(m->control.steps, &state->count[PLAIN + ENUMS], sizeof m->control.steps);
  for (int a = 0; a <= WEND_ACCOUNTS; a++)
    memcpy(a < WEND_ACCOUNTS ? m->ledger.account[a].limb : m->ledger.now.limb,
           &state->limb[a * WEND_SUM_LIMBS], sizeof m->ledger.now.limb);
}

wend_status wend_march_restore(wend_team *team, wend_march *march,
                               const wend_march_state *state, bool *same) {
  wend_status status;
  wend_march *m = march;
  if (!plausible(state))
    wend_fail(team, WEND_ERR_ARGUMENT, "the saved state of the march holds nonsense");
  WEND_TRY(wend_agree(team));
  take(m, state);
  *same = m->transport->explicit_step == state->number[EXPLICIT];
  WEND_TRY(wend_march_rate(team, m, m->energy, m->rate_0));
  m->rate_known = true;
done:
  return status;
}
