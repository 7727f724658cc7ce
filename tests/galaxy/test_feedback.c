/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Winds: the loading law at hand-checked points, its caps, and how a wind takes metals. */
#include "galaxy/stage.h"

/* Gas of 1e9 Msun, half of it heated, so that no wind takes all. */
static ew_galaxy *gaseous(stage *s, double metals) {
  ew_galaxy *galaxy = stage_galaxy(s);
  put_gas(s, galaxy, EW_DISC_GAS, 5e8, metals);
  put_gas(s, galaxy, EW_HEATED_GAS, 5e8, metals);
  return galaxy;
}

/* Blown out per Msun of stars formed, when the supernovae of 1000 Msun go off with so much energy each [1e51 erg]. */
static double loading(stage *s, double velocity, double redshift, double energy) {
  ew_galaxy *galaxy = gaseous(s, 1e-4);
  s->environment.virial_velocity = velocity;
  s->environment.redshift = redshift;
  ew_step step = stage_step(s, galaxy);
  step.supernovae = 1000.0 * ew_supernovae_per_mass(s->stars);
  step.energy = step.supernovae * energy;
  ew_blow_wind(&step);
  assert_conserved(galaxy);
  assert_close(mass_in(galaxy, EW_DISC_GAS), mass_in(galaxy, EW_HEATED_GAS), ROUNDING);
  return mass_in(galaxy, EW_EJECTED_GAS) / 1000.0;
}

#define UNLIMITED 1e6

/* Muratov et al. 2015, eqs 4 and 5: 2.9 (1+z)^1.3 (V/60)^-3.2, above 60 km/s (V/60)^-1. By hand: 2.9 * 2^3.2 = 26.651
 * at 30 km/s, 2.9 / 2 at 120, 2.9 * 2^1.3 = 7.1406 at z = 1, 2.9 * 5^1.3 = 23.500 from z = 4 on. */
static void loading_law_by_hand(void **state) {
  stage *s = stage_fresh(state);
  assert_close(loading(s, 60.0, 0.0, UNLIMITED), 2.9, 1e-6);
  assert_close(loading(s, 30.0, 0.0, UNLIMITED), 26.651, 1e-4);
  assert_close(loading(s, 120.0, 0.0, UNLIMITED), 1.45, 1e-6);
  assert_close(loading(s, 60.0, 1.0, UNLIMITED), 7.1406, 1e-4);
  assert_close(loading(s, 60.0, 4.0, UNLIMITED), 23.500, 1e-4);
  assert_close(loading(s, 60.0, 9.0, UNLIMITED), 23.500, 1e-4);
  s->settings.model.feedback.loading_scale = 1.0;
  assert_close(loading(s, 60.0, 0.0, UNLIMITED), 1.0, 1e-6);
}

/* 2.9 * 6^3.2 = 896.36 at 10 km/s. */
static void loading_is_cut(void **state) {
  stage *s = stage_fresh(state);
  assert_close(loading(s, 10.0, 0.0, UNLIMITED), 896.36, 2e-4);
  assert_close(loading(s, 5.0, 0.0, UNLIMITED), 1000.0, 1e-6);
  s->settings.model.feedback.loading_max = 50.0;
  assert_close(loading(s, 10.0, 0.0, UNLIMITED), 50.0, 1e-6);
}

/* M V^2/2 = 0.1 N 1e51 erg: 2 * 0.1 * N * 5.02914e7 / V_esc^2 Msun, V_esc^2 = 2 G M c / (r m(c)) from the centre. */
static void energy_limits_the_wind(void **state) {
  stage *s = stage_fresh(state);
  ew_nfw *halo = &s->environment.halo;
  *halo = (ew_nfw){.mass = 1e9, .radius = 26.3837, .concentration = 15.0};
  double shape = log(16.0) - 15.0 / 16.0;
  double escape_squared = 2.0 * 4.300917270e-6 * 1e9 * 15.0 / (26.3837 * shape);
  double number = 1000.0 * ew_supernovae_per_mass(s->stars);
  double expected = 2.0 * 0.1 * 1.2 * number * 5.02914e7 / escape_squared / 1000.0;
  assert_true(expected < 200.0);
  assert_close(loading(s, 10.0, 0.0, 1.2), expected, 1e-5);
  s->settings.model.feedback.energy_share = 0.02;
  assert_close(loading(s, 10.0, 0.0, 1.2), 0.2 * expected, 1e-5);
}

static void no_wind_without_loading_or_energy(void **state) {
  stage *s = stage_fresh(state);
  s->settings.model.feedback.loading_scale = 0.0;
  assert_true(loading(s, 30.0, 0.0, UNLIMITED) == 0.0);
  s->settings.model.feedback.loading_scale = 2.9;
  s->settings.model.feedback.energy_share = 0.0;
  assert_true(loading(s, 30.0, 0.0, 1.0) == 0.0);
}

