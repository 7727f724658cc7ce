/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Sizes: the merger formula, what starless haloes do, where torn-off stars end up, and how many components are kept. */
#include "galaxy/stage.h"

static const ew_nfw dwarf_halo = {.mass = 2e9, .radius = 33.0, .concentration = 12.0};

/* A galaxy of stars of that mass and half-mass radius. */
static ew_galaxy *stars_of_size(stage *s, uint64_t key, double mass, double radius) {
  ew_galaxy *galaxy = stage_galaxy_of(s, key);
  put_stars(s, galaxy, mass, 1e-3);
  galaxy->born_here->radius = radius;
  return galaxy;
}

static stage *in_dwarf_halo(void **state) {
  stage *s = stage_fresh(state);
  s->environment.halo = dwarf_halo;
  return s;
}

static ew_merger merger_with(const stage *s, ew_nfw satellite) {
  return (ew_merger){s->environment.halo, satellite, s->environment.redshift,
                     satellite.mass / s->environment.halo.mass};
}

static void merge(stage *s, ew_galaxy *host, ew_galaxy *satellite, ew_nfw satellite_halo) {
  ew_merger merger = merger_with(s, satellite_halo);
  ew_error error = {0};
  assert_fine(ew_galaxy_merge(host, satellite, &merger, &s->environment, &error), &error);
}

/* Growth of few stars at 0.5 kpc when a starless halo arrives. */
static double growth(stage *s, ew_nfw satellite_halo) {
  ew_galaxy *host = stars_of_size(s, 1, 1e-3, 0.5);
  merge(s, host, NULL, satellite_halo);
  return ew_half_mass_radius(host) / 0.5;
}

/* Two of a kind: (2M)^2/r = 2 M^2/r1 + (f/c) M^2/(2 r1), so r/r1 = 4/(2 + f/(2c)): 4/3 for f = 1 and c = 1/2. */
static void equal_mergers_by_hand(void **state) {
  stage *s = in_dwarf_halo(state);
  assert_close(growth(s, dwarf_halo), 4.0 / 3.0, 1e-9);
  s->settings.model.sizes.orbital_share = 0.0;
  assert_close(growth(s, dwarf_halo), 2.0, 1e-9);
  s->settings.model.sizes.orbital_share = 2.0;
  s->settings.model.sizes.binding_share = 0.8;
  assert_close(growth(s, dwarf_halo), 4.0 / 3.25, 1e-9);
}

/* Cole et al. 2000, eq. 4.22, with the dark matter inside 0.5 kpc and inside the radius where a satellite of other mass
 * and concentration is as dense. */
static void unequal_mergers_follow_the_formula(void **state) {
  stage *s = in_dwarf_halo(state);
  const ew_nfw other = {.mass = 3e8, .radius = 17.0, .concentration = 15.0};
  double m1 = ew_nfw_mass(&dwarf_halo, 0.5), r1 = 0.5, low = 1e-3, high = 10.0;
  for (int i = 0; i < 100; i++) {
    double r = 0.5 * (low + high);
    *(ew_nfw_mass(&other, r) / (r * r * r) > m1 / (r1 * r1 * r1) ? &low : &high) = r;
  }
  double r2 = low, m2 = ew_nfw_mass(&other, r2);
  assert_true(r2 > 0.1 && r2 < 0.5);
  double r = (m1 + m2) * (m1 + m2) / (m1 * m1 / r1 + m2 * m2 / r2 + 2.0 * m1 * m2 / (r1 + r2));
  assert_close(growth(s, other), r / r1, 1e-7);
}

/* Haloes of one concentration and density: the more massive, the more growth; never shrinking. */
static void growth_rises_with_the_mass_of_the_satellite(void **state) {
  stage *s = in_dwarf_halo(state);
  double last = 1.0;
  for (double mass = 1e4; mass < 3e9; mass *= 2.0) {
    double now = growth(s, (ew_nfw){mass, 33.0 * cbrt(mass / 2e9), 12.0});
    assert_true(now >= last);
    last = now;
  }
  assert_true(last > 1.3);
  assert_close(growth(s, (ew_nfw){1e4, 33.0 * cbrt(5e-6), 12.0}), 1.0, 0.01);
}

static void stars_in_the_satellite_do_not_change_the_growth(void **state) {
  stage *s = in_dwarf_halo(state);
  ew_galaxy *host = stars_of_size(s, 1, 1.0, 0.5), *satellite = stars_of_size(s, 2, 1e-6, 0.1);
  merge(s, host, satellite, dwarf_halo);
  assert_close(host->born_here->radius, 0.5 * growth(s, dwarf_halo), 1e-6);
}

