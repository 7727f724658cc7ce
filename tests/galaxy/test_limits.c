/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Whole lives of single galaxies in limits where the outcome is known: without feedback, without reionization; and the
 * galaxy that runs out of gas, waits, and starts again. */
#include "galaxy/stage.h"

/* A halo that grows from 1e6 Msun at z = 30, exponentially in time, to that mass. */
static double halo_mass_at(const stage *s, double final_mass, size_t slot) {
  double t = ew_calendar_end_of(&s->calendar, slot), start = 0.1, end = s->calendar.end;
  return 1e6 * pow(final_mass / 1e6, log(t / start) / log(end / start));
}

static void live(stage *s, ew_galaxy *galaxy, double final_mass) {
  for (size_t slot = 10; slot < s->calendar.slot_count; slot++) {
    stage_slot(s, slot);
    stage_halo(s, halo_mass_at(s, final_mass, slot));
    stage_advance(s, galaxy);
  }
  ew_galaxy_settle(galaxy, &s->environment);
}

static double gas_of(const ew_galaxy *galaxy) {
  return mass_in(galaxy, EW_HALO_GAS) + mass_in(galaxy, EW_DISC_GAS) + mass_in(galaxy, EW_HEATED_GAS);
}

static void without_first_stars(stage *s) {
  s->settings.model.first_stars.threshold = EW_FIRST_STARS_NONE;
}

static void without_reionization(stage *s) {
  s->settings.model.reionization.suppression = EW_SUPPRESSION_NONE;
  s->settings.model.reionization.evaporation = false;
  stage_patch(s);
}

/* Nothing is ejected and nothing lost: stars and gas are what was accreted, Omega_b/Omega_m of the halo. */
static void without_feedback_all_baryons_stay(void **state) {
  stage *s = stage_fresh(state);
  without_first_stars(s);
  without_reionization(s);
  s->settings.model.feedback.loading_scale = 0.0;
  ew_galaxy *galaxy = stage_galaxy(s);
  live(s, galaxy, 3e10);
  assert_true(mass_in(galaxy, EW_EJECTED_GAS) == 0.0 && mass_in(galaxy, EW_LOST_GAS) == 0.0);
  assert_close(ew_stellar_mass(galaxy) + gas_of(galaxy), 0.0493 / 0.3153 * 3e10, 1e-9);
  assert_true(ew_stellar_mass(galaxy) > 0.2 * 0.0493 / 0.3153 * 3e10);
}

static void feedback_keeps_stars_from_forming(void **state) {
  stage *s = stage_fresh(state);
  without_first_stars(s);
  without_reionization(s);
  double formed[2];
  for (int i = 0; i < 2; i++) {
    ew_galaxy *galaxy = stage_galaxy(s);
    s->settings.model.feedback.loading_scale = i ? 2.9 : 0.0;
    live(s, galaxy, 3e9);
    formed[i] = galaxy->formed;
    assert_true(i == 0 || mass_in(galaxy, EW_EJECTED_GAS) > 0.0);
  }
  assert_true(formed[1] < 0.2 * formed[0]);
}

/* Without reionization nothing holds a small halo's supply back; with it a halo of 3e8 Msun takes in but little of its
 * share after z = 8 and forms no more stars. */
static void reionization_starves_small_haloes(void **state) {
  stage *s = stage_fresh(state);
  ew_galaxy *starved = stage_galaxy(s), *fed = stage_galaxy(s);
  live(s, starved, 3e8);
  double share = ew_galaxy_baryons(starved) / (0.0493 / 0.3153 * 3e8);
  assert_true(share < 0.2);
  assert_true(starved->last_formed_at < ew_age(s->cosmology, 3.0));
  without_reionization(s);
  live(s, fed, 3e8);
  assert_close(ew_galaxy_baryons(fed), 0.0493 / 0.3153 * 3e8, 1e-9);
  assert_true(mass_in(fed, EW_EJECTED_GAS) == 0.0 || fed->formed > 0.0);
}

/* A galaxy at z = 4 in a halo of 3e7 Msun that has just formed stars out of its last gas. */
static ew_galaxy *without_gas(stage *s) {
  stage_at(s, 4.0);
  stage_halo(s, 3e7);
  ew_galaxy *galaxy = stage_galaxy(s);
  put_stars(s, galaxy, 1e4, 1e-4);
  galaxy->baryons = 1e9; /* more than the halo may hold: no supply */
  return galaxy;
}

static void next_slot(stage *s, double halo_mass) {
  stage_slot(s, s->environment.slot + 1);
  stage_halo(s, halo_mass);
}

