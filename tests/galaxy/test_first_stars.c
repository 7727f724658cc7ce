/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * First stars: which gas forms them, how many and how massive, how they die, and what their explosions do to a halo. */
#include "galaxy/stage.h"

#define SOLAR_METALS 0.0134 /* mass fraction, Asplund et al. 2009 */

/* A minihalo of 3e6 Msun at z = 18, V = 7 km/s or so. */
static stage *minihalo(void **state) {
  stage *s = stage_fresh(state);
  stage_at(s, 18.0);
  stage_halo(s, 3e6);
  return s;
}

static ew_galaxy *galaxy_with_gas(stage *s, double gas, double metals) {
  ew_galaxy *galaxy = stage_galaxy(s);
  put_gas(s, galaxy, EW_DISC_GAS, gas, metals);
  return galaxy;
}

static void stars_of(stage *s, double low, double high, double burst) {
  ew_first_star_parameters *p = &s->settings.model.first_stars;
  p->imf_range[0] = low;
  p->imf_range[1] = high;
  p->burst_mass = burst;
}

/* What forms from gas of that metallicity, log10 of Z over solar: 1 first stars, 0 others. */
static int kind_formed(stage *s, double metallicity) {
  ew_galaxy *galaxy = galaxy_with_gas(s, 1e7, SOLAR_METALS * pow(10.0, metallicity));
  galaxy->luck.spin = 1e-3;
  ew_step step = stage_step(s, galaxy);
  ew_form_stars(&step);
  assert_non_null(galaxy->event);
  assert_true(galaxy->event->metal_free == (galaxy->formed_metal_free > 0.0));
  assert_true(galaxy->formed_metal_free == 0.0 || galaxy->formed_metal_free == galaxy->formed);
  return galaxy->event->metal_free;
}

static void only_gas_below_the_critical_metallicity_forms_them(void **state) {
  stage *s = minihalo(state);
  s->settings.model.first_stars.critical_metallicity = -4.0;
  assert_int_equal(kind_formed(s, -9.0), 1);
  assert_int_equal(kind_formed(s, -4.01), 1);
  assert_int_equal(kind_formed(s, -3.99), 0);
  s->settings.model.first_stars.critical_metallicity = -5.0;
  assert_int_equal(kind_formed(s, -4.01), 0);
  s->settings.model.first_stars.threshold = EW_FIRST_STARS_NONE;
  assert_int_equal(kind_formed(s, -9.0), 0);
}

/* One burst; its galaxy is good until the next. */
static ew_galaxy *burst(stage *s, double gas, uint64_t realization) {
  ew_arena_return(s->arena, (ew_arena_mark){0});
  stage_patch(s);
  stage_realization(s, realization);
  ew_galaxy *galaxy = galaxy_with_gas(s, gas, 0.0);
  ew_step step = stage_step(s, galaxy);
  ew_form_first_stars(&step);
  return galaxy;
}

/* Masses even in log between 2 and 180 Msun: the mean is 178/ln 90 = 39.557 Msun, a share ln(180/140)/ln 90 = 0.055850
 * would explode by pair instability. A burst of 1 Msun is a single star. */
static void single_stars_follow_their_mass_function(void **state) {
  stage *s = minihalo(state);
  stars_of(s, 2.0, 180.0, 1.0);
  sample mass = {0};
  double pair = 0.0;
  const int bursts = 8000;
  for (int i = 0; i < bursts; i++) {
    double star = burst(s, 1e6, (uint64_t)i)->formed;
    assert_true(star >= 2.0 && star <= 180.0);
    sample_add(&mass, star);
    pair += star > 140.0;
  }
  assert_mean(&mass, 39.5573);
  assert_share(pair, bursts, 0.0558505);
}

/* Stars of 10 Msun until their masses reach 95: ten of them. */
static void bursts_go_on_until_their_mass_is_reached(void **state) {
  stage *s = minihalo(state);
  stars_of(s, 10.0, 10.0001, 95.0);
  assert_close(burst(s, 1e6, 0)->formed, 100.0, 1e-4);
  stars_of(s, 2.0, 180.0, 500.0);
  for (uint64_t i = 0; i < 300; i++) {
    double formed = burst(s, 1e6, i)->formed;
    assert_true(formed >= 500.0 && formed < 680.0);
  }
}

/* A star needs a cloud of its mass over the efficiency: 0.3 of 1000 Msun is enough for one of 290, which leaves 710;
 * and not for another. */
static void gas_limits_the_burst(void **state) {
  stage *s = minihalo(state);
  stars_of(s, 290.0, 290.001, 5000.0);
  assert_close(burst(s, 1000.0, 0)->formed, 290.0, 1e-4);
  assert_true(burst(s, 900.0, 0)->formed == 0.0);
  assert_int_equal(burst(s, 900.0, 0)->first_star_events, 0);
  assert_true(burst(s, 900.0, 0)->recovers_at == 0.0);
}

