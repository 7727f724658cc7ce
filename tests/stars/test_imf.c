/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The IMF of normal stars: its norm, its closed forms against quadrature, and the exactness of its inverse. */
#include "stars/standard.h"

/* The upper end is where the distribution is steepest against u: rounding of u is amplified by the ratio of numbers. */
#define INVERSE_TOLERANCE 1e-12

static double kroupa_number_density(double mass, void *context) {
  (void)context;
  return kroupa_shape(mass);
}

static void mass_formed_is_one(void **state) {
  (void)state;
  assert_close(ew_imf_mass(0.1, 100.0), 1.0, ROUNDING);
  assert_close(ew_imf_mass(0.0, 1e4), 1.0, ROUNDING);
}

/* Numbers per Msun of a Kroupa (2001) IMF of 0.1-100 Msun; integrated independently to three digits. */
static void supernova_progenitors_per_mass(void **state) {
  (void)state;
  const double last_digit = 5e-5;
  assert_near(ew_imf_number(8.0, 100.0), 0.0111, last_digit);
  assert_near(ew_imf_number(8.0, 40.0), 0.0101, last_digit);
  assert_near(ew_imf_number(10.0, 40.0), 0.0072, last_digit);
}

static void closed_forms_agree_with_quadrature(void **state) {
  (void)state;
  static const double range[][2] = {{0.1, 0.2385}, {0.2385, 0.5}, {0.5, 0.8}, {2.385, 8.0}, {8.0, 100.0}};
  const double quadrature_tolerance = 1e-10;
  double norm = kroupa_normalisation();
  for (size_t i = 0; i < sizeof range / sizeof *range; i++) {
    double low = range[i][0], high = range[i][1];
    assert_close(ew_imf_number(low, high), norm * quadrature(kroupa_number_density, NULL, low, high),
                 quadrature_tolerance);
    assert_close(ew_imf_mass(low, high), norm * quadrature(kroupa_mass_density, NULL, low, high), quadrature_tolerance);
  }
}

static void ranges_add_up(void **state) {
  (void)state;
  assert_close(ew_imf_number(0.2385, 0.5) + ew_imf_number(0.5, 23.85), ew_imf_number(0.2385, 23.85), ROUNDING);
  assert_close(ew_imf_mass(0.1, 0.9) + ew_imf_mass(0.9, 100.0), 1.0, ROUNDING);
}

static void empty_ranges_hold_nothing(void **state) {
  (void)state;
  assert_true(ew_imf_number(8.0, 8.0) == 0.0);
  assert_true(ew_imf_number(9.0, 8.0) == 0.0);
  assert_true(ew_imf_mass(100.0, 200.0) == 0.0);
  assert_true(ew_imf_mass(0.01, 0.1) == 0.0);
}

static void draws_invert_the_number(void **state) {
  (void)state;
  static const double range[][2] = {{0.1, 100.0}, {0.1, 0.5}, {0.2, 0.5001}, {0.49, 0.9}, {0.5, 100.0}, {8.0, 40.0}};
  for (size_t i = 0; i < sizeof range / sizeof *range; i++)
    for (double u = 1e-3; u < 1.0; u += 0.0137) {
      double low = range[i][0], high = range[i][1], mass = ew_imf_draw(low, high, u);
      assert_true(mass >= low && mass <= high);
      assert_close(ew_imf_number(low, mass), u * ew_imf_number(low, high), INVERSE_TOLERANCE);
    }
}

static void draws_end_at_the_limits(void **state) {
  (void)state;
  assert_close(ew_imf_draw(0.1, 100.0, 0.0), 0.1, ROUNDING);
  assert_close(ew_imf_draw(0.1, 100.0, 1.0), 100.0, ROUNDING);
  assert_close(ew_imf_draw(0.01, 1000.0, 1.0), 100.0, ROUNDING);
  assert_close(ew_imf_draw(23.85, 23.85, 0.3), 23.85, ROUNDING);
  assert_close(ew_imf_draw(0.5, 0.5, 0.3), 0.5, ROUNDING);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(mass_formed_is_one),
      cmocka_unit_test(supernova_progenitors_per_mass),
      cmocka_unit_test(closed_forms_agree_with_quadrature),
      cmocka_unit_test(ranges_add_up),
      cmocka_unit_test(empty_ranges_hold_nothing),
      cmocka_unit_test(draws_invert_the_number),
      cmocka_unit_test(draws_end_at_the_limits),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
