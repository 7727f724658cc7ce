/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Spherical collapse: the threshold delta_c(z), the barrier delta_c/D that merger trees use as their clock, and the
 * virial overdensity. */
#include "cosmology/background.h"
#include "cosmology/choices.h"

#include <math.h>

#define EINSTEIN_DE_SITTER_THRESHOLD 1.686470 /* (3/20) (12 pi)^(2/3) */
#define MO_WHITE_POWER               0.0055
#define NAKAMURA_SUTO_SLOPE          0.012299 /* per decade of Omega_m(z) */

const ew_choice ew_threshold_choices[] = {
    [EW_THRESHOLD_CONSTANT] = {"constant", "1.686470, the value without Lambda",
                               "Gunn & Gott 1972, ApJ 176, 1, for spheres of matter alone"},
    [EW_THRESHOLD_MO_WHITE] = {"mo_white", "1.686470 Omega_m(z)^0.0055",
                               "Mo, van den Bosch & White 2010, Galaxy Formation and Evolution"},
    [EW_THRESHOLD_NAKAMURA_SUTO] = {"nakamura_suto", "1.686470 [1 + 0.012299 log10 Omega_m(z)]",
                                    "Nakamura & Suto 1997, Prog. Theor. Phys. 97, 49"},
    {NULL, NULL, NULL},
};

/* delta_c and d ln delta_c/d ln Omega_m(z). */
typedef struct {
  double value;
  double slope;
} threshold;

static threshold threshold_at(int form, double omega_matter) {
  switch (form) {
  case EW_THRESHOLD_MO_WHITE:
    return (threshold){EINSTEIN_DE_SITTER_THRESHOLD * pow(omega_matter, MO_WHITE_POWER), MO_WHITE_POWER};
  case EW_THRESHOLD_NAKAMURA_SUTO: {
    double factor = 1.0 + NAKAMURA_SUTO_SLOPE * log10(omega_matter);
    return (threshold){EINSTEIN_DE_SITTER_THRESHOLD * factor, NAKAMURA_SUTO_SLOPE / log(10.0) / factor};
  }
  default:
    return (threshold){EINSTEIN_DE_SITTER_THRESHOLD, 0.0};
  }
}

ew_status ew_build_barrier(ew_cosmology *cosmology, ew_error *error) {
  ew_curve *barrier = &cosmology->barrier;
  ew_status status = ew_redshift_curve(barrier, error);
  for (int i = 0; status == EW_OK && i <= EW_REDSHIFT_CELLS; i++) {
    double s = exp(ew_curve_position(barrier, i));
    threshold at = threshold_at(cosmology->parameters.collapse_threshold, ew_matter_share(cosmology, s));
    double height = at.value / ew_curve_knot(&cosmology->growth, i);
    double matter_share_slope = 3.0 - ew_expansion_slope(cosmology, s);
    double slope = at.slope * matter_share_slope + ew_curve_knot(&cosmology->growth_rate, i);
    ew_curve_set(barrier, i, height, height * slope);
  }
  if (status == EW_OK)
    status = ew_curve_invert(&cosmology->redshift_of_barrier, barrier, EW_INVERSE_CELLS, error);
  return status;
}

double ew_collapse_threshold(const ew_cosmology *cosmology, double redshift) {
  return threshold_at(cosmology->parameters.collapse_threshold, ew_omega_matter(cosmology, redshift)).value;
}

double ew_barrier(const ew_cosmology *cosmology, double redshift) {
  return ew_curve_at(&cosmology->barrier, log(1.0 + ew_redshift_inside(redshift)));
}

double ew_redshift_of_barrier(const ew_cosmology *cosmology, double barrier) {
  return ew_curve_at(&cosmology->redshift_of_barrier, log(barrier));
}

double ew_virial_overdensity(const ew_cosmology *cosmology, double redshift) {
  double x = ew_omega_matter(cosmology, redshift) - 1.0;
  return 18.0 * EW_PI * EW_PI + 82.0 * x - 39.0 * x * x;
}
