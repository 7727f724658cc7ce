/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * What is observed of galaxies whose stars were put there by hand. */
#include "galaxy/stage.h"

/* Stars of that age at the end, with that iron over solar [dex] and [O/Fe]. */
typedef struct {
  double age, mass, iron, oxygen_to_iron;
} population;

/* Mass fractions of a solar mixture with iron and oxygen changed so; hydrogen takes the rest. */
static ew_composition mixture(const population *p) {
  ew_composition fraction = ew_solar;
  for (int i = EW_HELIUM + 1; i < EW_ELEMENT_COUNT; i++)
    fraction.mass[i] *= pow(10.0, p->iron);
  fraction.mass[EW_OXYGEN] *= pow(10.0, p->oxygen_to_iron);
  return fraction;
}

static ew_star_event *add_stars(stage *s, ew_galaxy *galaxy, const population *p, bool metal_free) {
  stage_slot(s, ew_calendar_slot(&s->calendar, s->calendar.end - p->age));
  ew_step step = stage_step(s, galaxy);
  ew_composition fraction = mixture(p), formed;
  for (int i = 0; i < EW_ELEMENT_COUNT; i++)
    formed.mass[i] = p->mass * fraction.mass[i];
  ew_ledger_move(&galaxy->ledger, EW_OUTSIDE, EW_LIVING_STARS, &formed);
  ew_star_event *event = ew_event_of_slot(&step, metal_free);
  ew_event_add(event, p->mass, &fraction);
  ew_component_add(&step, p->mass, ew_disc_half_mass_radius(step.galaxy, step.environment));
  return event;
}

static ew_observables look_at(stage *s, ew_galaxy *galaxy) {
  ew_observables o = {.stellar_mass = -1.0};
  stage_slot(s, s->calendar.slot_count - 1);
  ew_galaxy_observe(galaxy, &s->environment, &o);
  return o;
}

/* Two events of old stars: the mean weighs stars by number, a population of Z keeps n(Z) stars of each Msun formed. */
static void metallicity_of_two_events_by_hand(void **state) {
  stage *s = stage_fresh(state);
  ew_galaxy *galaxy = stage_galaxy(s);
  const population poor = {12.0, 3000.0, -3.0, 0.5}, rich = {12.0, 1000.0, -1.5, 0.1};
  const ew_star_event *first = add_stars(s, galaxy, &poor, false), *second = add_stars(s, galaxy, &rich, false);
  double age = s->calendar.end - first->time;
  double n1 = 3000.0 * ew_living_number(s->stars, age, first->metal_fraction);
  double n2 = 1000.0 * ew_living_number(s->stars, age, second->metal_fraction);
  double share = n2 / (n1 + n2);
  assert_close(share, 0.25, 0.05);
  ew_observables o = look_at(s, galaxy);
  assert_close(o.metallicity, -3.0 + 1.5 * share, 1e-9);
  assert_close(o.metallicity_spread, 1.5 * sqrt(share * (1.0 - share)), 1e-9);
  assert_close(o.abundance[EW_OXYGEN], 0.5 - 0.4 * share, 1e-9);
  assert_near(o.abundance[EW_CALCIUM], 0.0, 1e-9);
  assert_near(o.abundance[EW_IRON], 0.0, 1e-9);
  assert_true(isnan(o.abundance[EW_HYDROGEN]) && isnan(o.abundance[EW_HELIUM]));
}

/* Clusters of one event: mean and spread by mass. */
static void clusters_of_one_event_are_kept_apart(void **state) {
  stage *s = stage_fresh(state);
  ew_galaxy *galaxy = stage_galaxy(s);
  const population poor = {12.0, 300.0, -3.0, 0.5}, rich = {12.0, 100.0, -2.0, 0.1};
  ew_star_event *event = add_stars(s, galaxy, &poor, false);
  ew_composition fraction = mixture(&rich);
  ew_event_add(event, 100.0, &fraction);
  ew_observables o = look_at(s, galaxy);
  assert_close(o.metallicity, -2.75, 1e-9);
  assert_close(o.metallicity_spread, sqrt(0.75 * 0.25), 1e-9);
  assert_close(o.abundance[EW_OXYGEN], 0.4, 1e-9);
}

