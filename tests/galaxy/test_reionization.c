/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Reionization: what haloes may hold, what they take in, and what evaporates. */
#include "galaxy/stage.h"

static double share_at(double sharpness, double mass) {
  ew_reionization_parameters p = {.sharpness = sharpness};
  return ew_baryon_share(&p, mass, 1e9);
}

/* Gnedin 2000, eq. 7: at M = Mc the sum in brackets is 2^(a/3), so half is held whatever the sharpness. */
static void half_is_held_at_the_characteristic_mass(void **state) {
  (void)state;
  for (double a = 0.5; a <= 4.0; a += 0.25)
    assert_close(share_at(a, 1e9), 0.5, ROUNDING);
}

/* By hand at M = Mc/2: (1 + (2^(a/3) - 1) 2^a)^(-3/a) for a = 1, 2, 3. */
static void share_by_hand(void **state) {
  (void)state;
  assert_close(share_at(1.0, 5e8), 0.28484236892, 1e-9);
  assert_close(share_at(2.0, 5e8), 0.16312095667, 1e-9);
  assert_close(share_at(3.0, 5e8), 1.0 / 9.0, 1e-9);
}

/* Far above all is held; far below the share falls as mass cubed. */
static void share_has_its_limits(void **state) {
  (void)state;
  for (double a = 0.5; a <= 4.0; a += 0.5) {
    assert_close(share_at(a, 1e30), 1.0, 1e-9);
    double small = pow(exp2(a / 3.0) - 1.0, -3.0 / a);
    assert_close(share_at(a, 1e-6) * 1e45, small, 1e-4);
    for (double mass = 1e6; mass < 1e13; mass *= 1.7)
      assert_true(share_at(a, 1.7 * mass) > share_at(a, mass));
  }
  assert_true(share_at(2.0, 1e5) > 0.0);
}

/* The sharpness 2 has a short cut. */
static void share_is_continuous_in_the_sharpness(void **state) {
  (void)state;
  assert_close(share_at(2.0, 3e8), share_at(2.0 + 1e-9, 3e8), 1e-8);
}

static void nothing_is_held_back_without_a_characteristic_mass(void **state) {
  (void)state;
  ew_reionization_parameters p = {.sharpness = 2.0};
  assert_true(ew_baryon_share(&p, 1e4, 0.0) == 1.0);
}

/* Okamoto, Gao & Theuns 2008, MNRAS 390, 920: their table for a background switched on at z = 9, Mc in Msun/h. */
static void characteristic_mass_follows_the_published_table(void **state) {
  (void)state;
  static const struct {
    double redshift, mass;
  } table[] = {{8.71, 4.54e6}, {8.14, 2.55e7}, {7.11, 8.08e7}, {6.19, 1.56e8}, {5.37, 2.67e8}, {4.32, 4.59e8},
               {3.44, 7.54e8}, {2.49, 1.50e9}, {1.52, 2.76e9}, {1.00, 3.69e9}, {0.52, 5.07e9}, {0.00, 6.48e9}};
  const double closed_form = 0.08; /* how well the fit is said to follow the table */
  for (size_t i = 0; i < sizeof table / sizeof table[0]; i++)
    assert_close(ew_characteristic_mass(0.7, table[i].redshift, 9.0) * 0.7, table[i].mass, closed_form);
}

/* Nothing is held back before reionization, and later reionization means less of it. */
static void characteristic_mass_turns_on_at_reionization(void **state) {
  (void)state;
  for (double z_r = 6.0; z_r < 16.0; z_r += 1.0) {
    double before = ew_characteristic_mass(0.7, z_r + 2.0, z_r), after = ew_characteristic_mass(0.7, z_r - 3.0, z_r);
    assert_true(before < 1e-6 * after);
    assert_true(ew_characteristic_mass(0.7, z_r - 0.5, z_r + 1.0) > ew_characteristic_mass(0.7, z_r - 0.5, z_r));
  }
}

/* Baryons taken in while a halo grows from 1e8 to 4e9 Msun in that many parts. */
static double taken_in(stage *s, int parts, double characteristic_mass) {
  ew_galaxy *galaxy = stage_galaxy(s);
  s->patch.characteristic_mass[s->environment.slot] = characteristic_mass;
  ew_step step = stage_step(s, galaxy);
  for (int i = 0; i <= parts; i++) {
    stage_halo(s, 1e8 + 3.9e9 * i / parts);
    ew_take_in_gas(&step);
    assert_true(galaxy->supply >= 0.0);
  }
  assert_close(mass_in(galaxy, EW_HALO_GAS), ew_galaxy_baryons(galaxy), ROUNDING);
  assert_conserved(galaxy);
  return ew_galaxy_baryons(galaxy);
}

