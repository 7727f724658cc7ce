/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Power laws: hand-made values at the slopes that turn into logarithms, and the inverse for all slopes. */
#include "stars/standard.h"

#define INVERSE_TOLERANCE 1e-12

static void slope_one_is_logarithmic(void **state) {
  (void)state;
  ew_power_law law = {.slope = 1.0, .low = 1.0, .high = 100.0};
  assert_close(ew_power_law_draw(&law, 0.5), 10.0, ROUNDING);
  assert_close(ew_power_law_mean(&law), 99.0 / log(100.0), ROUNDING);
  assert_close(ew_power_law_share(&law, 10.0, 100.0), 0.5, ROUNDING);
}

static void slope_two_has_a_logarithmic_mean(void **state) {
  (void)state;
  ew_power_law law = {.slope = 2.0, .low = 30.0, .high = 1e4};
  assert_close(ew_power_law_mean(&law), log(1e4 / 30.0) / (1.0 / 30.0 - 1e-4), ROUNDING);
  assert_close(ew_power_law_share(&law, 30.0, 300.0), (1.0 / 30.0 - 1.0 / 300.0) / (1.0 / 30.0 - 1e-4), ROUNDING);
  assert_close(1.0 / ew_power_law_draw(&law, 0.25), 0.75 / 30.0 + 0.25e-4, ROUNDING);
}

/* Salpeter 1955: mean of m^-2.35 between 0.1 and 100 Msun, by hand. */
static void salpeter_mean(void **state) {
  (void)state;
  ew_power_law law = {.slope = 2.35, .low = 0.1, .high = 100.0};
  double mass = (pow(0.1, -0.35) - pow(100.0, -0.35)) / 0.35, number = (pow(0.1, -1.35) - pow(100.0, -1.35)) / 1.35;
  assert_close(ew_power_law_mean(&law), mass / number, ROUNDING);
}

static void nothing_jumps_near_slope_one(void **state) {
  (void)state;
  const double step = 1e-9, change = 1e-7; /* logarithmic width 6, squared, times the step */
  ew_power_law at = {.slope = 1.0, .low = 0.5, .high = 200.0}, below = at, above = at;
  below.slope -= step;
  above.slope += step;
  for (double u = 0.05; u < 1.0; u += 0.1) {
    assert_close(ew_power_law_draw(&below, u), ew_power_law_draw(&at, u), change);
    assert_close(ew_power_law_draw(&above, u), ew_power_law_draw(&at, u), change);
  }
  assert_close(ew_power_law_share(&below, 1.0, 2.0), ew_power_law_share(&above, 1.0, 2.0), change);
  assert_close(ew_power_law_mean(&below), ew_power_law_mean(&above), change);
}

static void draws_invert_the_share(void **state) {
  (void)state;
  static const double slopes[] = {-1.3, 0.0, 0.17, 1.0, 1.0 + 1e-12, 2.0, 2.35, 5.0};
  for (size_t i = 0; i < sizeof slopes / sizeof *slopes; i++) {
    ew_power_law law = {.slope = slopes[i], .low = 2.385, .high = 400.0};
    for (double u = 0.01; u < 1.0; u += 0.07)
      assert_close(ew_power_law_share(&law, law.low, ew_power_law_draw(&law, u)), u, INVERSE_TOLERANCE);
    assert_close(ew_power_law_draw(&law, 0.0), law.low, ROUNDING);
    assert_close(ew_power_law_draw(&law, 1.0), law.high, ROUNDING);
    assert_close(ew_power_law_share(&law, 0.0, 1e6), 1.0, ROUNDING);
    assert_true(ew_power_law_share(&law, 500.0, 600.0) == 0.0);
    assert_true(ew_power_law_share(&law, 20.0, 10.0) == 0.0);
  }
}

static void a_single_mass_is_a_law_too(void **state) {
  (void)state;
  ew_power_law law = {.slope = 1.0, .low = 23.85, .high = 23.85};
  assert_true(ew_power_law_draw(&law, 0.3) == 23.85);
  assert_true(ew_power_law_mean(&law) == 23.85);
  assert_true(ew_power_law_share(&law, 10.0, 40.0) == 1.0);
  assert_true(ew_power_law_share(&law, 30.0, 40.0) == 0.0);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(slope_one_is_logarithmic),
      cmocka_unit_test(slope_two_has_a_logarithmic_mean),
      cmocka_unit_test(salpeter_mean),
      cmocka_unit_test(nothing_jumps_near_slope_one),
      cmocka_unit_test(draws_invert_the_share),
      cmocka_unit_test(a_single_mass_is_a_law_too),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
