/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Global line-of-sight dispersion from the virial theorem, whatever the anisotropy:
 * <s^2> = (1/3) int nu (G M/r) 4 pi r^2 dr / int nu 4 pi r^2 dr. */
#include "galaxy/state.h"

#include <math.h>

enum { SHELLS = 24 };

/* Mean of G M/r over one component. With r = a tan(t) a Plummer sphere of scale a has the mass sin^3(t) inside r, and
 * the midpoint rule in t converges fast, from the cusp of a dark halo to the outskirts. */
static double mean_square_speed(const ew_galaxy *galaxy, const ew_environment *environment, const ew_component *c) {
  const double width = 0.5 * EW_PI / SHELLS;
  double sum = 0.0;
  for (int i = 0; i < SHELLS; i++) {
    double sine = sin((i + 0.5) * width), cosine = cos((i + 0.5) * width);
    double radius = c->radius / EW_HALF_MASS_RATIO * sine / cosine;
    double share = 3.0 * sine * sine * cosine * width;
    sum += share * EW_GRAVITY * ew_mass_inside(galaxy, environment, radius) / radius;
  }
  return sum;
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
