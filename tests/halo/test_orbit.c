/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Infall orbits against the density they are drawn from, and friction times against the published comparison. */
#include "elfinwood/halo.h"

#include <gsl/gsl_integration.h>
#include <math.h>
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>

#include <cmocka.h>

#define QUADRATURE_TOLERANCE 1e-9

static int start(void **state) {
  (void)state;
  ew_core_start();
  return 0;
}

static void assert_close(double value, double expected, double tolerance) {
  if (!(fabs(value / expected - 1.0) <= tolerance))
    fail_msg("%.17g is not %.17g to %g", value, expected, tolerance);
}

static double circularity_density(double e, void *unused) {
  (void)unused;
  return pow(e * (1.0 - e), 1.22);
}

/* Integral of [e(1-e)]^1.22 from 0 to `end`. */
static double circularity_integral(double end) {
  gsl_integration_workspace *workspace = gsl_integration_workspace_alloc(200);
  gsl_function density = {circularity_density, NULL};
  double value = (double)NAN, unused;
  if (workspace && gsl_integration_qags(&density, 0.0, end, 0.0, 1e-11, 200, workspace, &value, &unused))
    value = (double)NAN;
  gsl_integration_workspace_free(workspace);
  return value;
}

static void circularity_inverts_its_distribution(void **state) {
  (void)state;
  double whole = circularity_integral(1.0);
  for (double u = 0.004; u < 1.0; u += 0.0317)
    assert_close(circularity_integral(ew_orbit_draw(u, 0.5).circularity), u * whole, QUADRATURE_TOLERANCE);
}

/* Mean 1/2 and variance 1/(4 (2 a + 1)) of a beta distribution with a = b = 2.22, by the midpoint rule in u. */
static void circularity_moments(void **state) {
  (void)state;
  const int steps = 20000;
  double mean = 0.0, square = 0.0;
  for (int i = 0; i < steps; i++) {
    double e = ew_orbit_draw((i + 0.5) / steps, 0.5).circularity;
    mean += e / steps;
    square += (e - 0.5) * (e - 0.5) / steps;
  }
  assert_close(mean, 0.5, 1e-10);
  assert_close(square, 1.0 / (4.0 * (2.0 * 2.22 + 1.0)), 1e-5);
}

/* The smallest and largest numbers that ew_draw_uniform can give, and what lies between. */
static void orbits_stay_within_bounds(void **state) {
  (void)state;
  static const double draws[] = {0x1p-54, 1e-12, 1e-6, 0.09, 0.11, 0.5, 0.89, 0.91, 1.0 - 1e-6, 1.0 - 0x1p-53};
  double last = 0.0;
  for (size_t i = 0; i < sizeof draws / sizeof draws[0]; i++) {
    ew_orbit orbit = ew_orbit_draw(draws[i], draws[i]);
    assert_true(orbit.circularity > last && orbit.circularity < 1.0);
    assert_true(orbit.circular_radius >= 0.6 && orbit.circular_radius <= 1.0);
    last = orbit.circularity;
  }
  assert_close(ew_orbit_draw(0.5, 0.25).circular_radius, 0.7, 1e-14);
}

/* Hand: 2.385 * 0.216 * 10^1.3 / ln 11 * exp(1.9 * 0.5) * 0.8
 *     = 2.385 * 0.216 * 19.952623 / 2.3978953 * 2.5857097 * 0.8 = 8.867101 Gyr. */
static void friction_by_hand(void **state) {
  (void)state;
  ew_orbit orbit = {.circularity = 0.5, .circular_radius = 0.8};
  assert_close(ew_friction_time(10.0, &orbit, 2.385), 8.867101, 1e-6);
}

/* Chandrasekhar's friction in an isothermal sphere in its usual form for haloes, with the same Coulomb logarithm:
 * t = 1.17 e^0.78 (r_c/r_vir)^2 (M/m)/ln(1 + M/m) r_vir/V_vir (Binney & Tremaine 1987, eq. 7-26; exponent of Lacey &
 * Cole 1993, MNRAS 262, 627; from memory). */
static double chandrasekhar_time(double ratio, const ew_orbit *orbit, double crossing) {
  return 1.17 * pow(orbit->circularity, 0.78) * orbit->circular_radius * orbit->circular_radius * ratio / log1p(ratio) *
         crossing;
}

/* Boylan-Kolchin, Ma & Quataert 2008, abstract: longer than Chandrasekhar's estimate by 1.7 at m/M = 0.1 and 3.3 at
 * 0.01. The typical orbit is meant: e = 0.5 and the energy of a circular orbit at the virial radius. */
static void friction_takes_longer_than_chandrasekhar(void **state) {
  (void)state;
  ew_orbit orbit = {.circularity = 0.5, .circular_radius = 1.0};
  const double abstract_tolerance = 0.05; /* two digits, and a typical orbit */
  assert_close(ew_friction_time(10.0, &orbit, 1.7) / chandrasekhar_time(10.0, &orbit, 1.7), 1.7, abstract_tolerance);
  assert_close(ew_friction_time(100.0, &orbit, 1.7) / chandrasekhar_time(100.0, &orbit, 1.7), 3.3, abstract_tolerance);
}

static void smaller_rounder_wider_satellites_last_longer(void **state) {
  (void)state;
  ew_orbit orbit = {.circularity = 0.3, .circular_radius = 0.7};
  ew_orbit rounder = {.circularity = 0.4, .circular_radius = 0.7};
  ew_orbit wider = {.circularity = 0.3, .circular_radius = 0.8};
  for (double ratio = 1.0; ratio < 1e9; ratio *= 1.1) {
    double time = ew_friction_time(ratio, &orbit, 1.0);
    assert_true(ew_friction_time(1.1 * ratio, &orbit, 1.0) > time);
    assert_true(ew_friction_time(ratio, &rounder, 1.0) > time);
    assert_true(ew_friction_time(ratio, &wider, 1.0) > time);
  }
}

static void friction_time_is_finite_at_any_ratio(void **state) {
  (void)state;
  static const double ratios[] = {-1.0, 0.0, 0.3, 1.0, (double)NAN};
  ew_orbit orbit = {.circularity = 0.5, .circular_radius = 1.0};
  double equal = ew_friction_time(1.0, &orbit, 1.0);
  for (size_t i = 0; i < sizeof ratios / sizeof ratios[0]; i++)
    assert_true(ew_friction_time(ratios[i], &orbit, 1.0) == equal);
  assert_true(isfinite(ew_friction_time((double)INFINITY, &orbit, 1.0)));
  assert_true(ew_friction_time((double)INFINITY, &orbit, 1.0) > 1e100);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(circularity_inverts_its_distribution),
      cmocka_unit_test(circularity_moments),
      cmocka_unit_test(orbits_stay_within_bounds),
      cmocka_unit_test(friction_by_hand),
      cmocka_unit_test(friction_takes_longer_than_chandrasekhar),
      cmocka_unit_test(smaller_rounder_wider_satellites_last_longer),
      cmocka_unit_test(friction_time_is_finite_at_any_ratio),
  };
  return cmocka_run_group_tests(tests, start, NULL);
}
