/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Old stars: what they give back and how many Ia supernovae go off agree with the stellar tables, whether a galaxy is
 * followed step by step or brought up to date at the end; and where the gas goes. */
#include "galaxy/stage.h"

#define FORMED     1e6 /* Msun */
#define METALS     1e-3
#define BIRTH_SLOT 150

/* Stars without Ia supernovae; put back by stage_fresh, freed by the caller. */
static ew_stars *quiet_stars(stage *s) {
  ew_stars_parameters parameters = s->standard.stars;
  parameters.ia_per_mass = 0.0;
  ew_stars *stars = NULL;
  ew_error error = {0};
  assert_fine(ew_stars_new(&stars, &parameters, &error), &error);
  s->world.stars = stars;
  return stars;
}

static ew_galaxy *newborn(stage *s, double metals) {
  ew_galaxy *galaxy = stage_galaxy(s);
  stage_slot(s, BIRTH_SLOT);
  put_stars(s, galaxy, FORMED, metals);
  return galaxy;
}

/* Through all slots to the present; gas leaves. */
static void age_slot_by_slot(stage *s, ew_galaxy *galaxy) {
  for (size_t slot = BIRTH_SLOT; slot < s->calendar.slot_count; slot++) {
    stage_slot(s, slot);
    ew_step step = stage_step(s, galaxy);
    ew_age_stars(&step, false, slot + 1 == s->calendar.slot_count);
  }
}

static void jump_to_the_end(stage *s, ew_galaxy *galaxy) {
  stage_slot(s, s->calendar.slot_count - 1);
  s->environment.satellite = true; /* so that gas leaves */
  ew_galaxy_settle(galaxy, &s->environment);
}

static double age_at_the_end(const stage *s) {
  return s->calendar.end - (BIRTH_SLOT + 0.5) * s->calendar.step;
}

/* Over 12 Gyr, in mass and metals, against the table itself. */
static void stars_give_back_what_the_table_says(void **state) {
  stage *s = stage_fresh(state);
  ew_stars *quiet = quiet_stars(s);
  ew_galaxy *galaxy = newborn(s, METALS);
  age_slot_by_slot(s, galaxy);
  double age = age_at_the_end(s), returned = FORMED * ew_returned_mass(quiet, age, METALS);
  assert_true(age > 12.0 && returned > 0.2 * FORMED);
  assert_close(mass_in(galaxy, EW_LOST_GAS), returned, 1e-9);
  assert_close(mass_in(galaxy, EW_REMNANTS), FORMED * ew_white_dwarf_mass(quiet, age, METALS), 1e-9);
  assert_close(ew_composition_metals(&galaxy->ledger.in[EW_LOST_GAS]), METALS * returned, 1e-9);
  assert_true(mass_in(galaxy, EW_MADE) == 0.0);
  assert_conserved(galaxy);
  ew_stars_free(quiet);
}

static void idle_galaxies_catch_up_in_one_go(void **state) {
  stage *s = stage_fresh(state);
  ew_stars *quiet = quiet_stars(s);
  ew_galaxy *followed = newborn(s, METALS), *idle = newborn(s, METALS);
  age_slot_by_slot(s, followed);
  jump_to_the_end(s, idle);
  for (int r = EW_LOST_GAS; r <= EW_REMNANTS; r++)
    for (int i = 0; i < EW_ELEMENT_COUNT; i++)
      assert_close(idle->ledger.in[r].mass[i], followed->ledger.in[r].mass[i], 1e-9);
  double before = mass_in(idle, EW_LOST_GAS);
  ew_galaxy_settle(idle, &s->environment);
  assert_true(mass_in(idle, EW_LOST_GAS) == before);
  ew_stars_free(quiet);
}