/* It waits for its young stars to die first: more than 75 Myr. */
static void galaxies_fall_idle_without_gas_and_young_stars(void **state) {
  stage *s = stage_fresh(state);
  ew_galaxy *galaxy = without_gas(s);
  int slots = 0;
  for (; !ew_galaxy_is_idle(galaxy) && slots < 1000; slots++) {
    next_slot(s, 3e7);
    stage_advance(s, galaxy);
  }
  assert_true(slots == 9 || slots == 10);
  assert_true(gas_of(galaxy) == 0.0 && mass_in(galaxy, EW_EJECTED_GAS) == 0.0);
  ew_ledger before = *ew_galaxy_ledger(galaxy);
  for (int i = 0; i < 50; i++) {
    next_slot(s, 3e7);
    stage_advance(s, galaxy);
  }
  assert_memory_equal(&before, ew_galaxy_ledger(galaxy), sizeof before);
  assert_conserved(galaxy);
}

static void galaxies_do_not_fall_idle_before_reionization(void **state) {
  stage *s = stage_fresh(state);
  stage_at(s, 12.0);
  stage_halo(s, 1e6);
  ew_galaxy *galaxy = stage_galaxy(s);
  galaxy->baryons = 1e9;
  for (int i = 0; i < 20; i++) {
    next_slot(s, 1e6);
    stage_advance(s, galaxy);
    assert_false(ew_galaxy_is_idle(galaxy));
  }
}

/* Supply wakes it; its old stars are then as old as they should be, and new ones form. */
static void supply_wakes_idle_galaxies(void **state) {
  stage *s = stage_fresh(state);
  ew_galaxy *galaxy = without_gas(s);
  for (int i = 0; i < 300; i++) {
    next_slot(s, 3e7);
    stage_advance(s, galaxy);
  }
  assert_true(ew_galaxy_is_idle(galaxy));
  double stars = ew_stellar_mass(galaxy), formed = galaxy->formed;
  for (int i = 0; i < 300; i++) {
    next_slot(s, 2e10);
    stage_advance(s, galaxy);
    assert_false(ew_galaxy_is_idle(galaxy));
  }
  assert_true(ew_stellar_mass(galaxy) < stars || galaxy->formed > formed);
  assert_true(galaxy->formed > formed && ew_galaxy_has_stars(galaxy));
  assert_conserved(galaxy);
}

static void mergers_wake_idle_galaxies(void **state) {
  stage *s = stage_fresh(state);
  ew_galaxy *host = without_gas(s), *satellite = stage_galaxy_of(s, 2);
  for (int i = 0; i < 100; i++) {
    next_slot(s, 3e7);
    stage_advance(s, host);
  }
  assert_true(ew_galaxy_is_idle(host));
  put_stars(s, satellite, 1e3, 1e-4);
  put_gas(s, satellite, EW_DISC_GAS, 1e4, 1e-4);
  ew_merger merger = {s->environment.halo, s->environment.halo, s->environment.redshift, 1.0};
  ew_error error = {0};
  assert_fine(ew_galaxy_merge(host, satellite, &merger, &s->environment, &error), &error);
  assert_false(ew_galaxy_is_idle(host));
  assert_true(mass_in(host, EW_DISC_GAS) >= 1e4);
}

/* One history, one outcome: draws depend on the branch, the slot and the realization, and on nothing else. */
static void histories_can_be_replayed(void **state) {
  stage *s = stage_fresh(state);
  ew_galaxy *once = stage_galaxy(s), *twice = stage_galaxy(s), *other = stage_galaxy_of(s, GALAXY_KEY + 1);
  live(s, once, 3e9);
  live(s, twice, 3e9);
  live(s, other, 3e9);
  assert_true(once->formed > 0.0);
  assert_memory_equal(&once->ledger, &twice->ledger, sizeof once->ledger);
  assert_true(once->formed != other->formed);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(without_feedback_all_baryons_stay),
      cmocka_unit_test(feedback_keeps_stars_from_forming),
      cmocka_unit_test(reionization_starves_small_haloes),
      cmocka_unit_test(galaxies_fall_idle_without_gas_and_young_stars),
      cmocka_unit_test(galaxies_do_not_fall_idle_before_reionization),
      cmocka_unit_test(supply_wakes_idle_galaxies),
      cmocka_unit_test(mergers_wake_idle_galaxies),
      cmocka_unit_test(histories_can_be_replayed),
  };
  return cmocka_run_group_tests(tests, open_stage, close_stage);
}