/* The sum is what the halo may hold at the end: Omega_b/Omega_m s M. */
static void supply_does_not_depend_on_the_splitting(void **state) {
  stage *s = stage_fresh(state);
  double expected = 0.0493 / 0.3153 * ew_baryon_share(&s->settings.model.reionization, 4e9, 5e9) * 4e9;
  assert_close(taken_in(s, 1, 5e9), expected, ROUNDING);
  assert_close(taken_in(s, 10, 5e9), expected, ROUNDING);
  assert_close(taken_in(s, 997, 5e9), expected, ROUNDING);
}

static void supply_is_the_mean_without_suppression(void **state) {
  stage *s = stage_fresh(state);
  s->settings.model.reionization.suppression = EW_SUPPRESSION_NONE;
  stage_patch(s);
  for (size_t k = 0; k < s->calendar.slot_count; k++)
    assert_true(s->patch.characteristic_mass[k] == 0.0);
  assert_close(taken_in(s, 7, 0.0), 0.0493 / 0.3153 * 4e9, ROUNDING);
}

/* A halo that shrinks gives nothing back and takes nothing in until it has outgrown what it was. */
static void supply_is_never_negative(void **state) {
  stage *s = stage_fresh(state);
  ew_galaxy *galaxy = stage_galaxy(s);
  ew_step step = stage_step(s, galaxy);
  static const double mass[] = {1e10, 8e9, 5e9, 9.9e9};
  stage_halo(s, 1e10);
  ew_take_in_gas(&step);
  double first = galaxy->supply;
  assert_true(first > 0.0);
  for (int i = 1; i < 4; i++) {
    stage_halo(s, mass[i]);
    ew_take_in_gas(&step);
    assert_true(galaxy->supply == 0.0);
  }
  stage_halo(s, 2e10);
  ew_take_in_gas(&step);
  assert_true(galaxy->supply > 0.0);
  assert_close(mass_in(galaxy, EW_HALO_GAS), ew_galaxy_baryons(galaxy), ROUNDING);
}

static void satellites_take_nothing_in(void **state) {
  stage *s = stage_fresh(state);
  ew_galaxy *galaxy = stage_galaxy(s);
  s->environment.satellite = true;
  stage_halo(s, 1e11);
  ew_step step = stage_step(s, galaxy);
  ew_take_in_gas(&step);
  assert_true(ew_galaxy_baryons(galaxy) == 0.0 && mass_in(galaxy, EW_HALO_GAS) == 0.0);
  assert_true(step.share > 0.9);
}

/* What joined counts, whether its gas is still there or not, and counts once: at infall, not at the merger. */
static void what_joined_has_taken_in_its_part(void **state) {
  stage *s = stage_fresh(state);
  ew_galaxy *host = stage_galaxy_of(s, 1), *satellite = stage_galaxy_of(s, 2);
  stage_halo(s, 2e10);
  ew_galaxy_receive(host, &(ew_received){.baryons = 3e8, .gas = 1e8}, &s->world);
  ew_galaxy_receive(satellite, &(ew_received){.baryons = 2e8, .gas = 2e8}, &s->world);
  ew_galaxy_fall_in(host, satellite);
  assert_close(ew_galaxy_baryons(host), 5e8, ROUNDING);
  ew_merger merger = {.host = s->environment.halo, .satellite = s->environment.halo, .mass_ratio = 0.1};
  ew_error error = {0};
  assert_fine(ew_galaxy_merge(host, satellite, &merger, &s->environment, &error), &error);
  assert_close(ew_galaxy_baryons(host), 5e8, ROUNDING);
  ew_step step = stage_step(s, host);
  ew_take_in_gas(&step);
  double may_hold = 0.0493 / 0.3153 * step.share * 2e10;
  assert_true(step.share > 0.5);
  assert_close(host->supply, may_hold - 5e8, 1e-9);
  assert_close(mass_in(host, EW_HALO_GAS), 1e8 + 2e8 + host->supply, ROUNDING);
}

/* Metals of what flows in at that redshift, as a mass fraction. */
static double inflow_metals(stage *s, double enrichment_redshift, double redshift) {
  ew_galaxy *galaxy = stage_galaxy(s);
  galaxy->luck.enrichment_redshift = enrichment_redshift;
  galaxy->luck.external_metals = 3e-6;
  stage_at(s, redshift);
  stage_halo(s, 1e11);
  ew_step step = stage_step(s, galaxy);
  ew_take_in_gas(&step);
  return ew_composition_metals(&galaxy->ledger.in[EW_HALO_GAS]) / mass_in(galaxy, EW_HALO_GAS);
}

