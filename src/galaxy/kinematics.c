/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Global line-of-sight dispersion from the virial theorem, whatever the anisotropy:
 * <s^2> = (1/3) int nu (G M/r) 4 pi r^2 dr / int nu 4 pi r^2 dr. */
#include "galaxy/state.h"

#include <math.h>

enum { SHELLS = 24 };

/* Radius of a Plummer sphere that holds that share of its mass. */
static double radius_of_share(double half_mass_radius, double share) {
  double x = cbrt(share);
  return half_mass_radius / EW_HALF_MASS_RATIO * x / sqrt(1.0 - x * x);
}

/* Mean of G M/r over shells of equal mass of one component. */
static double mean_square_speed(const ew_galaxy *galaxy, const ew_environment *environment, const ew_component *c) {
  double sum = 0.0;
  for (int i = 0; i < SHELLS; i++) {
    double radius = radius_of_share(c->radius, (i + 0.5) / SHELLS);
    sum += EW_GRAVITY * ew_mass_inside(galaxy, environment, radius) / radius;
  }
  return sum / SHELLS;
}

double ew_velocity_dispersion(const ew_galaxy *galaxy, const ew_environment *environment) {
  double light = 0.0, sum = 0.0;
  for (const ew_component *c = galaxy->component; c; c = c->next) {
    if (!(c->light > 0.0))
      continue;
    light += c->light;
    sum += c->light * mean_square_speed(galaxy, environment, c);
  }
  return light > 0.0 ? sqrt(sum / (3.0 * light)) : NAN;
}
