/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Every move of mass takes from one reservoir what it gives to another, element by element, so that the sum over
 * reservoirs stays 0. EW_OUTSIDE and EW_MADE may go below 0; the others hold real matter. */
#include "elfinwood/galaxy.h"

#include <math.h>

static bool is_real(ew_reservoir reservoir) {
  return reservoir != EW_OUTSIDE && reservoir != EW_MADE;
}

/* At most what `from` has; of a negative amount at most what `to` has. */
static double available(const ew_ledger *ledger, ew_reservoir from, ew_reservoir to, int element, double amount) {
  if (is_real(from) && amount > ledger->in[from].mass[element])
    return ledger->in[from].mass[element];
  if (is_real(to) && amount < -ledger->in[to].mass[element])
    return -ledger->in[to].mass[element];
  return amount;
}

void ew_ledger_move(ew_ledger *ledger, ew_reservoir from, ew_reservoir to, const ew_composition *amount) {
  for (int i = 0; i < EW_ELEMENT_COUNT; i++) {
    double moved = available(ledger, from, to, i, amount->mass[i]);
    ledger->in[from].mass[i] -= moved;
    ledger->in[to].mass[i] += moved;
  }
}

void ew_ledger_move_share(ew_ledger *ledger, ew_reservoir from, ew_reservoir to, double share) {
  if (!(share > 0.0))
    return;
  double part = fmin(share, 1.0);
  for (int i = 0; i < EW_ELEMENT_COUNT; i++) {
    double moved = part * ledger->in[from].mass[i];
    ledger->in[from].mass[i] = part < 1.0 ? ledger->in[from].mass[i] - moved : 0.0;
    ledger->in[to].mass[i] += moved;
  }
}

void ew_ledger_move_mass(ew_ledger *ledger, ew_reservoir from, ew_reservoir to, double mass) {
  double held = ew_ledger_mass(ledger, from);
  if (held > 0.0)
    ew_ledger_move_share(ledger, from, to, mass / held);
}

double ew_ledger_mass(const ew_ledger *ledger, ew_reservoir reservoir) {
  return ew_composition_mass(&ledger->in[reservoir]);
}

void ew_ledger_add(ew_ledger *ledger, const ew_ledger *other) {
  for (int r = 0; r < EW_RESERVOIR_COUNT; r++)
    for (int i = 0; i < EW_ELEMENT_COUNT; i++)
      ledger->in[r].mass[i] += other->in[r].mass[i];
}

double ew_ledger_imbalance(const ew_ledger *ledger) {
  double worst = 0.0;
  for (int i = 0; i < EW_ELEMENT_COUNT; i++) {
    double sum = 0.0, turnover = 0.0;
    for (int r = 0; r < EW_RESERVOIR_COUNT; r++) {
      sum += ledger->in[r].mass[i];
      turnover += fabs(ledger->in[r].mass[i]);
    }
    if (turnover > 0.0)
      worst = fmax(worst, fabs(sum) / turnover);
  }
  return worst;
}
