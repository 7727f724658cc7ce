/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Thresholds of cooling: the fit of Kulkarni, Visbal & Bryan 2021 (ApJ 917, 40) by hand and against the paper's own
 * summary, the Lyman-Werner background, and what a patch makes of them. */
#include "galaxy/stage.h"

/* M20 = 1.96e5 (1+J)^0.80 (1+v/30)^1.83 (1+Jv/3)^-0.06 Msun, slope 1.64 (1+J)^0.36 (1+v/30)^-0.62 (1+Jv/3)^0.13,
 * worked out apart from the code. */
static void formula_by_hand(void **state) {
  (void)state;
  static const struct {
    double redshift, background, streaming, mass;
  } point[] = {{20, 0, 0, 1.96e5},          {10, 0, 0, 5.65993848e5},    {20, 1, 0, 3.41255821e5}, /* 2^0.80 */
               {20, 0, 30, 6.96852662e5},   {20, 1, 30, 1.05070645e6},                             /* 11^-0.06 */
               {15, 0.5, 24, 1.12264468e6}, {12, 10, 15, 2.4841008152e7}};
  for (size_t i = 0; i < sizeof point / sizeof point[0]; i++)
    assert_close(ew_molecular_threshold(point[i].redshift, point[i].background, point[i].streaming), point[i].mass,
                 1e-8);
}

static double slope(double background, double streaming) {
  double early = ew_molecular_threshold(29.0, background, streaming);
  double late = ew_molecular_threshold(11.0, background, streaming);
  return -log(early / late) / log(30.0 / 12.0);
}

/* The abstract: without radiation and streaming as (1+z)^-1.58; J = 30 steepens to about -5.7; streaming flattens. */
static void slopes_agree_with_the_abstract(void **state) {
  (void)state;
  assert_close(slope(0.0, 0.0), 1.64, 1e-9);
  assert_close(slope(0.0, 0.0), 1.58, 0.05);
  assert_close(slope(30.0, 0.0), 5.7, 0.02);
  assert_close(slope(0.0, 30.0), 1.07, 0.005);
}

static void radiation_and_streaming_raise_the_threshold(void **state) {
  (void)state;
  for (double z = 10.0; z <= 30.0; z += 2.0) {
    assert_true(ew_molecular_threshold(z, 1.0, 0.0) > ew_molecular_threshold(z, 0.1, 0.0));
    assert_true(ew_molecular_threshold(z, 0.1, 30.0) > ew_molecular_threshold(z, 0.1, 10.0));
  }
}

static void arguments_are_held_in_the_range_of_the_fit(void **state) {
  (void)state;
  assert_true(ew_molecular_threshold(4.0, 1.0, 10.0) == ew_molecular_threshold(10.0, 1.0, 10.0));
  assert_true(ew_molecular_threshold(45.0, 1.0, 10.0) == ew_molecular_threshold(30.0, 1.0, 10.0));
  assert_true(ew_molecular_threshold(15.0, 90.0, 10.0) == ew_molecular_threshold(15.0, 30.0, 10.0));
  assert_true(ew_molecular_threshold(15.0, 1.0, 90.0) == ew_molecular_threshold(15.0, 1.0, 60.0));
  assert_true(ew_molecular_threshold(15.0, -1.0, -5.0) == ew_molecular_threshold(15.0, 0.0, 0.0));
}

/* Incatasciato, Khochfar & Onorbe 2023, MNRAS 522, 330: log J21 = 2.119 - 0.1117 (1+z) - 2.782e-3 (1+z)^2, by hand;
 * their abstract has three orders of magnitude between z = 23 and 6. */
static void background_by_hand(void **state) {
  (void)state;
  assert_close(ew_lyman_werner_background(23.0), 0.00685122, 1e-6);
  assert_close(ew_lyman_werner_background(6.0), 15.8775, 1e-5);
}

static double highest_ratio_to_atomic(const stage *s) {
  double highest = 0.0;
  for (size_t k = 0; k < s->calendar.slot_count; k++)
    highest = fmax(highest, s->patch.threshold_mass[k] / s->calendar.atomic_mass[k]);
  return highest;
}

/* In whatever patch, molecules cannot ask for more than atoms do. */
static void threshold_never_exceeds_the_atomic_mass(void **state) {
  stage *s = stage_fresh(state);
  for (s->draws.tree = 0; s->draws.tree < 40; s->draws.tree++)
    for (double factor = 0.0; factor <= 100.0; factor += 50.0) {
      s->settings.model.first_stars.background = factor;
      stage_patch(s);
      assert_true(highest_ratio_to_atomic(s) <= 1.0);
      assert_true(s->patch.threshold_mass[s->calendar.slot_count - 1] > 0.0);
    }
}

static void patch_takes_the_fit_at_its_own_streaming(void **state) {
  stage *s = stage_fresh(state);
  s->settings.model.first_stars.background = 0.5;
  stage_patch(s);
  for (double z = 12.0; z < 40.0; z += 3.0) {
    stage_at(s, z);
    size_t k = s->environment.slot;
    double background = 0.5 * ew_lyman_werner_background(s->calendar.redshift[k]);
    double fit = ew_molecular_threshold(s->calendar.redshift[k], background, s->patch.streaming_velocity);
    assert_close(s->patch.threshold_mass[k], fmin(fit, s->calendar.atomic_mass[k]), ROUNDING);
  }
}

static void other_choices_mean_the_atomic_mass(void **state) {
  stage *s = stage_fresh(state);
  static const int choice[] = {EW_FIRST_STARS_NONE, EW_FIRST_STARS_ATOMIC};
  for (int i = 0; i < 2; i++) {
    s->settings.model.first_stars.threshold = choice[i];
    stage_patch(s);
    for (size_t k = 0; k < s->calendar.slot_count; k++)
      assert_true(s->patch.threshold_mass[k] == s->calendar.atomic_mass[k]);
  }
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(formula_by_hand),
      cmocka_unit_test(slopes_agree_with_the_abstract),
      cmocka_unit_test(radiation_and_streaming_raise_the_threshold),
      cmocka_unit_test(arguments_are_held_in_the_range_of_the_fit),
      cmocka_unit_test(background_by_hand),
      cmocka_unit_test(threshold_never_exceeds_the_atomic_mass),
      cmocka_unit_test(patch_takes_the_fit_at_its_own_streaming),
      cmocka_unit_test(other_choices_mean_the_atomic_mass),
  };
  return cmocka_run_group_tests(tests, open_stage, close_stage);
}