/* First stars have no place in the mean, nor in the light, but count as formed. */
static void metal_free_stars_are_left_out(void **state) {
  stage *s = stage_fresh(state);
  ew_galaxy *galaxy = stage_galaxy(s);
  const population first = {13.0, 1000.0, -20.0, 0.0}, later = {12.0, 3000.0, -2.0, 0.0};
  add_stars(s, galaxy, &first, true);
  add_stars(s, galaxy, &later, false);
  ew_observables o = look_at(s, galaxy);
  assert_close(o.metallicity, -2.0, 1e-9);
  assert_near(o.metallicity_spread, 0.0, 1e-6);
  assert_close(o.first_star_fraction, 0.25, 1e-9);
  assert_close(o.stellar_mass_formed, 4000.0, 1e-9);
  const ew_star_event *event = galaxy->event;
  double light = 3000.0 * ew_luminosity_v(s->stars, s->calendar.end - event->time, event->metal_fraction);
  assert_close(o.luminosity_v, light, 1e-9);
  assert_close(o.magnitude_v, 4.82 - 2.5 * log10(light), 1e-9);
}

/* Clusters without iron do not drag the mean to nowhere, even if they have other metals. */
static void stars_without_iron_have_no_metallicity(void **state) {
  stage *s = stage_fresh(state);
  ew_galaxy *galaxy = stage_galaxy(s);
  const population p = {12.0, 100.0, -2.0, 0.0};
  ew_star_event *event = add_stars(s, galaxy, &p, false);
  ew_composition ironless = mixture(&p);
  ironless.mass[EW_IRON] = 0.0;
  ew_event_add(event, 300.0, &ironless);
  ew_observables o = look_at(s, galaxy);
  assert_close(o.metallicity, -2.0, 1e-9);
  assert_near(o.metallicity_spread, 0.0, 1e-6);
}

/* 1e5 Msun of 10 Gyr and Z = 0.0134/10: the light of one burst is that of the table. */
static void light_of_a_burst_is_that_of_the_table(void **state) {
  stage *s = stage_fresh(state);
  ew_galaxy *galaxy = stage_galaxy(s);
  const population p = {10.0, 1e5, -1.0, 0.0};
  const ew_star_event *event = add_stars(s, galaxy, &p, false);
  assert_close(event->metal_fraction, 0.00134, 2e-2);
  ew_observables o = look_at(s, galaxy);
  assert_close(o.luminosity_v, 1e5 * ew_luminosity_v(s->stars, s->calendar.end - event->time, event->metal_fraction),
               1e-9);
  assert_true(o.luminosity_v > 2e4 && o.luminosity_v < 1e5); /* M/L of 2 or so for an old metal-poor population */
}

/* One Plummer sphere: projected half-light radius is its scale, 1/1.30477 of the 3D half-mass radius. Two: as much
 * light inside as outside. */
static void half_light_radius_of_two_components(void **state) {
  stage *s = stage_fresh(state);
  s->settings.model.sizes.merger_growth = false;
  ew_galaxy *host = stage_galaxy_of(s, 1), *satellite = stage_galaxy_of(s, 2);
  const population old = {10.0, 3e5, -2.0, 0.0};
  add_stars(s, host, &old, false);
  host->born_here->radius = 0.2;
  assert_close(look_at(s, host).half_light_radius, 200.0 / 1.30477, 1e-4);
  const population older = {12.0, 2e5, -2.0, 0.0};
  add_stars(s, satellite, &older, false);
  satellite->born_here->radius = 1.0;
  ew_merger merger = {s->environment.halo, s->environment.halo, 0.0, 0.1};
  ew_error error = {0};
  stage_slot(s, s->calendar.slot_count - 1);
  assert_fine(ew_galaxy_merge(host, satellite, &merger, &s->environment, &error), &error);
  double r = look_at(s, host).half_light_radius / 1000.0, light[2] = {0.0}, inside = 0.0;
  int i = 0;
  for (const ew_component *c = host->component; c; c = c->next, i++) {
    double scale = c->radius / 1.30477;
    light[i] = c->light;
    inside += c->light * r * r / (r * r + scale * scale);
  }
  assert_int_equal(i, 2);
  assert_true(light[0] > light[1]);
  assert_close(inside, 0.5 * (light[0] + light[1]), 1e-4);
}

/* Three events of 50, 30 and 20, each spread evenly over its step of 10 Myr: half have formed at the end of the first,
 * nine tenths halfway through the last. */
static void formation_times_by_hand(void **state) {
  stage *s = stage_fresh(state);
  ew_galaxy *galaxy = stage_galaxy(s);
  const population one = {12.0, 50.0, -2.0, 0.0}, two = {8.0, 30.0, -2.0, 0.0}, three = {3.0, 20.0, -2.0, 0.0};
  add_stars(s, galaxy, &two, false);
  const ew_star_event *last = add_stars(s, galaxy, &three, false);
  const ew_star_event *first = add_stars(s, galaxy, &one, false);
  ew_observables o = look_at(s, galaxy);
  const double bisection = 0.001; /* a tenth of a step */
  assert_near(o.time_50, first->time + 0.005, bisection);
  assert_near(o.time_90, last->time, bisection);
}