/* Light of the stars heats all gas until the longest-lived massive star is gone. */
static void stars_heat_all_gas_while_they_live(void **state) {
  stage *s = minihalo(state);
  stars_of(s, 20.0, 20.001, 1.0);
  ew_galaxy *galaxy = burst(s, 1e6, 0);
  ew_step step = stage_step(s, galaxy);
  assert_true(mass_in(galaxy, EW_DISC_GAS) == 0.0);
  assert_close(mass_in(galaxy, EW_HEATED_GAS), 1e6 - 20.0, 1e-6);
  assert_close(galaxy->recovers_at, step.end + ew_lifetime_metal_free(s->stars, 20.0), 1e-5);
  assert_conserved(galaxy);
  stars_of(s, 5.0, 5.001, 1.0);
  assert_close(burst(s, 1e6, 0)->recovers_at, step.end, ROUNDING); /* too cool to heat gas for long */
}

/* Draws belong to the ordinal of the burst, not to the slot: later is the same, and the next one is another. */
static void draws_belong_to_the_ordinal(void **state) {
  stage *s = minihalo(state);
  stars_of(s, 2.0, 180.0, 1.0);
  double first = burst(s, 1e6, 7)->formed;
  stage_slot(s, s->environment.slot + 11);
  stage_halo(s, 3e6);
  ew_galaxy *galaxy = burst(s, 1e6, 7);
  assert_true(galaxy->formed == first);
  assert_int_equal(galaxy->first_star_events, 1);
  ew_ledger_move_share(&galaxy->ledger, EW_HEATED_GAS, EW_DISC_GAS, 1.0);
  ew_step step = stage_step(s, galaxy);
  ew_form_first_stars(&step);
  assert_true(fabs(galaxy->formed - 2.0 * first) > 1e-3);
  assert_int_equal(galaxy->first_star_events, 2);
}

/* The deaths that one star of that mass has in store. */
static ew_deaths end_of(stage *s, double star) {
  stars_of(s, star, star * (1.0 + 1e-9), 1.0);
  ew_galaxy *galaxy = burst(s, 1e6, 0);
  assert_close(galaxy->formed, star, 1e-6);
  ew_deaths sum = {0};
  for (size_t k = 0; k < galaxy->pending_count; k++) {
    const ew_deaths *d = &galaxy->pending[k];
    sum.count += d->count;
    sum.first_star_energy += d->first_star_energy;
    assert_true(d->energy == d->first_star_energy);
    for (int i = 0; i < EW_ELEMENT_COUNT; i++) {
      sum.ejected.mass[i] += d->ejected.mass[i];
      sum.remnant.mass[i] += d->remnant.mass[i];
      sum.made.mass[i] += d->made.mass[i];
    }
  }
  assert_near(ew_composition_mass(&sum.made), 0.0, 1e-9);
  return sum;
}

static void white_dwarfs_and_core_collapse(void **state) {
  stage *s = minihalo(state);
  ew_deaths five = end_of(s, 5.0), twenty = end_of(s, 20.0);
  assert_true(five.count == 0.0 && five.first_star_energy == 0.0);
  assert_close(ew_composition_mass(&five.remnant), 0.077 * 5.0 + 0.48, 1e-6);
  assert_true(twenty.count == 1.0 && twenty.first_star_energy > 0.5);
  double oxygen = twenty.made.mass[EW_OXYGEN];
  assert_true(oxygen > 0.3 && oxygen < 4.0);
  assert_close(ew_composition_mass(&twenty.remnant) + ew_composition_mass(&twenty.ejected), 20.0, 1e-6);
}

/* Heger & Woosley 2002: 200 Msun has a helium core of (13/24)(200 - 20) = 97.5 Msun and explodes with
 * 5 + 1.304 (97.5 - 64) = 48.684e51 erg; nothing is left. Stars of 60 and 300 Msun collapse and give nothing back. */
static void pair_instability_and_collapse(void **state) {
  stage *s = minihalo(state);
  ew_deaths pair = end_of(s, 200.0);
  assert_true(pair.count == 1.0);
  assert_close(pair.first_star_energy, 48.684, 1e-4);
  assert_close(ew_composition_mass(&pair.ejected), 200.0, 1e-6);
  assert_true(ew_composition_mass(&pair.remnant) == 0.0);
  static const double collapsing[] = {60.0, 139.0, 300.0};
  for (int i = 0; i < 3; i++) {
    ew_deaths collapse = end_of(s, collapsing[i]);
    assert_true(collapse.count == 0.0 && collapse.first_star_energy == 0.0);
    assert_true(ew_composition_mass(&collapse.ejected) == 0.0);
    assert_close(ew_composition_mass(&collapse.remnant), collapsing[i], 1e-6);
  }
}

