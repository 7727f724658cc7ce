/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The NFW profile: closed values, the identities between its functions, and the change of mass definition. */
#include "elfinwood/halo.h"

#include <math.h>
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>

#include <cmocka.h>

#define ROUNDING        1e-13
#define ROOT_TOLERANCE  1e-11 /* of a mean density recovered: the root is good to rounding */
#define SLOPE_TOLERANCE 1e-8  /* central difference with steps of 1e-4: the error goes as its square */
#define SLOPE_STEP      1e-4

static const ew_nfw halo = {.mass = 2.385e9, .radius = 31.7, .concentration = 13.3};

static void assert_close(double value, double expected, double tolerance) {
  if (!(fabs(value / expected - 1.0) <= tolerance))
    fail_msg("%.17g is not %.17g to %g", value, expected, tolerance);
}

/* ln(1+x) - x/(1+x) to 20 digits with mpmath 1.3 at 60 digits. */
static void shape_from_tiny_to_large(void **state) {
  (void)state;
  static const double expected[][2] = {
      {1e-12, 4.9999999999933333333e-25},  {1e-6, 4.9999933333408333253e-13},  {1e-3, 4.993340825341658104e-7},
      {0.00999, 4.9242772598090945853e-5}, {0.0101, 5.0325853991441840216e-5}, {0.1, 4.401088895233950953e-3},
      {1.0, 0.19314718055994530942},       {2.16258, 0.46758568510039449138},  {10.0, 1.4888043637074614532},
      {1000.0, 5.9097537803142215842},
  };
  const double shape_tolerance = 1e-12; /* promised */
  for (size_t i = 0; i < sizeof expected / sizeof expected[0]; i++)
    assert_close(ew_nfw_shape(expected[i][0]), expected[i][1], shape_tolerance);
  assert_true(ew_nfw_shape(0.0) == 0.0);
}

static void virial_mass_is_inside_virial_radius(void **state) {
  (void)state;
  assert_close(ew_nfw_mass(&halo, halo.radius), halo.mass, ROUNDING);
  assert_true(ew_nfw_mass(&halo, 2.0 * halo.radius) > halo.mass);
}

/* dM/dr = 4 pi r^2 rho, dPhi/dr = G M / r^2 and V_c^2 = G M / r. */
static void functions_agree_with_each_other(void **state) {
  (void)state;
  for (double r = 1e-3; r < 500.0; r *= 2.385) {
    double h = SLOPE_STEP * r;
    double mass_slope = (ew_nfw_mass(&halo, r + h) - ew_nfw_mass(&halo, r - h)) / (2.0 * h);
    assert_close(mass_slope, 4.0 * EW_PI * r * r * ew_nfw_density(&halo, r), SLOPE_TOLERANCE);
    double pull = (ew_nfw_potential(&halo, r + h) - ew_nfw_potential(&halo, r - h)) / (2.0 * h);
    double v = ew_nfw_circular_velocity(&halo, r);
    assert_close(v * v, EW_GRAVITY * ew_nfw_mass(&halo, r) / r, ROUNDING);
    if (r > 0.1) /* further in the differences of a nearly constant potential drown in rounding */
      assert_close(pull, v * v / r, SLOPE_TOLERANCE);
  }
}

/* ln(1+x)/x = 1 - x/2 + x^2/3 - ... */
static void potential_near_the_centre(void **state) {
  (void)state;
  for (double x = 1e-9; x < 2e-4; x *= 7.0)
    assert_close(ew_nfw_potential(&halo, x * halo.radius / halo.concentration),
                 ew_nfw_potential(&halo, 0.0) * (1.0 - x / 2.0 + x * x / 3.0), 1e-11);
}

static void potential_vanishes_far_away(void **state) {
  (void)state;
  double centre = ew_nfw_potential(&halo, 0.0);
  assert_close(ew_nfw_potential(&halo, 1e-14), centre, ROUNDING);
  assert_true(centre < 0.0);
  assert_true(fabs(ew_nfw_potential(&halo, 1e9)) < 1e-5 * fabs(centre));
  assert_true(ew_nfw_circular_velocity(&halo, 0.0) == 0.0);
}

static void escape_from_the_centre(void **state) {
  (void)state;
  for (double c = 1.3; c < 60.0; c *= 1.7) {
    ew_nfw other = {.mass = halo.mass, .radius = halo.radius, .concentration = c};
    double v_virial = sqrt(EW_GRAVITY * halo.mass / halo.radius);
    assert_close(ew_nfw_escape_velocity(&other), v_virial * sqrt(2.0 * c / (log(1.0 + c) - c / (1.0 + c))), ROUNDING);
  }
}

/* The peak of the rotation curve: V_max^2 = 0.216 c/m(c) V_vir^2 at 2.16 scale radii (Bullock et al. 2001, MNRAS 321,
 * 559, eqs. 5-6; from memory; three digits). */
static void peak_of_the_rotation_curve(void **state) {
  (void)state;
  double c = halo.concentration;
  double r_max = 2.163 * halo.radius / c;
  double v_max = ew_nfw_circular_velocity(&halo, r_max);
  assert_close(v_max * v_max, 0.216 * c / (log(1.0 + c) - c / (1.0 + c)) * EW_GRAVITY * halo.mass / halo.radius, 3e-3);
  assert_true(ew_nfw_circular_velocity(&halo, 0.99 * r_max) < v_max);
  assert_true(ew_nfw_circular_velocity(&halo, 1.01 * r_max) < v_max);
}

