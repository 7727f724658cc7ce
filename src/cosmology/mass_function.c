/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Numbers of haloes: universal mass functions f(nu), nu = delta_c/(sigma D). */
#include "cosmology/spectrum.h"

#include <math.h>

static double press_schechter(double peak_height) {
  double square = peak_height * peak_height;
  return sqrt(2.0 / EW_PI) * peak_height * exp(-0.5 * square);
}

const ew_mass_function ew_press_schechter = {
    .label = {"press_schechter", "random walks over a constant barrier", "Press & Schechter 1974, ApJ 187, 425"},
    .multiplicity = press_schechter,
};

static double sheth_tormen(double peak_height) {
  const double amplitude = 0.3222, a = 0.707, p = 0.3;
  double square = a * peak_height * peak_height;
  return amplitude * sqrt(2.0 * a / EW_PI) * peak_height * (1.0 + pow(square, -p)) * exp(-0.5 * square);
}

const ew_mass_function ew_sheth_tormen = {
    .label = {"sheth_tormen", "the form for ellipsoidal collapse", "Sheth & Tormen 1999, MNRAS 308, 119, eq. 10"},
    .multiplicity = sheth_tormen,
};

double ew_mass_function_at(const ew_mass_function *function, const ew_spectrum *spectrum, double mass,
                           double redshift) {
  double inside = ew_mass_inside(mass);
  double peak_height = ew_barrier(spectrum->cosmology, redshift) / ew_sigma(spectrum, inside);
  double number = ew_matter_density(spectrum->cosmology) / inside;
  return number * function->multiplicity(peak_height) * -ew_sigma_slope(spectrum, inside);
}