static void growth_can_be_switched_off(void **state) {
  stage *s = in_dwarf_halo(state);
  s->settings.model.sizes.merger_growth = false;
  assert_true(growth(s, dwarf_halo) == 1.0);
}

/* Stars from the satellite's dense core end up with the merged stars; those from its outskirts where the host is as
 * dense: in haloes of one kind, where they were. */
static void torn_off_stars_stay_where_the_host_is_as_dense(void **state) {
  stage *s = in_dwarf_halo(state);
  ew_galaxy *host = stars_of_size(s, 1, 1.0, 0.5);
  ew_galaxy *core = stars_of_size(s, 2, 1e-3, 0.2), *outskirts = stars_of_size(s, 3, 1e-3, 2.0);
  ew_component *of_core = core->born_here, *of_outskirts = outskirts->born_here;
  merge(s, host, core, dwarf_halo);
  assert_close(of_core->radius, host->born_here->radius, 1e-9);
  assert_true(of_core->radius > 0.6);
  merge(s, host, outskirts, dwarf_halo);
  assert_close(of_outskirts->radius, 2.0, 1e-9);
  assert_close(of_core->radius, host->born_here->radius, 1e-9);
}

/* A host without stars takes the satellite's as they are. */
static void starless_hosts_take_over_sizes(void **state) {
  stage *s = in_dwarf_halo(state);
  ew_galaxy *host = stage_galaxy_of(s, 1), *satellite = stars_of_size(s, 2, 1e4, 0.3);
  merge(s, host, satellite, (ew_nfw){1e8, 12.0, 15.0});
  assert_close(ew_half_mass_radius(host), 0.3, ROUNDING);
  assert_close(host->formed, 1e4, ROUNDING);
}

/* Gas that is there already, of whichever of the two, is no change that the merged stars respond to. */
static void mergers_alone_give_no_response(void **state) {
  stage *s = in_dwarf_halo(state);
  for (int with_stars = 0; with_stars < 2; with_stars++) {
    ew_galaxy *host = with_stars ? stars_of_size(s, 1, 1e5, 0.3) : stage_galaxy_of(s, 1);
    ew_galaxy *satellite = stage_galaxy_of(s, 2);
    satellite->luck.spin = 0.003; /* its disc is smaller than the host's */
    put_gas(s, satellite, EW_DISC_GAS, 1e7, 1e-4);
    put_stars(s, satellite, 1e5, 1e-4);
    satellite->response_gas = ew_gas_in_galaxy(satellite);
    put_gas(s, host, EW_DISC_GAS, 1e8, 1e-4);
    host->response_gas = ew_gas_in_galaxy(host);
    merge(s, host, satellite, (ew_nfw){1e8, 12.0, 15.0});
    double before = ew_half_mass_radius(host);
    ew_step step = stage_step(s, host);
    ew_respond_slowly(&step);
    assert_close(ew_half_mass_radius(host), before, 1e-4);
  }
}

/* Half of the mass of two Plummer spheres, 3e5 Msun at 0.2 and 1e5 Msun at 1.5 kpc, by their own formula. */
static void half_mass_radius_of_two_spheres(void **state) {
  stage *s = in_dwarf_halo(state);
  s->settings.model.sizes.merger_growth = false;
  ew_galaxy *host = stars_of_size(s, 1, 3e5, 0.2), *satellite = stars_of_size(s, 2, 1e5, 1.5);
  merge(s, host, satellite, dwarf_halo);
  double r = ew_half_mass_radius(host), inside = 0.0;
  static const double mass[] = {3e5, 1e5}, half[] = {0.2, 1.5};
  for (int i = 0; i < 2; i++) {
    double a = half[i] / 1.30477, x = r / a;
    inside += mass[i] * pow(1.0 + 1.0 / (x * x), -1.5);
  }
  assert_close(inside, 2e5, 1e-4);
  ew_environment bare = s->environment;
  bare.halo.mass = 1e-9;
  double stars = ew_stellar_mass(host);
  assert_close(ew_mass_inside(host, &bare, r), 0.5 * stars, 1e-3);
  assert_close(ew_plummer_share(0.7, 0.7), 0.5, 1e-4);
}