/* Low-mass first stars shine on to this day. */
static void low_mass_stars_do_not_die(void **state) {
  stage *s = minihalo(state);
  stars_of(s, 0.6, 0.6001, 1.0);
  ew_galaxy *galaxy = burst(s, 1e6, 0);
  assert_null(galaxy->pending);
  assert_close(mass_in(galaxy, EW_LIVING_STARS), 1.2, 1e-3); /* two stars */
}

/* The galaxy after the explosion of one star, with that much halo gas around. */
static ew_galaxy *after_explosion(stage *s, double star, double halo_gas, double *exploded_at) {
  stars_of(s, star, star * (1.0 + 1e-9), 1.0);
  size_t slot = s->environment.slot;
  ew_galaxy *galaxy = burst(s, 1e4, 0);
  put_gas(s, galaxy, EW_HALO_GAS, halo_gas, 0.0);
  for (int i = 0; i < 4; i++) {
    ew_step step = stage_step(s, galaxy);
    ew_explode_supernovae(&step);
    if (ew_effective_supernovae(galaxy) > 0.0 && ew_composition_metals(&galaxy->ledger.in[EW_MADE]) != 0.0 &&
        *exploded_at == 0.0)
      *exploded_at = step.end;
    assert_true(step.energy == 0.0 && step.supernovae == 0.0); /* none of it drives winds as well */
    stage_slot(s, s->environment.slot + 1);
  }
  stage_slot(s, slot);
  assert_conserved(galaxy);
  return galaxy;
}

#define PAIR_ENERGY (48.684 * EW_SUPERNOVA_ENERGY) /* Msun km^2/s^2, of a star of 200 Msun */

/* All gas is lost if the energy exceeds twice the gas mass times V^2: 1e4 Msun of disc gas, ejecta included, and the
 * halo gas. */
static void strong_explosions_empty_the_halo(void **state) {
  stage *s = minihalo(state);
  double v = s->environment.virial_velocity, limit = PAIR_ENERGY / (2.0 * v * v) - 1e4;
  double at = 0.0;
  ew_galaxy *galaxy = after_explosion(s, 200.0, 0.99 * limit, &at);
  assert_true(mass_in(galaxy, EW_HALO_GAS) == 0.0 && mass_in(galaxy, EW_HEATED_GAS) == 0.0);
  assert_true(mass_in(galaxy, EW_DISC_GAS) == 0.0);
  assert_close(mass_in(galaxy, EW_LOST_GAS), 1e4 + 0.99 * limit, 1e-9);
  assert_true(ew_effective_supernovae(galaxy) == 1.0);
  assert_close(galaxy->recovers_at, at + 0.1, 1e-9);
}

/* Just bound: the gas stays, hot for nearly the longest time; well bound: for a time that grows with the energy. */
static void weak_explosions_delay_recovery(void **state) {
  stage *s = minihalo(state);
  double v = s->environment.virial_velocity, limit = PAIR_ENERGY / (2.0 * v * v) - 1e4;
  for (double excess = 1.01; excess < 80.0; excess *= 5.0) {
    double at = 0.0;
    ew_galaxy *galaxy = after_explosion(s, 200.0, excess * limit, &at);
    assert_close(mass_in(galaxy, EW_HALO_GAS), excess * limit, 1e-9);
    assert_close(mass_in(galaxy, EW_HEATED_GAS), 1e4, 1e-6);
    assert_true(mass_in(galaxy, EW_LOST_GAS) == 0.0);
    double part = PAIR_ENERGY / (2.0 * v * v * (1e4 + excess * limit));
    assert_close(galaxy->recovers_at, at + 0.01 + 0.09 * part, 1e-5);
  }
}

/* The limit is a hundredth of the energy that empties the halo. */
static void massive_haloes_do_not_notice(void **state) {
  stage *s = minihalo(state);
  double v = s->environment.virial_velocity, limit = PAIR_ENERGY / (2.0 * v * v) - 1e4, at = 0.0;
  const ew_galaxy *galaxy = after_explosion(s, 200.0, 150.0 * limit, &at);
  assert_true(galaxy->recovers_at < at + 0.01);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(only_gas_below_the_critical_metallicity_forms_them),
      cmocka_unit_test(single_stars_follow_their_mass_function),
      cmocka_unit_test(bursts_go_on_until_their_mass_is_reached),
      cmocka_unit_test(gas_limits_the_burst),
      cmocka_unit_test(stars_heat_all_gas_while_they_live),
      cmocka_unit_test(draws_belong_to_the_ordinal),
      cmocka_unit_test(white_dwarfs_and_core_collapse),
      cmocka_unit_test(pair_instability_and_collapse),
      cmocka_unit_test(low_mass_stars_do_not_die),
      cmocka_unit_test(strong_explosions_empty_the_halo),
      cmocka_unit_test(weak_explosions_delay_recovery),
      cmocka_unit_test(massive_haloes_do_not_notice),
  };
  return cmocka_run_group_tests(tests, open_stage, close_stage);
}