static void quenched_galaxies_have_no_star_of_the_last_half_gyr(void **state) {
  stage *s = stage_fresh(state);
  static const double age[] = {0.1, 0.48, 0.53, 9.0};
  static const int64_t expected[] = {0, 0, 1, 1};
  for (int i = 0; i < 4; i++) {
    ew_galaxy *galaxy = stage_galaxy(s);
    const population p = {age[i], 50.0, -2.0, 0.0};
    add_stars(s, galaxy, &p, false);
    assert_int_equal(look_at(s, galaxy).quenched, expected[i]);
  }
}

static void assert_nothing_seen(const ew_observables *o) {
  assert_true(o->stellar_mass == 0.0 && o->luminosity_v == 0.0);
  assert_true(isnan(o->magnitude_v) && isnan(o->metallicity) && isnan(o->metallicity_spread));
  assert_true(isnan(o->half_light_radius) && isnan(o->velocity_dispersion));
  for (int i = 0; i < EW_ELEMENT_COUNT; i++)
    assert_true(isnan(o->abundance[i]));
}

/* A galaxy of gas, and a halo without a galaxy: numbers that have no meaning are NaN, sums are 0. */
static void galaxies_without_stars_have_no_properties(void **state) {
  stage *s = stage_fresh(state);
  ew_galaxy *galaxy = stage_galaxy(s);
  put_gas(s, galaxy, EW_DISC_GAS, 1e4, 0.0);
  put_gas(s, galaxy, EW_HEATED_GAS, 2e4, 0.0);
  ew_observables seen = look_at(s, galaxy), nothing;
  ew_observe_nothing(&nothing);
  assert_close(seen.gas_mass, 3e4, 1e-9);
  assert_true(nothing.gas_mass == 0.0);
  const ew_observables *both[] = {&seen, &nothing};
  for (int i = 0; i < 2; i++) {
    assert_nothing_seen(both[i]);
    assert_true(isnan(both[i]->time_50) && isnan(both[i]->time_90) && isnan(both[i]->first_star_fraction));
    assert_true(isnan(both[i]->last_merger_redshift));
    assert_true(both[i]->quenched == -1 && both[i]->luminous_mergers == 0 && both[i]->dark_mergers == 0);
    assert_true(both[i]->stellar_mass_formed == 0.0);
  }
}

/* First stars alone cannot be seen, but have formed. */
static void first_stars_alone_are_dark(void **state) {
  stage *s = stage_fresh(state);
  ew_galaxy *galaxy = stage_galaxy(s);
  const population first = {13.0, 1000.0, -20.0, 0.0};
  const ew_star_event *event = add_stars(s, galaxy, &first, true);
  ew_observables o = look_at(s, galaxy);
  assert_nothing_seen(&o);
  assert_close(o.stellar_mass_formed, 1000.0, ROUNDING);
  assert_close(o.first_star_fraction, 1.0, ROUNDING);
  assert_near(o.time_50, event->time, 0.001);
  assert_int_equal(o.quenched, 1);
}

/* Looking twice shows the same. */
static void observing_changes_nothing(void **state) {
  stage *s = stage_fresh(state);
  ew_galaxy *galaxy = stage_galaxy(s);
  put_stars(s, galaxy, 1e6, 1e-3);
  stage_slot(s, 200);
  put_stars(s, galaxy, 1e6, 1e-4);
  ew_observables once = look_at(s, galaxy), twice = look_at(s, galaxy);
  assert_close(galaxy->component->light, twice.luminosity_v, ROUNDING);
  assert_true(once.stellar_mass == twice.stellar_mass && once.gas_mass == twice.gas_mass);
  assert_true(once.luminosity_v == twice.luminosity_v && once.metallicity == twice.metallicity);
  assert_true(once.half_light_radius == twice.half_light_radius);
  assert_true(once.velocity_dispersion == twice.velocity_dispersion && once.time_50 == twice.time_50);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(metallicity_of_two_events_by_hand),
      cmocka_unit_test(clusters_of_one_event_are_kept_apart),
      cmocka_unit_test(metal_free_stars_are_left_out),
      cmocka_unit_test(stars_without_iron_have_no_metallicity),
      cmocka_unit_test(light_of_a_burst_is_that_of_the_table),
      cmocka_unit_test(half_light_radius_of_two_components),
      cmocka_unit_test(formation_times_by_hand),
      cmocka_unit_test(quenched_galaxies_have_no_star_of_the_last_half_gyr),
      cmocka_unit_test(galaxies_without_stars_have_no_properties),
      cmocka_unit_test(first_stars_alone_are_dark),
      cmocka_unit_test(observing_changes_nothing),
  };
  return cmocka_run_group_tests(tests, open_stage, close_stage);
}
