/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The calendar: slots cover cosmic time without gaps, and each knows its redshift and what follows from it. */
#include "galaxy/stage.h"

static void slots_cover_all_time(void **state) {
  stage *s = stage_fresh(state);
  static const double step[] = {0.002, 0.01, 0.05};
  for (int i = 0; i < 3; i++) {
    stage_calendar(s, step[i]);
    const ew_calendar *c = &s->calendar;
    assert_close(c->end, ew_age(s->cosmology, 0.0), ROUNDING);
    assert_true((double)c->slot_count * step[i] >= c->end && (double)(c->slot_count - 1) * step[i] < c->end);
    for (size_t k = 0; k < c->slot_count; k++) {
      assert_true(ew_calendar_slot(c, ((double)k + 0.3) * step[i]) == k);
      assert_true(k == 0 || c->redshift[k] < c->redshift[k - 1] || c->redshift[k - 1] > 0.999 * EW_HIGHEST_REDSHIFT);
    }
    assert_true(ew_calendar_end_of(c, c->slot_count - 1) == c->end);
    assert_close(ew_calendar_end_of(c, 4), 5.0 * step[i], ROUNDING);
  }
}

static void times_outside_belong_to_the_first_or_last_slot(void **state) {
  stage *s = stage_fresh(state);
  assert_true(ew_calendar_slot(&s->calendar, -1.0) == 0);
  assert_true(ew_calendar_slot(&s->calendar, (double)NAN) == 0);
  assert_true(ew_calendar_slot(&s->calendar, 1e9) == s->calendar.slot_count - 1);
}

/* Age 5.84677 Gyr at z = 1 in a universe of matter and Lambda with Omega_m = 0.3153 and h = 0.6736. */
static void slots_know_their_redshift(void **state) {
  stage *s = stage_fresh(state);
  size_t k = ew_calendar_slot(&s->calendar, 5.84677);
  assert_true(s->calendar.redshift[k] < 1.0 && s->calendar.redshift[k - 1] > 1.0);
  assert_true(s->calendar.redshift[s->calendar.slot_count - 1] == 0.0);
}

/* Radius of 1e9 Msun at z = 0 by hand from an overdensity of 103.224: 26.3837 kpc. */
static void slots_know_their_haloes(void **state) {
  stage *s = stage_fresh(state);
  const ew_calendar *c = &s->calendar;
  assert_close(c->radius[c->slot_count - 1] * 1e3, 26.3837, 1e-5);
  for (size_t k = 20; k < c->slot_count; k += 61) {
    assert_close(c->radius[k] * cbrt(3e8), ew_virial_radius(s->cosmology, 3e8, c->redshift[k]), 1e-9);
    assert_close(c->free_fall[k], ew_free_fall_time(s->cosmology, c->redshift[k]), ROUNDING);
    double velocity = ew_virial_velocity(s->cosmology, c->atomic_mass[k], c->redshift[k]);
    assert_close(ew_virial_temperature(velocity, 1.22), 1e4, 1e-9);
  }
}

static void runs_may_end_early(void **state) {
  stage *s = stage_fresh(state);
  ew_calendar early;
  ew_error error = {0};
  assert_fine(ew_calendar_make(&early, s->cosmology, 6.0, 0.01, &error), &error);
  assert_close(early.end, 0.92959, 2e-5);
  assert_true(early.slot_count == 93 && early.redshift[92] == 6.0);
  ew_calendar_clear(&early);
  assert_null(early.redshift);
}

static void halo_of_the_environment_is_consistent(void **state) {
  stage *s = stage_fresh(state);
  stage_at(s, 3.0);
  ew_environment_set_halo(&s->environment, 2e9, 1.5);
  const ew_nfw *halo = &s->environment.halo;
  assert_close(halo->radius, ew_virial_radius(s->cosmology, 2e9, s->environment.redshift), 1e-9);
  assert_close(s->environment.virial_velocity, ew_nfw_circular_velocity(halo, halo->radius), 1e-9);
  assert_close(halo->concentration, 1.5 * ew_concentration_at(s->concentration, 2e9, s->environment.redshift),
               ROUNDING);
  ew_environment_set_halo(&s->environment, 2e9, 1e-3);
  assert_true(s->environment.halo.concentration == 1.0);
}

static void models_without_a_range_of_masses_are_refused(void **state) {
  stage *s = stage_fresh(state);
  ew_model model = s->settings.model;
  ew_error error = {0};
  const char *name = NULL;
  assert_int_equal(ew_model_check(&model, &name, &error), EW_OK);
  model.star_formation.cluster_range[1] = model.star_formation.cluster_range[0];
  assert_int_equal(ew_model_check(&model, &name, &error), EW_REFUSED);
  assert_string_equal(name, "star_formation.cluster_range");
  model = s->settings.model;
  error = (ew_error){0};
  model.first_stars.imf_range[0] = (double)NAN;
  assert_int_equal(ew_model_check(&model, &name, &error), EW_REFUSED);
  assert_string_equal(name, "first_stars.imf_range");
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(slots_cover_all_time),
      cmocka_unit_test(times_outside_belong_to_the_first_or_last_slot),
      cmocka_unit_test(slots_know_their_redshift),
      cmocka_unit_test(slots_know_their_haloes),
      cmocka_unit_test(runs_may_end_early),
      cmocka_unit_test(halo_of_the_environment_is_consistent),
      cmocka_unit_test(models_without_a_range_of_masses_are_refused),
  };
  return cmocka_run_group_tests(tests, open_stage, close_stage);
}
