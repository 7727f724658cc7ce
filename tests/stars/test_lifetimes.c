/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Lifetimes: published entries, the shape between and beyond them, and the inverse. */
#include "stars/standard.h"

#define INVERSE_TOLERANCE 1e-10 /* promised */

static const double metallicities[] = {0.0, 1e-5, 0.0004, 0.001234, 0.004, 0.0134, 0.02, 0.0385, 0.05, 0.1};
enum { METALLICITIES = sizeof metallicities / sizeof *metallicities };

/* Portinari, Chiosi & Bressan 1998, A&A 334, 505, Table 14. */
static void published_lifetimes(void **state) {
  const ew_stars *stars = *state;
  assert_close(ew_lifetime(stars, 0.6, 0.0004), 42.8, ROUNDING);
  assert_close(ew_lifetime(stars, 1.0, 0.02), 10.3, ROUNDING);
  assert_close(ew_lifetime(stars, 1.4, 0.004), 2.39, ROUNDING);
  assert_close(ew_lifetime(stars, 9.0, 0.008), 34.4e-3, ROUNDING);
  assert_close(ew_lifetime(stars, 40.0, 0.004), 5.44e-3, ROUNDING);
  assert_close(ew_lifetime(stars, 120.0, 0.05), 3.10e-3, ROUNDING);
}

/* Halfway between four entries of the same table, in log mass and log Z, log age is their mean. */
static void interpolation_is_bilinear_in_logarithms(void **state) {
  const ew_stars *stars = *state;
  double expected = pow(34.2e-3 * 35.1e-3 * 21.3e-3 * 21.4e-3, 0.25);
  assert_close(ew_lifetime(stars, sqrt(9.0 * 12.0), sqrt(0.0004 * 0.004)), expected, ROUNDING);
}

static void lowest_power_law_goes_on(void **state) {
  const ew_stars *stars = *state;
  double slope = log(42.8 / 23.7) / log(0.6 / 0.7);
  assert_close(ew_lifetime(stars, 0.3, 0.0004), 42.8 * pow(0.5, slope), ROUNDING);
}

static void outside_the_table_the_ends_hold(void **state) {
  const ew_stars *stars = *state;
  assert_true(ew_lifetime(stars, 2.385, 0.0) == ew_lifetime(stars, 2.385, 0.0004));
  assert_true(ew_lifetime(stars, 2.385, 0.3) == ew_lifetime(stars, 2.385, 0.05));
  assert_true(ew_lifetime(stars, 0.01, 0.01) == ew_lifetime(stars, 0.1, 0.01));
  assert_true(ew_lifetime(stars, 200.0, 0.01) == ew_lifetime(stars, 120.0, 0.01));
  assert_true(ew_mass_dying_at(stars, -1.0, 0.01) == 120.0);
  assert_true(ew_mass_dying_at(stars, 0.0, 0.01) == 120.0);
  assert_true(ew_mass_dying_at(stars, 1e-3, 0.01) == 120.0);
  assert_true(ew_mass_dying_at(stars, 1e9, 0.01) == 0.1);
}

static void heavier_stars_die_earlier(void **state) {
  const ew_stars *stars = *state;
  for (int z = 0; z < METALLICITIES; z++)
    for (double mass = 0.1, longer = HUGE_VAL; mass <= 120.0; mass *= 1.003) {
      double age = ew_lifetime(stars, mass, metallicities[z]);
      assert_true(age > 0.0 && age < longer);
      longer = age;
    }
}

static void mass_and_age_are_inverse(void **state) {
  const ew_stars *stars = *state;
  for (int z = 0; z < METALLICITIES; z++) {
    for (double mass = 0.11; mass < 120.0; mass *= 1.0137)
      assert_close(ew_mass_dying_at(stars, ew_lifetime(stars, mass, metallicities[z]), metallicities[z]), mass,
                   INVERSE_TOLERANCE);
    for (double age = 3.5e-3; age < 1000.0; age *= 1.0137)
      assert_close(ew_lifetime(stars, ew_mass_dying_at(stars, age, metallicities[z]), metallicities[z]), age,
                   INVERSE_TOLERANCE);
  }
}

/* Schaerer 2002, A&A 382, 28, Table 6, worked out by hand at log m = 1 and 2: log t = 7.253 and 6.431. */
static void metal_free_lifetimes_follow_the_published_fit(void **state) {
  const ew_stars *stars = *state;
  assert_close(ew_lifetime_metal_free(stars, 10.0), pow(10.0, 7.253 - 9.0), ROUNDING);
  assert_close(ew_lifetime_metal_free(stars, 100.0), pow(10.0, 6.431 - 9.0), ROUNDING);
}

/* Against stellar models of others, 15 and 25 Msun: those of Heger & Woosley 2010, ApJ 724, 341. */
static void metal_free_lifetimes_resemble_other_models(void **state) {
  const ew_stars *stars = *state;
  const double between_models = 0.1; /* the precision claimed for the fit */
  assert_close(ew_lifetime_metal_free(stars, 15.0), 10.8e-3, between_models);
  assert_close(ew_lifetime_metal_free(stars, 25.0), 6.6e-3, between_models);
}

static void metal_free_lifetimes_fall_and_end(void **state) {
  const ew_stars *stars = *state;
  for (double mass = 0.5, longer = HUGE_VAL; mass <= 500.0; mass *= 1.003) {
    assert_true(ew_lifetime_metal_free(stars, mass) < longer);
    longer = ew_lifetime_metal_free(stars, mass);
  }
  assert_true(ew_lifetime_metal_free(stars, 600.0) == ew_lifetime_metal_free(stars, 500.0));
  assert_true(ew_lifetime_metal_free(stars, 2.385) == ew_lifetime(stars, 2.385, 0.0));
}

static void living_stars_are_those_below_the_dying(void **state) {
  const ew_stars *stars = *state;
  assert_true(ew_living_number(stars, 1e-3, 0.004) == ew_imf_number(0.1, 100.0));
  assert_close(ew_living_number(stars, 10.3, 0.02), ew_imf_number(0.1, 1.0), INVERSE_TOLERANCE);
  for (double age = 3e-3, more = HUGE_VAL; age < 14.0; age *= 1.1) {
    double number = ew_living_number(stars, age, 0.001);
    assert_true(number <= more);
    more = number;
  }
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(published_lifetimes),
      cmocka_unit_test(interpolation_is_bilinear_in_logarithms),
      cmocka_unit_test(lowest_power_law_goes_on),
      cmocka_unit_test(outside_the_table_the_ends_hold),
      cmocka_unit_test(heavier_stars_die_earlier),
      cmocka_unit_test(mass_and_age_are_inverse),
      cmocka_unit_test(metal_free_lifetimes_follow_the_published_fit),
      cmocka_unit_test(metal_free_lifetimes_resemble_other_models),
      cmocka_unit_test(metal_free_lifetimes_fall_and_end),
      cmocka_unit_test(living_stars_are_those_below_the_dying),
  };
  return cmocka_run_group_tests(tests, open_standard, close_standard);
}
