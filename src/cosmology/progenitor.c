/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Progenitors by extended Press-Schechter: a walk that crosses the barrier of the descendant at (S2, omega2) first
 * crosses the higher one of an earlier time, omega1, at S1 > S2 (Lacey & Cole 1993, MNRAS 262, 627). */
#include "cosmology/spectrum.h"

#include <math.h>

/* How far the walk has to go from the descendant to the progenitor, with both masses inside the table. */
typedef struct {
  double descendant, progenitor; /* Msun */
  double rise;                   /* omega1 - omega2, not negative */
  double spread;                 /* S1 - S2; 0 where the progenitor is no lighter */
} walk;

static walk walk_to(const ew_spectrum *spectrum, const ew_progenitor_question *question, double mass) {
  const ew_cosmology *cosmology = spectrum->cosmology;
  walk to = {.descendant = ew_mass_inside(question->mass), .progenitor = ew_mass_inside(mass)};
  to.rise = fmax(ew_barrier(cosmology, question->earlier) - ew_barrier(cosmology, question->redshift), 0.0);
  double low = ew_sigma(spectrum, to.progenitor), high = ew_sigma(spectrum, to.descendant);
  to.spread = to.progenitor < to.descendant ? fmax((low - high) * (low + high), 0.0) : 0.0;
  return to;
}

double ew_progenitor_number(const ew_spectrum *spectrum, const ew_progenitor_question *question, double mass) {
  walk to = walk_to(spectrum, question, mass);
  if (!(to.spread > 0.0))
    return 0.0;
  double sigma = ew_sigma(spectrum, to.progenitor), slope = -ew_sigma_slope(spectrum, to.progenitor);
  double gauss = exp(-to.rise * to.rise / (2.0 * to.spread));
  double fraction = sqrt(2.0 / EW_PI) * to.rise * sigma * sigma / pow(to.spread, 1.5) * gauss * slope;
  return to.descendant / to.progenitor * fraction;
}

double ew_progenitor_fraction_above(const ew_spectrum *spectrum, const ew_progenitor_question *question, double mass) {
  walk to = walk_to(spectrum, question, mass);
  return to.spread > 0.0 ? erfc(to.rise / sqrt(2.0 * to.spread)) : 0.0;
}
