/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The IMF of normal stars: Kroupa 2001, MNRAS 322, 231, eq. 2, dN/dm = K m^-1.3 below 0.5 Msun and K 0.5 m^-2.3 above,
 * 0.1-100 Msun. K makes the mass formed 1 Msun. */
#include "elfinwood/stars.h"
#include "stars/handle.h"
#include "stars/power_law.h"

#include <math.h>

#define SLOPE_LOW  1.3
#define SLOPE_HIGH 2.3
#define MASS_BREAK 0.5

/* K [1/Msun]: 1 / (integral of m^-0.3 over 0.1-0.5 + 0.5 integral of m^-1.3 over 0.5-100). */
#define NORMALISATION 0.44891141023587283

/* Integral of m^weight dN/dm between two masses. */
static double imf_integral(double weight, double low, double high) {
  double from = fmax(low, EW_IMF_LOW), to = fmin(high, EW_IMF_HIGH);
  if (!(to > from))
    return 0.0;
  double sum = 0.0;
  if (from < MASS_BREAK)
    sum += ew_power_integral(SLOPE_LOW - weight, from, fmin(to, MASS_BREAK));
  if (to > MASS_BREAK)
    sum += MASS_BREAK * ew_power_integral(SLOPE_HIGH - weight, fmax(from, MASS_BREAK), to);
  return NORMALISATION * sum;
}

double ew_imf_number(double low, double high) {
  return imf_integral(0.0, low, high);
}

double ew_imf_mass(double low, double high) {
  return imf_integral(1.0, low, high);
}

double ew_imf_draw(double low, double high, double u) {
  double from = fmin(fmax(low, EW_IMF_LOW), EW_IMF_HIGH), to = fmax(fmin(high, EW_IMF_HIGH), from);
  if (from >= MASS_BREAK)
    return ew_power_draw(SLOPE_HIGH, from, to, u);
  if (to <= MASS_BREAK)
    return ew_power_draw(SLOPE_LOW, from, to, u);
  double below = ew_power_integral(SLOPE_LOW, from, MASS_BREAK);
  double above = MASS_BREAK * ew_power_integral(SLOPE_HIGH, MASS_BREAK, to);
  double reached = u * (below + above);
  if (reached < below)
    return ew_power_draw(SLOPE_LOW, from, MASS_BREAK, reached / below);
  return ew_power_draw(SLOPE_HIGH, MASS_BREAK, to, (reached - below) / above);
}
