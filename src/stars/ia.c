/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Type Ia supernovae: how many by which age of the stars (a power law of the delay, Maoz & Graur 2017, ApJ 848, 25),
 * and what one ejects. */
#include "stars/ia.h"

#include "stars/deaths.h"
#include "stars/handle.h"
#include "stars/power_law.h"

#include <math.h>

#define HUBBLE_TIME 13.7 /* Gyr, over which ia_per_mass counts */

static const struct {
  double listed[EW_LISTED_METALS], metals;
} models[EW_IA_MODELS] = {
#include "stars/tables/ia.inc"
};

void ew_ia_fill(ew_ia *ia, const ew_stars_parameters *parameters) {
  double integral = ew_power_integral(parameters->ia_slope, parameters->ia_delay, HUBBLE_TIME);
  ia->normalisation = parameters->ia_per_mass / integral;
  ia->ejecta = ew_tabulated_metals(models[parameters->ia_model].listed, models[parameters->ia_model].metals);
}

double ew_ia_number(const ew_stars *stars, double age_from, double age_to) {
  double from = fmax(age_from, stars->parameters.ia_delay);
  if (!(age_to > from))
    return 0.0;
  return stars->ia.normalisation * ew_power_integral(stars->parameters.ia_slope, from, age_to);
}

const ew_composition *ew_ia_ejecta(const ew_stars *stars) {
  return &stars->ia.ejecta;
}
