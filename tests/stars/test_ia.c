/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Type Ia supernovae: number and delay against the published law, ejecta against the published models. */
#include "stars/standard.h"

/* Maoz & Graur 2017, ApJ 848, 25: 1.3 per 1000 Msun over a Hubble time, slope -1.1. With a first delay of 40 Myr that
 * is 62 per cent before 1 Gyr and 2.131e-4 per Msun and Gyr at 1 Gyr, worked out by hand. */
static void number_follows_the_published_law(void **state) {
  const ew_stars *stars = *state;
  const double last_digit = 0.005, four_digits = 5e-4;
  assert_close(ew_ia_number(stars, 0.0, 13.7), 1.3e-3, ROUNDING);
  assert_near(ew_ia_number(stars, 0.0, 1.0) / ew_ia_number(stars, 0.0, 13.7), 0.62, last_digit);
  assert_close(ew_ia_number(stars, 0.99, 1.01) / 0.02, 2.131e-4, four_digits);
}

static void number_has_the_closed_form(void **state) {
  const ew_stars *stars = *state;
  double expected = 1.3e-3 * (pow(0.5, -0.1) - pow(2.385, -0.1)) / (pow(0.04, -0.1) - pow(13.7, -0.1));
  assert_close(ew_ia_number(stars, 0.5, 2.385), expected, ROUNDING);
}

static void slope_one_is_logarithmic(void **state) {
  (void)state;
  ew_stars_parameters parameters = standard;
  parameters.ia_slope = 1.0;
  ew_stars *stars = stars_with(parameters);
  assert_close(ew_ia_number(stars, 0.5, 2.385), 1.3e-3 * log(2.385 / 0.5) / log(13.7 / 0.04), ROUNDING);
  ew_stars_free(stars);
}

static void none_before_the_delay_and_ages_add_up(void **state) {
  const ew_stars *stars = *state;
  assert_true(ew_ia_number(stars, 0.0, 0.04) == 0.0);
  assert_true(ew_ia_number(stars, 2.0, 1.0) == 0.0);
  assert_true(ew_ia_number(stars, 0.0, 0.05) > 0.0);
  assert_close(ew_ia_number(stars, 0.01, 0.3) + ew_ia_number(stars, 0.3, 9.0), ew_ia_number(stars, 0.01, 9.0),
               ROUNDING);
}

/* Iwamoto et al. 1999, ApJS 125, 439, Table 3: iron and all ejecta. */
static void ejecta_are_the_published_ones(void **state) {
  (void)state;
  static const struct {
    const char *name;
    double iron, all;
  } published[] = {{"W7", 0.7490, 1.371},   {"W70", 0.7752, 1.366},  {"WDD1", 0.6718, 1.345}, {"WDD2", 0.7920, 1.339},
                   {"WDD3", 0.8703, 1.335}, {"CDD1", 0.6480, 1.334}, {"CDD2", 0.8345, 1.356}};
  const ew_choice *choices = ew_stars_rows[ew_rows_count(ew_stars_rows) - 1].choices;
  for (int i = 0; i < 7; i++) {
    ew_stars_parameters parameters = standard;
    parameters.ia_model = i;
    ew_stars *stars = stars_with(parameters);
    const ew_composition *ejecta = ew_ia_ejecta(stars);
    assert_string_equal(choices[i].name, published[i].name);
    assert_close(ejecta->mass[EW_IRON], published[i].iron, ROUNDING);
    assert_close(ew_composition_metals(ejecta), published[i].all, ROUNDING);
    assert_close(ew_composition_mass(ejecta), published[i].all, ROUNDING);
    ew_stars_free(stars);
  }
  assert_null(choices[7].name);
}

/* The same table, W7: Ne, Na, Al, S, Ar, Ti, Cr, Mn, Co, Ni and Zn are the other metals; traces make up the sum. */
static void other_metals_are_the_rest(void **state) {
  const ew_stars *stars = *state;
  const double traces = 1e-3;
  double others = 4.518e-3 + 6.320e-5 + 9.860e-4 + 8.700e-2 + 1.565e-2 + 3.429e-4 + 8.479e-3 + 8.870e-3 + 1.040e-3 +
                  0.1257 + 2.823e-5;
  assert_near(ew_ia_ejecta(stars)->mass[EW_OTHER_METALS], others, traces);
  assert_close(ew_ia_ejecta(stars)->mass[EW_OXYGEN], 0.143, ROUNDING);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(number_follows_the_published_law), cmocka_unit_test(number_has_the_closed_form),
      cmocka_unit_test(slope_one_is_logarithmic),         cmocka_unit_test(none_before_the_delay_and_ages_add_up),
      cmocka_unit_test(ejecta_are_the_published_ones),    cmocka_unit_test(other_metals_are_the_rest),
  };
  return cmocka_run_group_tests(tests, open_standard, close_standard);
}