static void components_are_bounded(void **state) {
  stage *s = in_dwarf_halo(state);
  ew_galaxy *host = stars_of_size(s, 1, 1e4, 0.5);
  for (uint64_t i = 0; i < 200; i++) {
    double radius = 0.05 * pow(1.03, (double)(i * 37 % 101));
    ew_galaxy *satellite = stars_of_size(s, 2 + i, 100.0 + (double)i, radius);
    merge(s, host, satellite, (ew_nfw){2e7, 7.0, 15.0});
  }
  int count = 0;
  double mass = 0.0;
  for (const ew_component *c = host->component; c; c = c->next) {
    assert_true(c->radius > 0.0 && isfinite(c->radius) && c->mass > 0.0 && !c->joined);
    count++;
    mass += c->mass;
  }
  assert_true(count <= 24 && count > 10);
  assert_close(mass, 1e4 + 200.0 * 100.0 + 199.0 * 100.0, 1e-9);
  assert_close(mass, host->formed, 1e-9);
  int events = 0;
  for (const ew_star_event *event = host->event; event; event = event->next, events++) {
    const ew_component *root = ew_component_root(event->component), *listed = host->component;
    while (listed && listed != root)
      listed = listed->next;
    assert_non_null(listed);
  }
  assert_int_equal(events, 201);
  ew_observables seen;
  stage_slot(s, s->calendar.slot_count - 1);
  ew_galaxy_observe(host, &s->environment, &seen);
  double light = 0.0;
  for (const ew_component *c = host->component; c; c = c->next)
    light += c->light;
  assert_close(light, seen.luminosity_v, 1e-9);
  assert_conserved(host);
}

/* Luminous with stars, dark without; from a mass ratio of 1:20, and only once the host has stars. */
static void mergers_are_counted(void **state) {
  stage *s = in_dwarf_halo(state);
  const ew_nfw large = {1.01e8, 12.0, 15.0}, small = {0.99e8, 12.0, 15.0};
  ew_galaxy *host = stage_galaxy_of(s, 1);
  merge(s, host, NULL, large);
  assert_true(host->dark_mergers == 0 && isnan(host->last_merger_redshift));
  merge(s, host, stars_of_size(s, 2, 1e3, 0.1), large); /* the host's first stars */
  assert_true(host->luminous_mergers == 0);
  merge(s, host, NULL, large);
  merge(s, host, stage_galaxy_of(s, 4), large);
  merge(s, host, stars_of_size(s, 3, 1e3, 0.1), large);
  assert_int_equal(host->dark_mergers, 2);
  assert_int_equal(host->luminous_mergers, 1);
  assert_true(host->last_merger_redshift == s->environment.redshift);
  host->last_merger_redshift = 3.0;
  merge(s, host, NULL, small);
  merge(s, host, stars_of_size(s, 5, 1e3, 0.1), small);
  assert_int_equal(host->dark_mergers, 2);
  assert_int_equal(host->luminous_mergers, 1);
  assert_true(host->last_merger_redshift == 3.0);
}

static void contents_add_up(void **state) {
  stage *s = in_dwarf_halo(state);
  ew_galaxy *host = stars_of_size(s, 1, 1e4, 0.5), *satellite = stars_of_size(s, 2, 3e3, 0.2);
  put_gas(s, host, EW_DISC_GAS, 1e5, 1e-4);
  put_gas(s, satellite, EW_DISC_GAS, 2e4, 1e-3);
  put_gas(s, satellite, EW_HEATED_GAS, 1e4, 1e-3);
  ew_hold_supernovae(host, 5.0);
  ew_hold_supernovae(satellite, 4.0);
  satellite->recovers_at = 99.0;
  satellite->formed_metal_free = 10.0;
  double living = mass_in(host, EW_LIVING_STARS) + mass_in(satellite, EW_LIVING_STARS);
  merge(s, host, satellite, (ew_nfw){1e8, 12.0, 15.0});
  assert_close(mass_in(host, EW_DISC_GAS), 1.2e5, 1e-3); /* and what young stars have given back */
  assert_close(mass_in(host, EW_HEATED_GAS), 1e4, ROUNDING);
  assert_close(mass_in(host, EW_LIVING_STARS), living, 1e-3);
  assert_close(host->formed, 1.3e4, ROUNDING);
  assert_close(host->formed_metal_free, 10.0, ROUNDING);
  assert_close(ew_effective_supernovae(host), 9.0, 1e-2);
  assert_true(host->recovers_at == 99.0);
  assert_conserved(host);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(equal_mergers_by_hand),
      cmocka_unit_test(unequal_mergers_follow_the_formula),
      cmocka_unit_test(growth_rises_with_the_mass_of_the_satellite),
      cmocka_unit_test(stars_in_the_satellite_do_not_change_the_growth),
      cmocka_unit_test(growth_can_be_switched_off),
      cmocka_unit_test(torn_off_stars_stay_where_the_host_is_as_dense),
      cmocka_unit_test(starless_hosts_take_over_sizes),
      cmocka_unit_test(mergers_alone_give_no_response),
      cmocka_unit_test(half_mass_radius_of_two_spheres),
      cmocka_unit_test(components_are_bounded),
      cmocka_unit_test(mergers_are_counted),
      cmocka_unit_test(contents_add_up),
  };
  return cmocka_run_group_tests(tests, open_stage, close_stage);
}
