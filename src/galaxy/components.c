/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Stars lie in Plummer spheres, one per progenitor: how much of them is inside a radius, and the radius that holds
 * half. */
#include "galaxy/state.h"

#include <math.h>

#define CACHE_TOLERANCE 0.01 /* stars formed since, over all, before the half-mass radius is solved for again */
enum { BISECTIONS = 60, MOST_COMPONENTS = 24 };

double ew_plummer_share(double radius, double half_mass_radius) {
  double scale = half_mass_radius / EW_HALF_MASS_RATIO, x = radius / scale;
  double base = x * x / (1.0 + x * x);
  return base * sqrt(base);
}

/* The same in projection. */
static double projected_share(double radius, double half_mass_radius) {
  double scale = half_mass_radius / EW_HALF_MASS_RATIO, x = radius / scale;
  return x * x / (1.0 + x * x);
}

static double component_mass(const ew_component *component) {
  return component->mass;
}

static double component_light(const ew_component *component) {
  return component->light;
}

typedef struct {
  double (*weight)(const ew_component *);
  double (*share)(double radius, double half_mass_radius);
} measure;

/* Radius that holds half of the weight; 0 without any. */
static double half_radius(const ew_galaxy *galaxy, const measure *m) {
  double total = 0.0, low = INFINITY, high = 0.0;
  int count = 0;
  for (const ew_component *c = galaxy->component; c; c = c->next) {
    if (!(m->weight(c) > 0.0))
      continue;
    total += m->weight(c);
    low = fmin(low, c->radius);
    high = fmax(high, c->radius);
    count++;
  }
  if (count == 0)
    return 0.0;
  low *= 0.5;
  for (int i = 0; i < BISECTIONS && high - low > 1e-10 * high; i++) {
    double middle = 0.5 * (low + high), inside = 0.0;
    for (const ew_component *c = galaxy->component; c; c = c->next)
      inside += m->weight(c) > 0.0 ? m->weight(c) * m->share(middle, c->radius) : 0.0;
    if (inside < 0.5 * total)
      low = middle;
    else
      high = middle;
  }
  return high;
}

double ew_half_mass_radius(ew_galaxy *galaxy) {
  const ew_component *only = galaxy->component;
  if (only && !only->next)
    return only->mass > 0.0 ? only->radius : 0.0;
  if (!(fabs(galaxy->formed - galaxy->half_mass_at) <= CACHE_TOLERANCE * galaxy->formed)) {
    galaxy->half_mass_radius = half_radius(galaxy, &(measure){component_mass, ew_plummer_share});
    galaxy->half_mass_at = galaxy->formed;
  }
  return galaxy->half_mass_radius;
}

double ew_projected_half_light_radius(const ew_galaxy *galaxy) {
  return half_radius(galaxy, &(measure){component_light, projected_share});
}

void ew_scale_components(ew_galaxy *galaxy, double factor) {
  for (ew_component *c = galaxy->component; c; c = c->next)
    c->radius *= factor;
  galaxy->half_mass_radius *= factor;
}

ew_component *ew_component_root(ew_component *component) {
  while (component->joined)
    component = component->joined;
  return component;
}

static ew_component *lightest(const ew_galaxy *galaxy) {
  ew_component *found = NULL;
  for (ew_component *c = galaxy->component; c; c = c->next)
    if (c != galaxy->born_here && (!found || c->mass < found->mass))
      found = c;
  return found;
}

/* The component nearest in radius to `one`. */
static ew_component *nearest(const ew_galaxy *galaxy, const ew_component *one) {
  ew_component *found = NULL;
  double distance = INFINITY;
  for (ew_component *c = galaxy->component; c; c = c->next) {
    double apart = fabs(log(c->radius / one->radius));
    if (c != one && c->mass > 0.0 && apart < distance) {
      found = c;
      distance = apart;
    }
  }
  return found;
}

static void unlink_component(ew_galaxy *galaxy, ew_component *gone) {
  ew_component **link = &galaxy->component;
  while (*link != gone)
    link = &(*link)->next;
  *link = gone->next;
  gone->next = NULL;
}

void ew_limit_components(ew_galaxy *galaxy) {
  int count = 0;
  for (const ew_component *c = galaxy->component; c; c = c->next)
    count++;
  for (; count > MOST_COMPONENTS; count--) {
    ew_component *small = lightest(galaxy), *near = nearest(galaxy, small);
    unlink_component(galaxy, small);
    double mass = near->mass + small->mass;
    near->radius = exp((near->mass * log(near->radius) + small->mass * log(small->radius)) / mass);
    near->mass = mass;
    small->joined = near;
  }
}

double ew_mass_inside(const ew_galaxy *galaxy, const ew_environment *environment, double radius) {
  double inside = ew_nfw_mass(&environment->halo, radius);
  double stars = ew_stellar_mass(galaxy);
  if (galaxy->formed > 0.0)
    for (const ew_component *c = galaxy->component; c; c = c->next)
      if (c->mass > 0.0)
        inside += stars * c->mass / galaxy->formed * ew_plummer_share(radius, c->radius);
  double gas = ew_gas_in_galaxy(galaxy);
  if (gas > 0.0)
    inside += gas * ew_plummer_share(radius, ew_disc_half_mass_radius(galaxy, environment));
  return inside;
}
