/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Stars respond to gas that comes and goes, inside a dark halo that stays. Slow changes keep r M(<r); fast ones keep
 * the energy of a star on a circular orbit at the moment of loss. For gas well inside the stars and without dark matter
 * these are the textbook limits 1/e and e/(2e - 1) for a share e that is left (Hills 1980, ApJ 235, 986). Gas counts
 * with its own profile, so that what leaves slowly and comes back slowly leaves no trace; of the stars themselves half
 * is always inside. */
#include "galaxy/state.h"

#include <math.h>

#define SMALLEST_CHANGE  0.02 /* of the mass inside: smaller changes wait until they have added up */
#define STRIDE           1.3
#define RADIUS_PRECISION 1e-7
enum { MOST_STEPS = 60, WIDEST_STRIDES = 12 }; /* stars that would go further than 23 times out are laid down there */

typedef struct {
  double stars; /* inside the half-mass radius, Msun */
  double gas;   /* all, Msun */
  double scale; /* half-mass radius of the gas, kpc */
} baryons;

typedef struct {
  const ew_nfw *halo;
  double radius; /* before, kpc */
  baryons before, after;
} change;

static double mass_inside(const change *c, const baryons *b, double radius) {
  return ew_nfw_mass(c->halo, radius) + b->stars + b->gas * ew_plummer_share(radius, b->scale);
}

static double slow_balance(const change *c, double radius) {
  return radius * mass_inside(c, &c->after, radius) - c->radius * mass_inside(c, &c->before, c->radius);
}

static double potential(const change *c, double radius) {
  double gas = c->after.gas / hypot(radius, c->after.scale / EW_HALF_MASS_RATIO);
  return ew_nfw_potential(c->halo, radius) - EW_GRAVITY * (c->after.stars / radius + gas);
}

static double fast_balance(const change *c, double radius) {
  double kinetic = 0.5 * EW_GRAVITY * mass_inside(c, &c->before, c->radius) / c->radius;
  double settled = 0.5 * EW_GRAVITY * mass_inside(c, &c->after, radius) / radius;
  return settled + potential(c, radius) - kinetic - potential(c, c->radius);
}

typedef double (*balance_function)(const change *, double);

/* A radius on the other side of the balance, in strides away from the radius before; the widest if there is none. */
static double across(const change *c, balance_function balance, bool outward, double *value) {
  double radius = c->radius;
  for (int i = 0; i < WIDEST_STRIDES; i++) {
    radius = outward ? radius * STRIDE : radius / STRIDE;
    *value = balance(c, radius);
    if (outward == (*value > 0.0))
      break;
  }
  return radius;
}

/* The radius at which `balance`, which rises with radius, is 0: false position with the Illinois rule, which halves the
 * value at an end that stays. */
static double settle(const change *c, balance_function balance) {
  double near = c->radius, near_value = balance(c, near), far_value;
  if (near_value == 0.0)
    return near;
  double far = across(c, balance, near_value < 0.0, &far_value);
  if ((near_value < 0.0) == (far_value < 0.0))
    return far;
  for (int i = 0; i < MOST_STEPS && fabs(far - near) > RADIUS_PRECISION * far; i++) {
    double next = far - far_value * (far - near) / (far_value - near_value), value = balance(c, next);
    if ((value < 0.0) == (far_value < 0.0)) {
      near_value *= 0.5;
    } else {
      near = far;
      near_value = far_value;
    }
    far = next;
    far_value = value;
    if (value == 0.0)
      break;
  }
  return far;
}

static void respond(ew_step *step, balance_function balance) {
  ew_galaxy *galaxy = step->galaxy;
  const ew_environment *e = step->environment;
  if (!e->model->sizes.gas_response || !(galaxy->formed > 0.0))
    return;
  double stars = ew_stellar_mass(galaxy), gas = ew_gas_in_galaxy(galaxy);
  double radius = ew_half_mass_radius(galaxy), scale = ew_disc_half_mass_radius(galaxy, e);
  change c = {.halo = &e->halo, .radius = radius};
  c.before = (baryons){0.5 * galaxy->response_stars, galaxy->response_gas, galaxy->response_scale};
  c.after = (baryons){0.5 * stars, gas, scale};
  double before = mass_inside(&c, &c.before, radius), after = mass_inside(&c, &c.after, radius);
  if (fabs(after - before) < SMALLEST_CHANGE * before)
    return;
  ew_scale_components(galaxy, settle(&c, balance) / radius);
  galaxy->response_stars = stars;
  galaxy->response_gas = gas;
  galaxy->response_scale = scale;
}

void ew_respond_slowly(ew_step *step) {
  respond(step, slow_balance);
}

void ew_respond_fast(ew_step *step) {
  respond(step, fast_balance);
}