/* Young stars do not wait: in between, too, all is up to date to within 0.1 Gyr of what old stars return. */
static void stars_are_up_to_date_on_the_way(void **state) {
  stage *s = stage_fresh(state);
  ew_stars *quiet = quiet_stars(s);
  ew_galaxy *galaxy = newborn(s, METALS);
  for (size_t slot = BIRTH_SLOT; slot < BIRTH_SLOT + 300; slot++) {
    stage_slot(s, slot);
    ew_step step = stage_step(s, galaxy);
    ew_age_stars(&step, false, false);
    double age = step.end - (BIRTH_SLOT + 0.5) * s->calendar.step;
    double now = FORMED * ew_returned_mass(quiet, age, METALS);
    double then = FORMED * ew_returned_mass(quiet, age > 0.5 ? age - 0.1 : age, METALS);
    assert_true(mass_in(galaxy, EW_LOST_GAS) <= now * (1.0 + 1e-9));
    assert_true(mass_in(galaxy, EW_LOST_GAS) >= then * (1.0 - 1e-9));
  }
  ew_stars_free(quiet);
}

/* Explosions so far: each turns white dwarfs, here without iron, into its ejecta. */
static double explosions(const stage *s, const ew_galaxy *galaxy) {
  const ew_composition *ejecta = ew_ia_ejecta(s->stars);
  assert_near(mass_in(galaxy, EW_MADE), 0.0, 1e-6);
  return -galaxy->ledger.in[EW_MADE].mass[EW_IRON] / ejecta->mass[EW_IRON];
}

/* 1.3 Ia supernovae per 1000 Msun over a Hubble time (Maoz & Graur 2017): some 1270 of 1e6 Msun. */
static void ia_supernovae_go_off_as_the_delay_times_say(void **state) {
  stage *s = stage_fresh(state);
  sample followed = {0}, idle = {0};
  for (uint64_t i = 0; i < 60; i++) {
    ew_arena_mark mark = ew_arena_tell(s->arena);
    stage_realization(s, i);
    s->environment.satellite = false;
    ew_galaxy *one = newborn(s, 0.0), *two = newborn(s, 0.0);
    age_slot_by_slot(s, one);
    jump_to_the_end(s, two);
    sample_add(&followed, explosions(s, one));
    sample_add(&idle, explosions(s, two));
    assert_conserved(one);
    ew_arena_return(s->arena, mark);
  }
  double expected = FORMED * ew_ia_number(s->stars, 0.0, age_at_the_end(s));
  assert_close(expected, 1270.0, 0.03);
  assert_mean(&followed, expected);
  assert_mean(&idle, expected);
  assert_close(sample_deviation(&followed), sqrt(expected), 3.0 * SIGMAS / sqrt(120.0));
}

/* White dwarfs carry off their metals; iron comes back. */
static void metals_are_conserved_in_ia_supernovae(void **state) {
  stage *s = stage_fresh(state);
  ew_galaxy *galaxy = newborn(s, METALS);
  age_slot_by_slot(s, galaxy);
  double iron = 0.0;
  for (int r = EW_HALO_GAS; r <= EW_REMNANTS; r++)
    iron += galaxy->ledger.in[r].mass[EW_IRON];
  assert_true(iron > 400.0);
  assert_close(iron, -galaxy->ledger.in[EW_MADE].mass[EW_IRON] - galaxy->ledger.in[EW_OUTSIDE].mass[EW_IRON], 1e-9);
  assert_close(mass_in(galaxy, EW_LIVING_STARS) + mass_in(galaxy, EW_REMNANTS) + mass_in(galaxy, EW_LOST_GAS), FORMED,
               1e-9);
}

/* A galaxy of less than one white dwarf has no explosion. */
static void no_explosion_without_a_white_dwarf(void **state) {
  stage *s = stage_fresh(state);
  ew_galaxy *galaxy = stage_galaxy(s);
  stage_slot(s, BIRTH_SLOT);
  put_stars(s, galaxy, 1.0, 0.0);
  galaxy->cohort[1].mass = 1e6; /* of which all but 1 Msun is gone */
  galaxy->cohort[1].formed = ew_external_gas(&s->world, 1e6, 0.0);
  jump_to_the_end(s, galaxy);
  assert_true(mass_in(galaxy, EW_MADE) == 0.0);
  for (int i = 0; i < EW_ELEMENT_COUNT; i++)
    assert_true(galaxy->ledger.in[EW_LIVING_STARS].mass[i] >= 0.0);
  assert_conserved(galaxy);
}

