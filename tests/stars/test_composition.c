/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Elements, the solar mixture against its published abundances, and ratios relative to the Sun. */
#include "stars/standard.h"

#include <string.h>

/* log eps and atomic masses of Asplund et al. 2009, ARA&A 47, 481, Table 1, with their hydrogen mass fraction. The mass
 * fractions are kept to four digits. */
static void solar_fractions_follow_published_abundances(void **state) {
  (void)state;
  static const struct {
    ew_element element;
    double log_eps, atomic_mass;
  } published[] = {{EW_CARBON, 8.43, 12.011},    {EW_NITROGEN, 7.83, 14.007}, {EW_OXYGEN, 8.69, 15.999},
                   {EW_MAGNESIUM, 7.60, 24.305}, {EW_SILICON, 7.51, 28.085},  {EW_CALCIUM, 6.34, 40.078},
                   {EW_IRON, 7.50, 55.845}};
  const double four_digits = 5e-4;
  for (size_t i = 0; i < sizeof published / sizeof *published; i++) {
    double fraction = published[i].atomic_mass * pow(10.0, published[i].log_eps - 12.0) * 0.7381 / 1.008;
    assert_close(ew_solar.mass[published[i].element], fraction, four_digits);
  }
}

static void mixtures_are_complete(void **state) {
  (void)state;
  assert_close(ew_composition_mass(&ew_solar), 1.0, ROUNDING);
  assert_close(ew_composition_metals(&ew_solar), 0.0134, ROUNDING);
  assert_close(ew_composition_mass(&ew_primordial), 1.0, ROUNDING);
  assert_true(ew_composition_metals(&ew_primordial) == 0.0);
  assert_true(ew_solar.mass[EW_OTHER_METALS] > 1.258e-3); /* neon alone: Asplund et al. 2009, log eps 7.93 */
}

static void abundances_are_relative_to_the_sun(void **state) {
  (void)state;
  ew_composition gas = ew_solar;
  for (int i = 0; i < EW_ELEMENT_COUNT; i++)
    assert_near(ew_abundance(&gas, (ew_element)i, EW_HYDROGEN), 0.0, ROUNDING);
  gas.mass[EW_IRON] *= 0.02385;
  gas.mass[EW_MAGNESIUM] *= 0.05;
  assert_near(ew_abundance(&gas, EW_IRON, EW_HYDROGEN), log10(0.02385), ROUNDING);
  assert_near(ew_abundance(&gas, EW_MAGNESIUM, EW_IRON), log10(0.05 / 0.02385), ROUNDING);
}

static void absent_elements_have_no_abundance(void **state) {
  (void)state;
  assert_true(ew_abundance(&ew_primordial, EW_IRON, EW_HYDROGEN) == -HUGE_VAL);
  assert_true(isnan(ew_abundance(&ew_primordial, EW_MAGNESIUM, EW_IRON)));
  assert_true(isnan(ew_abundance(&ew_primordial, EW_HYDROGEN, EW_IRON)));
}

static void names_are_all_different(void **state) {
  (void)state;
  for (int i = 0; i < EW_ELEMENT_COUNT; i++) {
    assert_non_null(ew_element_name((ew_element)i));
    for (int j = 0; j < i; j++)
      assert_int_not_equal(strcmp(ew_element_name((ew_element)i), ew_element_name((ew_element)j)), 0);
  }
  assert_string_equal(ew_element_name(EW_IRON), "iron");
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(solar_fractions_follow_published_abundances),
      cmocka_unit_test(mixtures_are_complete),
      cmocka_unit_test(abundances_are_relative_to_the_sun),
      cmocka_unit_test(absent_elements_have_no_abundance),
      cmocka_unit_test(names_are_all_different),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
