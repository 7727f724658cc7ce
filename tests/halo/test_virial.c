/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Virial relations against the published scalings, against each other and against their definition. */
#include "elfinwood/halo.h"
#include "planck18.h"

#include <math.h>
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>

#include <cmocka.h>

/* The scalings carry three digits. */
#define SCALING_TOLERANCE 0.01
#define ROUNDING          1e-13

static const double masses[] = {3.7e5, 2.385e8, 6.1e10, 1.19e12, 4.4e14};
static const double redshifts[] = {0.0, 0.7, 2.385, 9.0, 27.0};
enum { MASSES = sizeof masses / sizeof masses[0], REDSHIFTS = sizeof redshifts / sizeof redshifts[0] };

static int make_cosmology(void **state) {
  ew_core_start();
  ew_cosmology *cosmology;
  if (ew_cosmology_new(&cosmology, &planck18, NULL) != EW_OK)
    return -1;
  *state = cosmology;
  return 0;
}

static int free_cosmology(void **state) {
  ew_cosmology_free(*state);
  return 0;
}

static void assert_close(double value, double expected, double tolerance) {
  if (!(fabs(value / expected - 1.0) <= tolerance))
    fail_msg("%.17g is not %.17g to %g", value, expected, tolerance);
}

/* Barkana & Loeb 2001, Phys. Rep. 349, 125, eqs. 24-26 (numbers from memory). */
static void scalings(void **state) {
  const ew_cosmology *cosmology = *state;
  for (int i = 0; i < MASSES; i++)
    for (int k = 0; k < REDSHIFTS; k++) {
      double z = redshifts[k];
      double x = ew_omega_matter(cosmology, z) - 1.0;
      double overdensity = 18.0 * EW_PI * EW_PI + 82.0 * x - 39.0 * x * x;
      double f = planck18.omega_matter / (1.0 + x) * overdensity / (18.0 * EW_PI * EW_PI);
      double m = masses[i] * planck18.hubble / 1e8;
      double a = (1.0 + z) / 10.0;
      double radius = 0.784 * cbrt(m / f) / a / planck18.hubble;
      double velocity = 23.4 * cbrt(m) * pow(f, 1.0 / 6.0) * sqrt(a);
      double temperature = 1.98e4 * (0.59 / 0.6) * cbrt(m * m * f) * a;
      assert_close(ew_virial_radius(cosmology, masses[i], z), radius, SCALING_TOLERANCE);
      assert_close(ew_virial_velocity(cosmology, masses[i], z), velocity, SCALING_TOLERANCE);
      assert_close(ew_virial_temperature(ew_virial_velocity(cosmology, masses[i], z), 0.59), temperature,
                   SCALING_TOLERANCE);
    }
}

/* By hand: 103.22373 (Bryan & Norman 1998 at Omega_m = 0.3153) times 2.775366272e11 h^2 Msun/Mpc^3 is
 * 1.299882e4 Msun/kpc^3; r = (3e12/(4 pi 1.299882e4))^(1/3) = 263.8371 kpc, V = (4.300917e-6 1e12/263.8371)^(1/2). */
static void milky_way_by_hand(void **state) {
  const double hand_tolerance = 1e-5; /* digits carried by hand */
  assert_close(ew_virial_radius(*state, 1e12, 0.0), 263.8371, hand_tolerance);
  assert_close(ew_virial_velocity(*state, 1e12, 0.0), 127.6770, hand_tolerance);
}

/* The atomic cooling threshold, 1e4 K at mu = 0.6, is a velocity of 16.6 km/s: 16.588^2 * 0.6 * 60.574 K = 1e4 K. */
static void atomic_cooling_velocity(void **state) {
  (void)state;
  assert_close(ew_virial_temperature(16.588, 0.6), 1e4, 1e-4);
}

static void mean_density_is_overdensity_times_critical(void **state) {
  const ew_cosmology *cosmology = *state;
  for (int i = 0; i < MASSES; i++)
    for (int k = 0; k < REDSHIFTS; k++) {
      double r = ew_virial_radius(cosmology, masses[i], redshifts[k]);
      double density = ew_virial_overdensity(cosmology, redshifts[k]) * ew_critical_density(cosmology, redshifts[k]);
      assert_close(masses[i] / (4.0 / 3.0 * EW_PI * r * r * r), density, ROUNDING);
      double v = ew_virial_velocity(cosmology, masses[i], redshifts[k]);
      assert_close(v * v, EW_GRAVITY * masses[i] / r, ROUNDING);
    }
}

static void temperature_has_an_inverse(void **state) {
  const ew_cosmology *cosmology = *state;
  for (int i = 0; i < MASSES; i++)
    for (int k = 0; k < REDSHIFTS; k++) {
      double temperature = ew_virial_temperature(ew_virial_velocity(cosmology, masses[i], redshifts[k]), 1.22);
      assert_close(ew_mass_of_temperature(cosmology, temperature, 1.22, redshifts[k]), masses[i], ROUNDING);
    }
}

/* Crossing time r/V in Gyr; free fall takes pi / 2^(3/2) of it. */
static void time_scales(void **state) {
  const ew_cosmology *cosmology = *state;
  for (int k = 0; k < REDSHIFTS; k++) {
    double crossing = ew_halo_crossing_time(cosmology, redshifts[k]);
    double in_gyr = ew_virial_radius(cosmology, 2.385e9, redshifts[k]) /
                    ew_virial_velocity(cosmology, 2.385e9, redshifts[k]) / EW_KMS_IN_KPC_GYR;
    assert_close(crossing, in_gyr, ROUNDING);
    assert_close(ew_free_fall_time(cosmology, redshifts[k]), crossing * EW_PI / sqrt(8.0), ROUNDING);
  }
  /* r/V = (2/Delta)^(1/2)/H, and 1/H = 9.777922/0.6736 Gyr today. */
  assert_close(ew_halo_crossing_time(cosmology, 0.0), sqrt(2.0 / 103.2237297) * 9.777922 / 0.6736, 1e-6);
}

static void earlier_haloes_are_smaller_and_hotter(void **state) {
  const ew_cosmology *cosmology = *state;
  for (double z = 0.0; z < 30.0; z += 0.5) {
    assert_true(ew_virial_radius(cosmology, 1e9, z + 0.5) < ew_virial_radius(cosmology, 1e9, z));
    assert_true(ew_virial_velocity(cosmology, 1e9, z + 0.5) > ew_virial_velocity(cosmology, 1e9, z));
    assert_true(ew_mass_of_temperature(cosmology, 1e4, 0.59, z + 0.5) <
                ew_mass_of_temperature(cosmology, 1e4, 0.59, z));
  }
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(scalings),
      cmocka_unit_test(milky_way_by_hand),
      cmocka_unit_test(atomic_cooling_velocity),
      cmocka_unit_test(mean_density_is_overdensity_times_critical),
      cmocka_unit_test(temperature_has_an_inverse),
      cmocka_unit_test(time_scales),
      cmocka_unit_test(earlier_haloes_are_smaller_and_hotter),
  };
  return cmocka_run_group_tests(tests, make_cosmology, free_cosmology);
}