/* Where what old stars give back ends up, for a galaxy of stars of 100 Myr. */
static bool keeps_gas(stage *s, double redshift, double gas, bool satellite) {
  ew_galaxy *galaxy = stage_galaxy(s);
  stage_at(s, redshift);
  stage_slot(s, s->environment.slot - 10);
  put_stars(s, galaxy, FORMED, METALS);
  stage_slot(s, s->environment.slot + 10);
  stage_halo(s, 1e9);
  s->environment.satellite = satellite;
  if (gas > 0.0)
    put_gas(s, galaxy, EW_DISC_GAS, gas, METALS);
  ew_galaxy_settle(galaxy, &s->environment);
  double kept = mass_in(galaxy, EW_DISC_GAS) - gas, lost = mass_in(galaxy, EW_LOST_GAS);
  assert_true((kept > 0.0) != (lost > 0.0));
  return kept > 0.0;
}

/* It joins the disc, but leaves after reionization where there is no gas to mix with: less than a tenth of the stars.
 */
static void gas_of_old_stars_leaves_where_there_is_none(void **state) {
  stage *s = stage_fresh(state);
  assert_true(keeps_gas(s, 10.0, 0.0, false));
  assert_true(keeps_gas(s, 10.0, 0.0, true));
  assert_false(keeps_gas(s, 0.0, 0.0, false));
  assert_false(keeps_gas(s, 0.0, 0.04 * FORMED, false));
  assert_true(keeps_gas(s, 0.0, 0.12 * FORMED, false));
  assert_true(keeps_gas(s, 0.0, 0.12 * FORMED, true));
}

/* Cohorts of the same age join as if they had been one. */
static void cohorts_join_at_mergers(void **state) {
  stage *s = stage_fresh(state);
  ew_stars *quiet = quiet_stars(s);
  ew_galaxy *host = newborn(s, METALS), *satellite = newborn(s, METALS);
  stage_slot(s, 400);
  s->environment.satellite = true;
  ew_merger merger = {.host = s->environment.halo, .satellite = s->environment.halo, .mass_ratio = 0.1};
  ew_error error = {0};
  assert_fine(ew_galaxy_merge(host, satellite, &merger, &s->environment, &error), &error);
  age_slot_by_slot(s, host);
  double returned = ew_returned_mass(quiet, age_at_the_end(s), METALS);
  assert_close(mass_in(host, EW_LOST_GAS), 2.0 * FORMED * returned, 1e-9);
  assert_conserved(host);
  ew_stars_free(quiet);
}

/* Ia supernovae in gas drive winds and mix like others. */
static void ia_supernovae_count_for_winds_where_gas_stays(void **state) {
  stage *s = stage_fresh(state);
  ew_galaxy *galaxy = newborn(s, 0.0);
  stage_slot(s, BIRTH_SLOT + 40);
  ew_step step = stage_step(s, galaxy);
  ew_age_stars(&step, true, true);
  assert_close(step.supernovae, explosions(s, galaxy), 1e-9);
  assert_true(step.supernovae > 50.0 && step.energy == step.supernovae);
  assert_close(ew_effective_supernovae(galaxy), step.supernovae, 1e-9);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(stars_give_back_what_the_table_says),
      cmocka_unit_test(idle_galaxies_catch_up_in_one_go),
      cmocka_unit_test(stars_are_up_to_date_on_the_way),
      cmocka_unit_test(ia_supernovae_go_off_as_the_delay_times_say),
      cmocka_unit_test(metals_are_conserved_in_ia_supernovae),
      cmocka_unit_test(no_explosion_without_a_white_dwarf),
      cmocka_unit_test(gas_of_old_stars_leaves_where_there_is_none),
      cmocka_unit_test(cohorts_join_at_mergers),
      cmocka_unit_test(ia_supernovae_count_for_winds_where_gas_stays),
  };
  return cmocka_run_group_tests(tests, open_stage, close_stage);
}
