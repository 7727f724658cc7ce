/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Virial relations: a halo of mass M is a sphere whose mean density is the virial overdensity of Bryan & Norman (1998)
 * times the critical density at its redshift. Radius, circular velocity, temperature and the two time scales follow
 * from that density and G alone. */
#include "elfinwood/halo.h"

#include <math.h>

/* m_p / 2k [K/(km/s)^2]: CODATA 2018 proton mass 1.67262192369e-27 kg, Boltzmann constant 1.380649e-23 J/K (exact). */
#define TEMPERATURE_PER_SQUARED_VELOCITY (1e6 * 1.67262192369e-27 / (2.0 * 1.380649e-23))

/* Mean density inside the virial radius, proper Msun/kpc^3. */
static double virial_density(const ew_cosmology *cosmology, double redshift) {
  return ew_virial_overdensity(cosmology, redshift) * ew_critical_density(cosmology, redshift);
}

double ew_virial_radius(const ew_cosmology *cosmology, double mass, double redshift) {
  return cbrt(3.0 * mass / (4.0 * EW_PI * virial_density(cosmology, redshift)));
}

double ew_virial_velocity(const ew_cosmology *cosmology, double mass, double redshift) {
  return sqrt(EW_GRAVITY * mass / ew_virial_radius(cosmology, mass, redshift));
}

double ew_virial_temperature(double virial_velocity, double mean_molecular_weight) {
  return TEMPERATURE_PER_SQUARED_VELOCITY * mean_molecular_weight * virial_velocity * virial_velocity;
}

/* V^2 = G M / r with M = (4 pi / 3) rho r^3 gives M = (V^2/G)^(3/2) (4 pi rho / 3)^(-1/2). */
double ew_mass_of_temperature(const ew_cosmology *cosmology, double temperature, double mean_molecular_weight,
                              double redshift) {
  double squared_velocity = temperature / (TEMPERATURE_PER_SQUARED_VELOCITY * mean_molecular_weight);
  double mass_per_length = squared_velocity / EW_GRAVITY;
  return mass_per_length * sqrt(mass_per_length / (4.0 * EW_PI / 3.0 * virial_density(cosmology, redshift)));
}

double ew_free_fall_time(const ew_cosmology *cosmology, double redshift) {
  return sqrt(3.0 * EW_PI / (32.0 * EW_GRAVITY * virial_density(cosmology, redshift))) / EW_KMS_IN_KPC_GYR;
}

double ew_halo_crossing_time(const ew_cosmology *cosmology, double redshift) {
  return sqrt(3.0 / (4.0 * EW_PI * EW_GRAVITY * virial_density(cosmology, redshift))) / EW_KMS_IN_KPC_GYR;
}
