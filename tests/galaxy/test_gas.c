/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The gas cycle: joining the disc, coming back from heat, returning or being lost after ejection. */
#include "galaxy/stage.h"

/* What one cycle moves out of 1e6 Msun in that reservoir. */
static double moved_from(stage *s, ew_reservoir reservoir, double recovers_at) {
  ew_galaxy *galaxy = stage_galaxy(s);
  put_gas(s, galaxy, reservoir, 1e6, 1e-4);
  double before = mass_in(galaxy, reservoir);
  galaxy->recovers_at = recovers_at;
  ew_step step = stage_step(s, galaxy);
  step.end = step.start + 0.01;
  ew_cycle_gas(&step);
  assert_conserved(galaxy);
  return before - mass_in(galaxy, reservoir);
}

/* Free-fall time at z = 0 by hand: sqrt(3 pi/(32 G rho)), rho = 103.224 rho_crit = 12998.86 Msun/kpc^3: 2.24426 Gyr. */
static void gas_joins_the_disc_in_a_free_fall(void **state) {
  stage *s = stage_fresh(state);
  stage_halo(s, 1e10);
  assert_close(moved_from(s, EW_HALO_GAS, 0.0), 1e6 * -expm1(-0.01 / 2.24426), 1e-5);
}

static void longer_delays_rule(void **state) {
  stage *s = stage_fresh(state);
  stage_halo(s, 1e10);
  s->settings.model.gas.delay = 4.0;
  assert_close(moved_from(s, EW_HALO_GAS, 0.0), 1e6 * -expm1(-0.01 / 4.0), ROUNDING);
  s->settings.model.gas.delay = 2.0;
  assert_close(moved_from(s, EW_HALO_GAS, 0.0), 1e6 * -expm1(-0.01 / 2.24426), 1e-5);
}

static void gas_below_the_threshold_stays(void **state) {
  stage *s = stage_fresh(state);
  double threshold = s->patch.threshold_mass[s->environment.slot];
  stage_halo(s, threshold * (1.0 - 1e-9));
  assert_true(moved_from(s, EW_HALO_GAS, 0.0) == 0.0);
  stage_halo(s, threshold * (1.0 + 1e-9));
  assert_true(moved_from(s, EW_HALO_GAS, 0.0) > 0.0);
}

static void heated_gas_comes_back_exponentially(void **state) {
  stage *s = stage_fresh(state);
  s->settings.model.star_formation.heated_time = 0.025;
  assert_close(moved_from(s, EW_HEATED_GAS, 0.0), 1e6 * -expm1(-0.4), ROUNDING);
}

/* Nothing joins the disc while first stars keep the gas hot; the step in which the time is over is whole. */
static void nothing_joins_before_recovery(void **state) {
  stage *s = stage_fresh(state);
  stage_at(s, 12.0);
  stage_halo(s, 1e8);
  ew_step step = stage_step(s, NULL);
  assert_true(moved_from(s, EW_HALO_GAS, step.start + 0.001) == 0.0);
  assert_true(moved_from(s, EW_HEATED_GAS, step.start + 0.001) == 0.0);
  assert_true(moved_from(s, EW_HALO_GAS, step.start) > 0.0);
  assert_true(moved_from(s, EW_EJECTED_GAS, step.start + 0.001) > 0.0);
}

/* 18 Gyr at 1e10 Msun, inversely with mass: 9 Gyr at 2e10. */
static void ejected_gas_returns_to_the_halo(void **state) {
  stage *s = stage_fresh(state);
  stage_halo(s, 2e10);
  ew_galaxy *galaxy = stage_galaxy(s);
  put_gas(s, galaxy, EW_EJECTED_GAS, 1e6, 1e-4);
  ew_step step = stage_step(s, galaxy);
  step.end = step.start + 0.01;
  step.share = 0.7;
  galaxy->recovers_at = 100.0; /* so that it stays in the halo */
  ew_cycle_gas(&step);
  assert_close(mass_in(galaxy, EW_HALO_GAS), 1e6 * 0.7 * -expm1(-0.01 / 9.0), ROUNDING);
  assert_true(mass_in(galaxy, EW_LOST_GAS) == 0.0);
}

static double lost_of_ejected(stage *s) {
  ew_galaxy *galaxy = stage_galaxy(s);
  put_gas(s, galaxy, EW_EJECTED_GAS, 1e6, 1e-4);
  ew_step step = stage_step(s, galaxy);
  ew_cycle_gas(&step);
  return mass_in(galaxy, EW_LOST_GAS);
}

/* Below 15 km/s after reionization: V = 12.77 (M/1e9)^(1/3) km/s at z = 0, so below 1.62e9 Msun. */
static void small_haloes_lose_ejected_gas_after_reionization(void **state) {
  stage *s = stage_fresh(state);
  stage_halo(s, 1.6e9);
  assert_close(lost_of_ejected(s), 1e6, ROUNDING);
  stage_halo(s, 1.65e9);
  assert_true(lost_of_ejected(s) == 0.0);
  s->environment.satellite = true;
  assert_close(lost_of_ejected(s), 1e6, ROUNDING);
  stage_at(s, 8.5);
  stage_halo(s, 1e7);
  assert_true(lost_of_ejected(s) == 0.0);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(gas_joins_the_disc_in_a_free_fall),
      cmocka_unit_test(longer_delays_rule),
      cmocka_unit_test(gas_below_the_threshold_stays),
      cmocka_unit_test(heated_gas_comes_back_exponentially),
      cmocka_unit_test(nothing_joins_before_recovery),
      cmocka_unit_test(ejected_gas_returns_to_the_halo),
      cmocka_unit_test(small_haloes_lose_ejected_gas_after_reionization),
  };
  return cmocka_run_group_tests(tests, open_stage, close_stage);
}
