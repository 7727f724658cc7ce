/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The expanding background of flat LambdaCDM: construction of ew_cosmology and what follows from E(z) alone. */
#include "cosmology/background.h"

#include <math.h>
#include <stdlib.h>

#define STEFAN_BOLTZMANN 5.670374419e-8              /* W/m^2/K^4, CODATA 2018 */
#define METRES_IN_MPC    3.0856775814913673e22       /* IAU 2015 B2 */
#define SPEED_OF_LIGHT   (EW_LIGHT_SPEED * 1e3)      /* m/s */
#define SOLAR_MASS       (EW_SOLAR_MASS_IN_G * 1e-3) /* kg */
#define NEUTRINO_SHARE   0.22710731766023898         /* (7/8) (4/11)^(4/3): one neutrino species over the photons */
#define CUBIC_KPC_IN_MPC 1e-9

/* Photons and massless neutrinos today over the critical density. */
static double radiation_share(const ew_cosmology_parameters *parameters) {
  double h = parameters->hubble, temperature = parameters->cmb_temperature;
  double cubic_metres = METRES_IN_MPC * METRES_IN_MPC * METRES_IN_MPC;
  double critical = EW_CRITICAL_DENSITY * h * h * SOLAR_MASS / cubic_metres;
  double photons = 4.0 * STEFAN_BOLTZMANN * pow(temperature, 4) / pow(SPEED_OF_LIGHT, 3);
  return photons * (1.0 + NEUTRINO_SHARE * parameters->neutrino_number) / critical;
}

static ew_status check(const ew_cosmology *cosmology, ew_error *error) {
  const ew_cosmology_parameters *p = &cosmology->parameters;
  ew_status status = ew_rows_check(ew_cosmology_rows, p, error);
  if (status != EW_OK)
    return status;
  if (p->omega_baryon > p->omega_matter)
    return ew_fail(error, EW_REFUSED, "cosmology.omega_baryon = %g exceeds cosmology.omega_matter = %g",
                   p->omega_baryon, p->omega_matter);
  if (cosmology->omega_lambda < 0.0)
    return ew_fail(error, EW_REFUSED,
                   "cosmology.omega_matter = %g exceeds %.9g, what the radiation leaves of a flat universe",
                   p->omega_matter, 1.0 - cosmology->omega_radiation);
  return EW_OK;
}

static ew_status build(ew_cosmology *cosmology, ew_error *error) {
  typedef ew_status builder(ew_cosmology *, ew_error *);
  static builder *const steps[] = {ew_build_age, ew_build_distance, ew_build_growth, ew_build_barrier};
  ew_status status = EW_OK;
  for (size_t i = 0; status == EW_OK && i < sizeof steps / sizeof *steps; i++)
    status = steps[i](cosmology, error);
  return status;
}

ew_status ew_cosmology_new(ew_cosmology **cosmology, const ew_cosmology_parameters *parameters, ew_error *error) {
  *cosmology = NULL;
  ew_cosmology *made = calloc(1, sizeof *made);
  if (!made)
    return ew_fail_memory(error, "the cosmology");
  made->parameters = *parameters;
  made->omega_radiation = parameters->radiation ? radiation_share(parameters) : 0.0;
  made->omega_lambda = 1.0 - parameters->omega_matter - made->omega_radiation;
  ew_status status = check(made, error);
  if (status == EW_OK)
    status = build(made, error);
  if (status == EW_OK)
    *cosmology = made;
  else
    ew_cosmology_free(made);
  return status;
}

void ew_cosmology_free(ew_cosmology *cosmology) {
  if (!cosmology)
    return;
  ew_curve_clear(&cosmology->age);
  ew_curve_clear(&cosmology->redshift_at);
  ew_curve_clear(&cosmology->distance);
  ew_curve_clear(&cosmology->growth);
  ew_curve_clear(&cosmology->growth_rate);
  ew_curve_clear(&cosmology->barrier);
  ew_curve_clear(&cosmology->redshift_of_barrier);
  free(cosmology);
}

const ew_cosmology_parameters *ew_cosmology_get(const ew_cosmology *cosmology) {
  return &cosmology->parameters;
}

double ew_hubble_rate(const ew_cosmology *cosmology, double redshift) {
  double s = 1.0 + ew_redshift_inside(redshift);
  return 100.0 * cosmology->parameters.hubble * sqrt(ew_expansion_squared(cosmology, s));
}

double ew_omega_matter(const ew_cosmology *cosmology, double redshift) {
  return ew_matter_share(cosmology, 1.0 + ew_redshift_inside(redshift));
}

static double critical_density_today(const ew_cosmology *cosmology) {
  return EW_CRITICAL_DENSITY * cosmology->parameters.hubble * cosmology->parameters.hubble;
}

double ew_matter_density(const ew_cosmology *cosmology) {
  return critical_density_today(cosmology) * cosmology->parameters.omega_matter;
}

double ew_critical_density(const ew_cosmology *cosmology, double redshift) {
  double s = 1.0 + ew_redshift_inside(redshift);
  return critical_density_today(cosmology) * CUBIC_KPC_IN_MPC * ew_expansion_squared(cosmology, s);
}

double ew_baryon_fraction(const ew_cosmology *cosmology) {
  return cosmology->parameters.omega_baryon / cosmology->parameters.omega_matter;
}
