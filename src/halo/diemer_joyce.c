/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Median concentration of Diemer & Joyce (2019, ApJ 871, 168), in the 200c definition:
 *
 *   c = C_a G^-1( (A/nu) [1 + nu^2/B] ),   G(c) = c / m(c)^((5+n)/6),   m(c) = ln(1+c) - c/(1+c),
 *   A = a0 [1 + a1 (n+3)],  B = b0 [1 + b1 (n+3)],  C_a = 1 - c_a (1 - alpha_eff),
 *
 * with peak height nu = 1.68647/(sigma D), alpha_eff = -dlnD/dln(1+z), and n = -2 dln sigma/dlnR - 3 at kappa times the
 * Lagrangian radius of M200c.
 *
 * For n > -2 G has a minimum, and the branch above it is meant. It is always reached: the right-hand side is at least
 * 2 A B^(-1/2), at nu = B^(1/2), which is more than 1.5 times the minimum of G for every n between -3 and 5. That is
 * also why the relation itself has a floor, c/C_a = 2.1 as n goes to -3 and 3.7 at n = -2. Past nu of about 3 it turns
 * up and goes on rising; beyond 6 or so it is an extrapolation about haloes that do not exist. */
#include "halo/diemer_joyce.h"

#include <math.h>

#define COLLAPSE_THRESHOLD 1.68647 /* as the paper has it, at every redshift and whatever the trees use */

#define KAPPA              0.41
#define A0                 2.45
#define A1                 1.82
#define B0                 3.20
#define B1                 2.30
#define C_A                0.21

/* G rises with c here for every n below 5.8, so that Newton's first step lands above the root and the next come down to
 * it (ln G is convex in ln c). */
#define NEWTON_START 10.0
#define NEWTON_STEP  1e-9
#define NEWTON_LIMIT 100

ew_diemer_joyce_epoch ew_diemer_joyce_at(const ew_spectrum *spectrum, double redshift) {
  const ew_cosmology *cosmology = ew_spectrum_cosmology(spectrum);
  return (ew_diemer_joyce_epoch){
      .spectrum = spectrum,
      .barrier = COLLAPSE_THRESHOLD / ew_growth(cosmology, redshift),
      .growth_factor = 1.0 - C_A * (1.0 - ew_growth_rate(cosmology, redshift)),
  };
}

/* n at kappa R: that radius holds kappa^3 M, and dln sigma/dlnR = 3 dln sigma/dlnM. */
static double effective_slope(const ew_spectrum *spectrum, double mass) {
  return -6.0 * ew_sigma_slope(spectrum, KAPPA * KAPPA * KAPPA * mass) - 3.0;
}

/* c where ln G(c) = `target`, by Newton's method in ln c; NaN or the wrong branch (c that no longer moves towards a
 * root) shows as no convergence. */
static bool invert(double target, double slope, double *c) {
  double power = (5.0 + slope) / 6.0;
  *c = NEWTON_START;
  for (int i = 0; i < NEWTON_LIMIT; i++) {
    double shape = ew_nfw_shape(*c);
    double ratio = *c / (1.0 + *c);
    double step = (log(*c) - power * log(shape) - target) / (1.0 - power * ratio * ratio / shape);
    *c *= exp(-step);
    if (fabs(step) < NEWTON_STEP)
      return true;
  }
  return false;
}

ew_status ew_diemer_joyce_concentration(const ew_diemer_joyce_epoch *epoch, double mass_200c, double *concentration,
                                        ew_error *error) {
  double slope = effective_slope(epoch->spectrum, mass_200c);
  double nu = epoch->barrier / ew_sigma(epoch->spectrum, mass_200c);
  double a = A0 * (1.0 + A1 * (slope + 3.0));
  double b = B0 * (1.0 + B1 * (slope + 3.0));
  double c;
  if (!invert(log(a / nu * (1.0 + nu * nu / b)), slope, &c))
    return ew_fail(error, EW_FAILED, "no concentration for M200c = %g Msun: peak height %g, spectral slope %g",
                   mass_200c, nu, slope);
  *concentration = epoch->growth_factor * c;
  return EW_OK;
}

ew_status ew_concentration_200c(const ew_spectrum *spectrum, double mass_200c, double redshift, double *concentration,
                                ew_error *error) {
  if (!(mass_200c >= EW_LOWEST_MASS && mass_200c <= EW_HIGHEST_MASS))
    return ew_fail(error, EW_REFUSED, "concentration of M200c = %g Msun: outside %g to %g", mass_200c, EW_LOWEST_MASS,
                   EW_HIGHEST_MASS);
  if (!(redshift >= 0.0 && redshift <= EW_HIGHEST_REDSHIFT))
    return ew_fail(error, EW_REFUSED, "concentration at redshift %g: outside 0 to %g", redshift, EW_HIGHEST_REDSHIFT);
  ew_diemer_joyce_epoch epoch = ew_diemer_joyce_at(spectrum, redshift);
  return ew_diemer_joyce_concentration(&epoch, mass_200c, concentration, error);
}
