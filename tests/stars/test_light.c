/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * V light of populations: published magnitudes, the joint between the two sets of models, limits, graininess. */
#include "stars/standard.h"

/* The tables are re-sampled every 0.01 dex in age. */
#define RESAMPLING 0.02 /* mag */

static double magnitude_of(double luminosity) {
  return EW_SUN_MAGNITUDE_V - 2.5 * log10(luminosity);
}

static double magnitude(const ew_stars *stars, double age, double metal_fraction) {
  return magnitude_of(ew_luminosity_v(stars, age, metal_fraction));
}

/* [M/H] = -2 lies 0.27 / 0.48 of the way from the models of [M/H] = -2.27 (Z = 0.0001) to those of -1.79 (0.0003). */
static double metal_poor(void) {
  return 1e-4 * pow(3.0, 0.27 / 0.48);
}

/* MIUSCAT with BaSTI isochrones, Kroupa IMF (Vazdekis et al. 2012, MNRAS 424, 157): M_V = 6.15 per Msun formed at 12
 * Gyr and [M/H] = -2, a mass-to-light ratio of 3.39 per initial mass. */
static void old_metal_poor_population(void **state) {
  const ew_stars *stars = *state;
  assert_near(magnitude(stars, 12.0, metal_poor()), 6.15, RESAMPLING);
  assert_close(1.0 / ew_luminosity_v(stars, 12.0, metal_poor()), 3.39, RESAMPLING);
}

typedef struct {
  double metal_fraction, age, magnitude[2];
} published_population;

/* All models of 0.03-14 Gyr, magnitudes and fluctuation magnitudes. The latter turn sharply at a few ages. */
static void every_old_model_is_recovered(void **state) {
  const ew_stars *stars = *state;
  static const published_population old[9][53] = {
#include "stars/tables/populations.inc"
  };
  const double fluctuation_resampling = 0.15; /* mag */
  for (int z = 0; z < 9; z++)
    for (int i = 0; i < 53; i++) {
      const published_population *model = &old[z][i];
      assert_near(magnitude(stars, model->age, model->metal_fraction), model->magnitude[0], RESAMPLING);
      assert_near(magnitude_of(ew_fluctuation_luminosity_v(stars, model->age, model->metal_fraction)),
                  model->magnitude[1], fluctuation_resampling);
    }
}

/* Away from the spikes and from the joint the young models are kept: Z = 0.0001 and 0.001, M_V at 10^6.2 years. */
static void young_models_are_kept(void **state) {
  const ew_stars *stars = *state;
  double age = pow(10.0, 6.2 - 9.0);
  assert_near(magnitude(stars, age, 0.0001), 1.37, RESAMPLING);
  assert_near(magnitude(stars, age, 0.001), 1.22, RESAMPLING);
  assert_near(magnitude_of(ew_fluctuation_luminosity_v(stars, age, 0.001)), -4.63, RESAMPLING);
}

/* The single models jump by 1.8 mag within 0.05 dex at 3 Myr, 36 mag per dex, and the two sets differ by up to 0.16 mag
 * at 30 Myr. */
static void nothing_spikes_or_jumps(void **state) {
  const ew_stars *stars = *state;
  const double step = 0.01, steepest = 25.0; /* mag per dex */
  for (double z = 0.0001; z < 0.03; z *= 1.3)
    for (double log_age = -3.0; log_age < 1.14; log_age += step) {
      double now = magnitude(stars, pow(10.0, log_age), z), then = magnitude(stars, pow(10.0, log_age + step), z);
      assert_true(fabs(then - now) < steepest * step);
      if (log_age > -1.56 && log_age < -1.48)
        assert_true(fabs(then - now) < 3.0 * step);
    }
}

static void outside_the_models_the_ends_hold(void **state) {
  const ew_stars *stars = *state;
  assert_true(ew_luminosity_v(stars, 5.0, 0.0) == ew_luminosity_v(stars, 5.0, 0.0001));
  assert_true(ew_luminosity_v(stars, 5.0, 0.1) == ew_luminosity_v(stars, 5.0, 0.0198));
  assert_close(ew_luminosity_v(stars, 20.0, 0.001), ew_luminosity_v(stars, 14.0, 0.001), ROUNDING);
  assert_close(ew_luminosity_v(stars, 0.0, 0.001), ew_luminosity_v(stars, 1e-3, 0.001), ROUNDING);
  assert_close(ew_fluctuation_luminosity_v(stars, 20.0, 0.0), ew_fluctuation_luminosity_v(stars, 14.0, 0.0001),
               ROUNDING);
}

static void magnitudes_are_linear_in_log_metallicity(void **state) {
  const ew_stars *stars = *state;
  double middle = magnitude(stars, 7.0, sqrt(0.001 * 0.002));
  assert_near(middle, 0.5 * (magnitude(stars, 7.0, 0.001) + magnitude(stars, 7.0, 0.002)), 1e-12);
}

/* The scale of shot noise of an old metal-poor population, about 150 Lsun (integral over PARSEC isochrones, Bressan et
 * al. 2012, MNRAS 427, 127). */
static void old_stars_are_grainy(void **state) {
  const ew_stars *stars = *state;
  const double last_digit = 0.1;
  assert_close(ew_fluctuation_luminosity_v(stars, 12.0, metal_poor()), 150.0, last_digit);
}

static void old_populations_fade(void **state) {
  const ew_stars *stars = *state;
  for (double z = 0.0001; z < 0.03; z *= 1.3)
    for (double age = 1.6; age < 13.0; age *= 1.1)
      assert_true(ew_luminosity_v(stars, 1.1 * age, z) < ew_luminosity_v(stars, age, z));
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(old_metal_poor_population),
      cmocka_unit_test(every_old_model_is_recovered),
      cmocka_unit_test(young_models_are_kept),
      cmocka_unit_test(nothing_spikes_or_jumps),
      cmocka_unit_test(outside_the_models_the_ends_hold),
      cmocka_unit_test(magnitudes_are_linear_in_log_metallicity),
      cmocka_unit_test(old_stars_are_grainy),
      cmocka_unit_test(old_populations_fade),
  };
  return cmocka_run_group_tests(tests, open_standard, close_standard);
}
