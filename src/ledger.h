/* SPDX-License-Identifier: LGPL-3.0-or-later
 * ledger.h: the books: one account for each way CR energy enters, moves or leaves.
 *
 * Accounts are exact sums, so they do not depend on ranks or order. Energy that entered is
 * positive in `injected`, `held`, `host`, `clipped`; energy that left is positive in the
 * accounts of losses. The closure error, initial + entered - left - now, must be round-off. */
#ifndef WEND_SRC_LEDGER_H
#define WEND_SRC_LEDGER_H

#include "sum.h"
#include "team.h"

typedef enum wend_account {
  WEND_ACCOUNT_INITIAL,
  WEND_ACCOUNT_INJECTED,
  WEND_ACCOUNT_HELD,
  WEND_ACCOUNT_STREAMING_HEAT,
  WEND_ACCOUNT_GAMMA_RAYS,
  WEND_ACCOUNT_HADRONIC_HEAT,
  WEND_ACCOUNT_NEUTRINOS,
  WEND_ACCOUNT_COULOMB,
  WEND_ACCOUNT_ADIABATIC,
  WEND_ACCOUNT_EXPANSION,
  WEND_ACCOUNT_ESCAPED,
  WEND_ACCOUNT_HOST,
  WEND_ACCOUNT_CLIPPED,
  WEND_ACCOUNTS, /**< `now` is not an account: it is counted, not booked */
} wend_account;

/** A row of the table of accounts. */
typedef struct wend_account_row {
  const char *name;    /**< column title */
  int sign;            /**< +1: energy in the CRs; -1: energy that left them */
  const char *meaning; /**< one line for people */
} wend_account_row;

extern const wend_account_row wend_account_table[WEND_ACCOUNTS];

typedef struct wend_ledger {
  wend_sum account[WEND_ACCOUNTS];
  wend_sum now;
} wend_ledger;

/** Opens the books on n energies of this rank. Collective. */
void wend_ledger_open(wend_team *team, wend_ledger *ledger, int64_t n, const double *energy);
/** Books n terms of this rank in an account, exactly; the sum over ranks is taken. Collective.
 */
void wend_ledger_book(wend_team *team, wend_ledger *ledger, wend_account account, int64_t n,
                      const double *term);
/** Counts the energy there is now. Collective. */
void wend_ledger_count(wend_team *team, wend_ledger *ledger, int64_t n, const double *energy);
/** Balance of an account, rounded once. Local. */
double wend_ledger_balance(const wend_ledger *ledger, wend_account account);
/** Energy counted last. Local. */
double wend_ledger_now(const wend_ledger *ledger);
/** initial + entered - left - now, exact until the one rounding at the end. Local. */
double wend_ledger_closure(const wend_ledger *ledger);
/** |closure| over the initial energy and all that entered. Local. */
double wend_ledger_relative(const wend_ledger *ledger);

#endif
