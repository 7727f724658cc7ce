/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Global dispersion by the virial theorem: a Plummer sphere alone, stars in a dark halo against an independent
 * integral, and the estimator of Wolf et al. 2010. */
#include "galaxy/stage.h"

#include <gsl/gsl_integration.h>

/* Stars of that 3D half-mass radius [kpc] that all shine alike. */
static ew_galaxy *shining_stars(stage *s, uint64_t key, double mass, double radius) {
  ew_galaxy *galaxy = stage_galaxy_of(s, key);
  put_stars(s, galaxy, mass, 1e-3);
  galaxy->born_here->radius = radius;
  galaxy->born_here->light = mass;
  return galaxy;
}

/* <s^2> = pi G M/(32 a) with the scale a = 0.5/1.30477 kpc: 3.3195 km/s for 1e7 Msun. */
static void plummer_sphere_alone(void **state) {
  stage *s = stage_fresh(state);
  s->environment.halo = (ew_nfw){.mass = 1e-9, .radius = 20.0, .concentration = 10.0};
  ew_galaxy *galaxy = shining_stars(s, 1, 1e7, 0.5);
  double scale = 0.5 / 1.30477;
  double expected = sqrt(EW_PI * 4.300917270e-6 * 1e7 / (32.0 * scale));
  assert_close(expected, 3.3195, 1e-4);
  assert_close(ew_velocity_dispersion(galaxy, &s->environment), expected, 1e-4);
}

typedef struct {
  const ew_nfw *halo;
  double scale; /* of the Plummer sphere of stars */
} tracer;

/* G M(r)/r times the density of stars times 4 pi r^2, over ln r. */
static double weighted_square_speed(double log_radius, void *context) {
  const tracer *t = context;
  double r = exp(log_radius), x = r / t->scale;
  double density = 3.0 / (4.0 * EW_PI * t->scale * t->scale * t->scale) * pow(1.0 + x * x, -2.5);
  return EW_GRAVITY * ew_nfw_mass(t->halo, r) / r * 4.0 * EW_PI * r * r * r * density;
}

static double dispersion_by_quadrature(const tracer *t) {
  gsl_integration_workspace *workspace = gsl_integration_workspace_alloc(500);
  gsl_function function = {weighted_square_speed, (void *)(uintptr_t)t};
  double value = (double)NAN, uncertainty;
  gsl_integration_qag(&function, log(1e-6 * t->scale), log(1e6 * t->scale), 0.0, 1e-9, 500, GSL_INTEG_GAUSS31,
                      workspace, &value, &uncertainty);
  gsl_integration_workspace_free(workspace);
  return sqrt(value / 3.0);
}

#define SHELL_ERROR 5e-3 /* of 24 shells, at its worst where the cusp ends in the outskirts of the stars */

/* From deep in the cusp to several scale radii of 1.73 kpc. */
static void stars_in_a_dark_halo(void **state) {
  stage *s = stage_fresh(state);
  s->environment.halo = (ew_nfw){.mass = 1e9, .radius = 26.0, .concentration = 15.0};
  for (double half = 0.003; half < 10.0; half *= 1.5) {
    ew_galaxy *galaxy = shining_stars(s, 1, 1e-6, half);
    tracer t = {&s->environment.halo, half / 1.30477};
    assert_close(ew_velocity_dispersion(galaxy, &s->environment), dispersion_by_quadrature(&t), SHELL_ERROR);
  }
}

/* Wolf et al. 2010, MNRAS 406, 1220, eq. 1: s^2 = G M(r_half)/(3 r_half), good to ten per cent or so where the
 * dispersion is about constant with radius (from memory): for stars with half-mass radii about the peak of the rotation
 * curve, 2.16 r_s. Deeper in the cusp dispersion rises outwards, and the global one is above. */
static void wolf_estimator_agrees_where_it_applies(void **state) {
  stage *s = stage_fresh(state);
  const ew_nfw halo = {.mass = 1e9, .radius = 26.0, .concentration = 15.0};
  s->environment.halo = halo;
  for (double half = 1.5; half < 8.0; half *= 1.3) {
    double wolf = sqrt(EW_GRAVITY * ew_nfw_mass(&halo, half) / (3.0 * half));
    assert_close(ew_velocity_dispersion(shining_stars(s, 1, 1e-6, half), &s->environment), wolf, 0.1);
  }
  double deep = sqrt(EW_GRAVITY * ew_nfw_mass(&halo, 0.02) / 0.06);
  double ratio = ew_velocity_dispersion(shining_stars(s, 1, 1e-6, 0.02), &s->environment) / deep;
  assert_close(ratio, sqrt(2.0 / 1.30477), 0.05); /* <r> = 2 a in a cusp, where M goes as r^2 */
}

/* Two components: the mean square by light. */
static void components_count_by_their_light(void **state) {
  stage *s = stage_fresh(state);
  s->settings.model.sizes.merger_growth = false;
  s->environment.halo = (ew_nfw){.mass = 1e9, .radius = 26.0, .concentration = 15.0};
  double one = ew_velocity_dispersion(shining_stars(s, 1, 1e-6, 0.1), &s->environment);
  double two = ew_velocity_dispersion(shining_stars(s, 1, 1e-6, 2.0), &s->environment);
  ew_galaxy *host = shining_stars(s, 1, 1e-6, 0.1), *satellite = shining_stars(s, 2, 1e-6, 2.0);
  ew_merger merger = {s->environment.halo, s->environment.halo, 0.0, 0.01};
  ew_error error = {0};
  assert_fine(ew_galaxy_merge(host, satellite, &merger, &s->environment, &error), &error);
  host->component->light = 3.0;
  host->component->next->light = 1.0;
  double expected = sqrt((3.0 * one * one + two * two) / 4.0);
  assert_close(ew_velocity_dispersion(host, &s->environment), expected, 1e-6);
  host->component->next->light = 0.0;
  assert_close(ew_velocity_dispersion(host, &s->environment), one, 1e-6);
}

/* Gas adds its mass: as much as the stars', in the same place, doubles <s^2>. */
static void gas_adds_to_the_mass(void **state) {
  stage *s = stage_fresh(state);
  s->environment.halo = (ew_nfw){.mass = 1e-9, .radius = 20.0, .concentration = 10.0};
  ew_galaxy *galaxy = stage_galaxy(s);
  double radius = ew_disc_half_mass_radius(galaxy, &s->environment);
  galaxy = shining_stars(s, 1, 1e7, radius);
  double alone = ew_velocity_dispersion(galaxy, &s->environment);
  put_gas(s, galaxy, EW_HEATED_GAS, 1e7, 0.0);
  assert_close(ew_velocity_dispersion(galaxy, &s->environment), alone * sqrt(2.0), 1e-6);
}

static void no_light_no_dispersion(void **state) {
  stage *s = stage_fresh(state);
  assert_true(isnan(ew_velocity_dispersion(stage_galaxy(s), &s->environment)));
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(plummer_sphere_alone),
      cmocka_unit_test(stars_in_a_dark_halo),
      cmocka_unit_test(wolf_estimator_agrees_where_it_applies),
      cmocka_unit_test(components_count_by_their_light),
      cmocka_unit_test(gas_adds_to_the_mass),
      cmocka_unit_test(no_light_no_dispersion),
  };
  return cmocka_run_group_tests(tests, open_stage, close_stage);
}