/* Ionized at z = 8; one branch is enriched from z = 10 on, the other by reionization before its luck would have it. */
static void inflow_carries_metals_once_enriched(void **state) {
  stage *s = stage_fresh(state);
  assert_true(inflow_metals(s, 10.0, 10.5) == 0.0);
  assert_close(inflow_metals(s, 10.0, 9.5), 3e-6, 1e-9);
  assert_close(inflow_metals(s, 10.0, 2.0), 3e-6, 1e-9);
  assert_true(inflow_metals(s, 6.1, 8.5) == 0.0);
  assert_close(inflow_metals(s, 6.1, 7.5), 3e-6, 1e-9);
  s->settings.model.gas.external_enrichment = false;
  assert_true(inflow_metals(s, 10.0, 2.0) == 0.0);
}

static ew_galaxy *gaseous_galaxy(stage *s) {
  ew_galaxy *galaxy = stage_galaxy(s);
  put_gas(s, galaxy, EW_HALO_GAS, 1e6, 0.0);
  put_gas(s, galaxy, EW_DISC_GAS, 2e6, 1e-4);
  put_gas(s, galaxy, EW_HEATED_GAS, 3e6, 1e-4);
  put_gas(s, galaxy, EW_EJECTED_GAS, 4e6, 1e-4);
  return galaxy;
}

/* 1e9 Msun at z = 0: r_vir = 26.3837 kpc, V_vir = 12.77 km/s, so e-folding in r_vir/(10 km/s) = 2.57978 Gyr. */
static void gas_evaporates_in_a_crossing_time(void **state) {
  stage *s = stage_fresh(state);
  ew_galaxy *galaxy = gaseous_galaxy(s);
  ew_step step = stage_step(s, galaxy);
  step.end = step.start + 0.01;
  const int steps = 130;
  for (int i = 0; i < steps; i++)
    ew_evaporate_gas(&step);
  double left = exp(-0.01 * steps / 2.57978);
  assert_close(mass_in(galaxy, EW_HALO_GAS), 1e6 * left, 1e-5);
  assert_close(mass_in(galaxy, EW_DISC_GAS), 2e6 * left, 1e-5);
  assert_close(mass_in(galaxy, EW_HEATED_GAS), 3e6 * left, 1e-5);
  assert_close(mass_in(galaxy, EW_EJECTED_GAS), 4e6, ROUNDING);
  assert_close(mass_in(galaxy, EW_LOST_GAS), 6e6 * (1.0 - left), 1e-5);
  assert_conserved(galaxy);
}

static double evaporated(stage *s) {
  ew_galaxy *galaxy = gaseous_galaxy(s);
  ew_step step = stage_step(s, galaxy);
  ew_evaporate_gas(&step);
  return mass_in(galaxy, EW_LOST_GAS);
}

static void massive_or_neutral_haloes_keep_their_gas(void **state) {
  stage *s = stage_fresh(state);
  assert_true(evaporated(s) > 0.0);
  stage_halo(s, 4e9); /* V = 12.77 * 4^(1/3) = 20.27 km/s */
  assert_true(evaporated(s) == 0.0);
  stage_halo(s, 3.8e9); /* 19.92 km/s */
  assert_true(evaporated(s) > 0.0);
  s->settings.model.reionization.evaporation = false;
  assert_true(evaporated(s) == 0.0);
  s->settings.model.reionization.evaporation = true;
  stage_at(s, 8.2);
  stage_halo(s, 1e8);
  assert_true(evaporated(s) == 0.0);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(half_is_held_at_the_characteristic_mass),
      cmocka_unit_test(share_by_hand),
      cmocka_unit_test(share_has_its_limits),
      cmocka_unit_test(share_is_continuous_in_the_sharpness),
      cmocka_unit_test(nothing_is_held_back_without_a_characteristic_mass),
      cmocka_unit_test(characteristic_mass_follows_the_published_table),
      cmocka_unit_test(characteristic_mass_turns_on_at_reionization),
      cmocka_unit_test(supply_does_not_depend_on_the_splitting),
      cmocka_unit_test(supply_is_the_mean_without_suppression),
      cmocka_unit_test(supply_is_never_negative),
      cmocka_unit_test(satellites_take_nothing_in),
      cmocka_unit_test(what_joined_has_taken_in_its_part),
      cmocka_unit_test(inflow_carries_metals_once_enriched),
      cmocka_unit_test(gas_evaporates_in_a_crossing_time),
      cmocka_unit_test(massive_or_neutral_haloes_keep_their_gas),
  };
  return cmocka_run_group_tests(tests, open_stage, close_stage);
}