/* A wind that takes that share of the gas, at that metal loading; gas with a hundredth of metals. */
static ew_galaxy *after_wind(stage *s, double share, double metal_loading) {
  ew_galaxy *galaxy = gaseous(s, 0.01);
  ew_hold_supernovae(galaxy, 100.0);
  s->settings.model.feedback.metal_loading = metal_loading;
  s->settings.model.feedback.loading_scale = 1e3;
  s->settings.model.feedback.loading_max = 1e3;
  s->environment.virial_velocity = 60.0;
  ew_step step = stage_step(s, galaxy);
  step.supernovae = share * 1e9 / 1e3 * ew_supernovae_per_mass(s->stars);
  step.energy = step.supernovae * UNLIMITED;
  ew_blow_wind(&step);
  assert_conserved(galaxy);
  return galaxy;
}

/* The wind has the mass asked for, and metals that many times as rich as the gas: 1 - 0.9^l of them. */
static void wind_takes_metals_by_the_metal_loading(void **state) {
  stage *s = stage_fresh(state);
  static const double metal_loading[] = {0.0, 0.5, 1.0, 3.0}, part[] = {0.0, 0.0513167, 0.1, 0.271};
  for (int i = 0; i < 4; i++) {
    ew_galaxy *galaxy = after_wind(s, 0.1, metal_loading[i]);
    assert_near(ew_composition_metals(&galaxy->ledger.in[EW_EJECTED_GAS]), part[i] * 1e7, 1.0);
    double lacking = fmax(0.1 - part[i], 0.0) * 1e7;
    assert_close(mass_in(galaxy, EW_EJECTED_GAS), 1e8 - lacking, 1e-8);
    galaxy = after_wind(s, 1e-4, metal_loading[i]);
    assert_near(ew_composition_metals(&galaxy->ledger.in[EW_EJECTED_GAS]), metal_loading[i] * 1e3, 1.0);
  }
}

static void wind_takes_no_more_metals_than_there_are(void **state) {
  stage *s = stage_fresh(state);
  ew_galaxy *galaxy = after_wind(s, 0.9, 10.0);
  double left = ew_composition_metals(&galaxy->ledger.in[EW_DISC_GAS]);
  assert_true(left >= 0.0 && left < 1e-3);
  assert_close(mass_in(galaxy, EW_EJECTED_GAS), 9e8, 1e-9);
}

/* Two winds one after the other take what one wind takes that leaves as much gas. */
static void winds_do_not_depend_on_the_time_step(void **state) {
  stage *s = stage_fresh(state);
  static const double metal_loading[] = {0.5, 1.0, 2.0};
  for (int i = 0; i < 3; i++) {
    double once = ew_composition_metals(&after_wind(s, 0.36, metal_loading[i])->ledger.in[EW_DISC_GAS]);
    double first = ew_composition_metals(&after_wind(s, 0.2, metal_loading[i])->ledger.in[EW_DISC_GAS]);
    assert_close(first * first / 5e6, once, 1e-9);
  }
}

/* When all gas goes its metals go with it, whatever the metal loading. */
static void nothing_is_left_when_all_gas_goes(void **state) {
  stage *s = stage_fresh(state);
  static const double metal_loading[] = {0.0, 0.5, 1.0, 3.0};
  for (int i = 0; i < 4; i++) {
    ew_galaxy *galaxy = after_wind(s, 1.5, metal_loading[i]);
    assert_close(mass_in(galaxy, EW_EJECTED_GAS), 1e9, 1e-9);
    assert_true(ew_gas_in_galaxy(galaxy) < 1e-3);
  }
}

/* Gas cannot be made of metals alone, however much of the rest is blown out. */
static void gas_that_stays_keeps_hydrogen(void **state) {
  stage *s = stage_fresh(state);
  for (double share = 0.1; share < 1.0; share += 0.0999) {
    ew_galaxy *galaxy = after_wind(s, share, 0.0);
    const ew_composition *gas = &galaxy->ledger.in[EW_DISC_GAS];
    assert_close(gas->mass[EW_HYDROGEN], (1.0 - share) * 4.95e8 * ew_primordial.mass[EW_HYDROGEN], 1e-9);
  }
}

/* Supernova ejecta in the gas go with its metals. */
static void supernovae_held_go_with_the_metals(void **state) {
  stage *s = stage_fresh(state);
  assert_close(after_wind(s, 0.1, 1.0)->held, 90.0, 1e-9);
  assert_close(after_wind(s, 0.1, 3.0)->held, 72.9, 1e-9);
  assert_close(after_wind(s, 0.1, 0.0)->held, 100.0, 1e-9);
  assert_close(ew_effective_supernovae(after_wind(s, 0.1, 3.0)), 100.0, 1e-9);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(loading_law_by_hand),
      cmocka_unit_test(loading_is_cut),
      cmocka_unit_test(energy_limits_the_wind),
      cmocka_unit_test(no_wind_without_loading_or_energy),
      cmocka_unit_test(wind_takes_metals_by_the_metal_loading),
      cmocka_unit_test(wind_takes_no_more_metals_than_there_are),
      cmocka_unit_test(winds_do_not_depend_on_the_time_step),
      cmocka_unit_test(nothing_is_left_when_all_gas_goes),
      cmocka_unit_test(gas_that_stays_keeps_hydrogen),
      cmocka_unit_test(supernovae_held_go_with_the_metals),
  };
  return cmocka_run_group_tests(tests, open_stage, close_stage);
}