static double mean_density(double radius) {
  return ew_nfw_mass(&halo, radius) / (4.0 / 3.0 * EW_PI * radius * radius * radius);
}

static void radius_of_density_is_an_inverse(void **state) {
  (void)state;
  for (double r = 1e-15; r < 99.0 * halo.radius; r *= 3.1)
    assert_close(ew_nfw_radius_of_density(&halo, mean_density(r)), r, ROOT_TOLERANCE);
  for (double density = 1e-1; density < 1e30; density *= 7.7)
    assert_true(ew_nfw_radius_of_density(&halo, 7.7 * density) < ew_nfw_radius_of_density(&halo, density));
}

static void radius_of_density_at_the_ends(void **state) {
  (void)state;
  static const double too_low[] = {1e-9, 0.0, -1.0, -(double)INFINITY, (double)NAN};
  for (size_t i = 0; i < sizeof too_low / sizeof too_low[0]; i++)
    assert_close(ew_nfw_radius_of_density(&halo, too_low[i]), 100.0 * halo.radius, ROUNDING);
  assert_true(ew_nfw_radius_of_density(&halo, (double)INFINITY) == 0.0);
  double tiny = ew_nfw_radius_of_density(&halo, 1e200);
  assert_true(tiny > 0.0 && tiny < 1e-150);
}

static void masses_convert_there_and_back(void **state) {
  (void)state;
  const double round_trip = 1e-10; /* promised */
  static const double overdensities[] = {48.0, 103.2237297, 177.65, 200.0, 500.0, 2500.0};
  for (double c = 0.3; c < 1000.0; c *= 1.9)
    for (int i = 0; i < 36; i++) {
      ew_mass_conversion there = {2.385e11, c, overdensities[i / 6], overdensities[i % 6]};
      ew_mass_conversion back = {.overdensity = there.wanted, .wanted = there.overdensity};
      back.mass = ew_convert_mass(&there, &back.concentration);
      double again;
      assert_close(ew_convert_mass(&back, &again), there.mass, round_trip);
      assert_close(again, c, round_trip);
      assert_true((back.mass < there.mass) == (there.wanted > there.overdensity) || i / 6 == i % 6);
    }
}

/* The new radius holds the wanted mean density, and the profile is the same. */
static void conversion_keeps_the_profile(void **state) {
  (void)state;
  ew_mass_conversion question = {
      .mass = halo.mass, .concentration = halo.concentration, .overdensity = 103.0, .wanted = 200.0};
  double c;
  double mass = ew_convert_mass(&question, &c);
  double radius = halo.radius * c / halo.concentration;
  assert_close(ew_nfw_mass(&halo, radius), mass, ROUNDING);
  assert_close(mean_density(radius), mean_density(halo.radius) * 200.0 / 103.0, ROOT_TOLERANCE);
  assert_close(ew_convert_mass(&question, NULL), mass, ROUNDING);
}

/* The fitting formula of Hu & Kravtsov 2003, ApJ 584, 702, eqs. C3, C9-C11 (from memory): new concentration, claimed to
 * 0.3 per cent for haloes of galaxies and clusters. */
static double hu_kravtsov(double c, double ratio) {
  double f = ratio * (log1p(c) - c / (1.0 + c)) / (c * c * c);
  double l = log(f);
  double p = -0.4283 - 3.13e-3 * l - 3.52e-5 * l * l;
  return 1.0 / (1.0 / sqrt(0.5116 * pow(f, 2.0 * p) + 9.0 / 16.0) + 2.0 * f);
}

static void conversion_agrees_with_the_published_fit(void **state) {
  (void)state;
  for (double c = 4.0; c < 31.0; c *= 1.4) {
    ew_mass_conversion question = {.mass = 1e12, .concentration = c, .overdensity = 103.0, .wanted = 200.0};
    double new_c;
    assert_true(ew_convert_mass(&question, &new_c) < 1e12);
    assert_close(new_c, hu_kravtsov(c, 200.0 / 103.0), 3e-3);
  }
}

static void conversion_without_a_density_stays_finite(void **state) {
  (void)state;
  static const double wanted[] = {0.0, -200.0, (double)NAN, 1e-300};
  for (size_t i = 0; i < sizeof wanted / sizeof wanted[0]; i++) {
    ew_mass_conversion question = {.mass = 1e12, .concentration = 9.0, .overdensity = 103.0, .wanted = wanted[i]};
    double mass = ew_convert_mass(&question, NULL);
    assert_true(isfinite(mass) && mass > 1e12);
  }
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(shape_from_tiny_to_large),
      cmocka_unit_test(virial_mass_is_inside_virial_radius),
      cmocka_unit_test(functions_agree_with_each_other),
      cmocka_unit_test(potential_near_the_centre),
      cmocka_unit_test(potential_vanishes_far_away),
      cmocka_unit_test(escape_from_the_centre),
      cmocka_unit_test(peak_of_the_rotation_curve),
      cmocka_unit_test(radius_of_density_is_an_inverse),
      cmocka_unit_test(radius_of_density_at_the_ends),
      cmocka_unit_test(masses_convert_there_and_back),
      cmocka_unit_test(conversion_keeps_the_profile),
      cmocka_unit_test(conversion_agrees_with_the_published_fit),
      cmocka_unit_test(conversion_without_a_density_stays_finite),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
