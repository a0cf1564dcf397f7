/* SPDX-License-Identifier: LGPL-3.0-or-later
 * ledger.c: the books, in exact sums. */
#include "ledger.h"
#include "total.h"
#include <math.h>

const wend_account_row wend_account_table[WEND_ACCOUNTS] = {
    [WEND_ACCOUNT_INITIAL] = {"initial", 1, "CR energy at the start"},
    [WEND_ACCOUNT_INJECTED] = {"injected", 1, "put in by sources and events"},
    [WEND_ACCOUNT_HELD] = {"held", 1, "put in to hold values at boundaries"},
    [WEND_ACCOUNT_STREAMING_HEAT] = {"streaming_heat", -1, "given to the gas by streaming"},
    [WEND_ACCOUNT_GAMMA_RAYS] = {"gamma_rays", -1, "hadronic losses into gamma rays"},
    [WEND_ACCOUNT_HADRONIC_HEAT] = {"hadronic_heat", -1, "hadronic losses into gas heat"},
    [WEND_ACCOUNT_NEUTRINOS] = {"neutrinos", -1, "hadronic losses into neutrinos"},
    [WEND_ACCOUNT_COULOMB] = {"coulomb", -1, "Coulomb losses into gas heat"},
    [WEND_ACCOUNT_ADIABATIC] = {"adiabatic", -1, "work done on the gas"},
    [WEND_ACCOUNT_EXPANSION] = {"expansion", -1, "lost to cosmic expansion"},
    [WEND_ACCOUNT_ESCAPED] = {"escaped", -1, "left through open boundaries"},
    [WEND_ACCOUNT_HOST] = {"host", 1, "changed by the host code"},
    [WEND_ACCOUNT_CLIPPED] = {"clipped", 1, "added where a value was clipped"},
};

static void negate(wend_sum *sum) {
  for (int k = 0; k < WEND_SUM_LIMBS - 1; k++) sum->limb[k] = -sum->limb[k];
  wend_sum_normalise(sum);
}

void wend_ledger_open(wend_team *team, wend_ledger *ledger, int64_t n, const double *energy) {
  for (int a = 0; a < WEND_ACCOUNTS; a++) wend_sum_reset(&ledger->account[a]);
  wend_ledger_book(team, ledger, WEND_ACCOUNT_INITIAL, n, energy);
  ledger->now = ledger->account[WEND_ACCOUNT_INITIAL];
}

void wend_ledger_book(wend_team *team, wend_ledger *ledger, wend_account account, int64_t n,
                      const double *term) {
  wend_sum sum;
  wend_sum_reset(&sum);
  wend_sum_add(&sum, n, term, 1);
  wend_total(team, 1, &sum);
  wend_sum_merge(&ledger->account[account], &sum);
}

void wend_ledger_count(wend_team *team, wend_ledger *ledger, int64_t n, const double *energy) {
  wend_sum_reset(&ledger->now);
  wend_sum_add(&ledger->now, n, energy, 1);
  wend_total(team, 1, &ledger->now);
}

double wend_ledger_balance(const wend_ledger *ledger, wend_account account) {
  return wend_sum_value(&ledger->account[account]);
}

double wend_ledger_now(const wend_ledger *ledger) { return wend_sum_value(&ledger->now); }

double wend_ledger_closure(const wend_ledger *ledger) {
  wend_sum balance = ledger->now;
  negate(&balance);
  for (int a = 0; a < WEND_ACCOUNTS; a++) {
    wend_sum term = ledger->account[a];
    if (wend_account_table[a].sign < 0) negate(&term);
    wend_sum_merge(&balance, &term);
  }
  return wend_sum_value(&balance);
}

double wend_ledger_relative(const wend_ledger *ledger) {
  double passed = 0;
  for (int a = 0; a < WEND_ACCOUNTS; a++)
    if (wend_account_table[a].sign > 0)
      passed += fabs(wend_ledger_balance(ledger, (wend_account)a));
  const double closure = fabs(wend_ledger_closure(ledger));
  return passed > 0 ? closure / passed : closure;
}
