/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Star formation: the molecular share, the mean mass of stars formed in a step, the masses of clusters, the heat they
 * spread, and the supernovae they bring, drawn star by star or by bins. */
#include "galaxy/stage.h"

#define SOLAR_METALS 0.0134 /* mass fraction, Asplund et al. 2009 */
#define GAS_METALS   1e-3

/* Gas disc of a galaxy of that spin, in a halo of 1e10 Msun at z = 1. */
typedef struct {
  double gas;  /* Msun */
  double spin; /* sets the size */
} disc;

static void set_the_stage(stage *s) {
  stage_at(s, 1.0);
  stage_halo(s, 1e10);
  s->settings.model.star_formation.cluster_range[0] = 30.0;
  s->settings.model.star_formation.cluster_range[1] = 300.0;
}

static ew_galaxy *galaxy_with(stage *s, const disc *d) {
  ew_galaxy *galaxy = stage_galaxy(s);
  galaxy->luck.spin = d->spin;
  put_gas(s, galaxy, EW_DISC_GAS, d->gas, GAS_METALS);
  return galaxy;
}

/* Mass of stars formed in one step; everything else is given up. */
static double formed_in_a_step(stage *s, const disc *d, uint64_t realization) {
  ew_arena_mark mark = ew_arena_tell(s->arena);
  stage_realization(s, realization);
  ew_galaxy *galaxy = galaxy_with(s, d);
  ew_step step = stage_step(s, galaxy);
  ew_form_stars(&step);
  double formed = galaxy->formed;
  assert_close(mass_in(galaxy, EW_LIVING_STARS), formed, 1e-9);
  ew_arena_return(s->arena, mark);
  return formed;
}

static sample formed_over(stage *s, const disc *d, int realizations) {
  sample formed = {0};
  for (int i = 0; i < realizations; i++)
    sample_add(&formed, formed_in_a_step(s, d, (uint64_t)i));
  return formed;
}

/* Blitz & Rosolowsky 2006, eqs 3 and 11, over an exponential disc by fine rings: ratio (P/P0)^0.92 with
 * P = (pi G/2) S^2, P0/k = 4.3e4 K cm^-3; (pi G/2)(Msun/pc^2)^2/k = 33.12 K cm^-3. Up to so many scale lengths. */
static double molecular_share_by_rings(const stage *s, const disc *d, double inside) {
  double scale = d->spin / sqrt(2.0) * s->environment.halo.radius;
  double centre = d->gas / (2.0 * EW_PI * scale * scale * 1e6), sum = 0.0;
  const double width = 0.002;
  for (double x = 0.5 * width; x < fmin(inside, 30.0); x += width) {
    double column = centre * exp(-x), ratio = pow(33.12 * column * column / 4.3e4, 0.92);
    sum += x * exp(-x) * width * ratio / (1.0 + ratio);
  }
  return sum;
}

/* Depletion of the molecular gas in 2 Gyr, over a step of 10 Myr. */
static double expected_mass(const stage *s, const disc *d) {
  return d->gas * molecular_share_by_rings(s, d, INFINITY) * -expm1(-0.01 / 2.0);
}

#define CLASS_WIDTH 0.04 /* of the deviation: what clusters of one class do not differ in mass */

#define RING_ERROR  0.01 /* of eight rings of equal mass, half molecular */

static void assert_mean_formed(stage *s, const disc *d, int realizations) {
  sample formed = formed_over(s, d, realizations);
  double expected = expected_mass(s, d), error = SIGMAS * sample_error(&formed) + RING_ERROR * expected;
  assert_near(sample_mean(&formed), expected, error);
  assert_true(sample_error(&formed) < 0.02 * expected);
}

/* Some five clusters in a step, and some two hundred. */
static void mean_mass_formed_is_what_the_law_asks_for(void **state) {
  stage *s = stage_fresh(state);
  set_the_stage(s);
  disc few = {4.5e5, 0.0016}, many = {1e7, 0.005};
  double mean_cluster = 30.0 * log(10.0) / 0.9;
  assert_true(expected_mass(s, &few) > 3.0 * mean_cluster && expected_mass(s, &few) < 8.0 * mean_cluster);
  assert_true(expected_mass(s, &many) > 100.0 * mean_cluster);
  assert_mean_formed(s, &few, 3000);
  assert_mean_formed(s, &many, 1000);
}

/* Independent clusters: the variance of the mass formed is their number times the mean square of their masses, which is
 * low * high for dN/dm ~ m^-2. So the scatter falls as their number grows. */
static void assert_scatter(stage *s, const disc *d, int realizations) {
  const double *range = s->settings.model.star_formation.cluster_range;
  double mean_cluster = log(range[1] / range[0]) / (1.0 / range[0] - 1.0 / range[1]);
  double expected = sqrt(expected_mass(s, d) / mean_cluster * range[0] * range[1]);
  sample formed = formed_over(s, d, realizations);
  double heavy_tail = 3.0 / sqrt(realizations); /* relative error of a deviation, with some excess kurtosis */
  assert_close(sample_deviation(&formed), expected, heavy_tail + CLASS_WIDTH);
}

static void mass_formed_scatters_as_clusters_do(void **state) {
  stage *s = stage_fresh(state);
  set_the_stage(s);
  s->settings.model.star_formation.cluster_range[1] = 3000.0;
  assert_scatter(s, &(disc){5e5, 1e-3}, 2000);
  assert_scatter(s, &(disc){5e6, 1e-3}, 1000);
  assert_scatter(s, &(disc){1e8, 1e-3}, 1000);
}

static double mean_share_formed(stage *s, const disc *d) {
  sample formed = formed_over(s, d, 300);
  return sample_mean(&formed) / d->gas;
}

/* A tiny disc is all molecular; some thirty thousand clusters of all masses. */
static void gas_under_high_pressure_is_molecular(void **state) {
  stage *s = stage_fresh(state);
  set_the_stage(s);
  s->settings.model.star_formation.cluster_range[1] = 1e4;
  assert_close(mean_share_formed(s, &(disc){1e9, 1e-5}), -expm1(-0.01 / 2.0), 0.006);
}

/* Twice the gas is four times the pressure: a share 4^0.92 = 3.580 times as high where it is low. */
static void molecular_share_rises_with_pressure(void **state) {
  stage *s = stage_fresh(state);
  set_the_stage(s);
  double thin = mean_share_formed(s, &(disc){2e8, 0.2}), thick = mean_share_formed(s, &(disc){4e8, 0.2});
  assert_true(thick < 0.02 * -expm1(-0.01 / 2.0));
  assert_close(thick / thin, 3.580, 0.03);
}

/* Stars add to the pressure by their column times the ratio of dispersions: an old disc like the gas's, as heavy as
 * it, doubles the pressure; at low pressure the share rises by 2^0.92 = 1.892. */
static void stars_add_to_the_pressure(void **state) {
  stage *s = stage_fresh(state);
  set_the_stage(s);
  const disc d = {4e8, 0.2};
  double alone = mean_share_formed(s, &d);
  sample formed = {0};
  for (uint64_t i = 0; i < 300; i++) {
    stage_realization(s, i);
    ew_galaxy *galaxy = galaxy_with(s, &d);
    put_stars(s, galaxy, d.gas, GAS_METALS);
    ew_step step = stage_step(s, galaxy);
    ew_form_stars(&step);
    sample_add(&formed, galaxy->formed - d.gas);
  }
  assert_close(sample_mean(&formed) / d.gas / alone, 1.892, 0.03);
}

/* With so little gas that a step has one cluster at most: masses from 30 Msun up, P(m > 100) = (1/100 - 1/1e4) /
 * (1/30 - 1/1e4) = 0.29789 for dN/dm ~ m^-2. */
enum { CLUSTER_STEPS = 25000 };

static void clusters_have_the_masses_asked_for(void **state) {
  stage *s = stage_fresh(state);
  set_the_stage(s);
  s->settings.model.star_formation.cluster_range[1] = 1e4;
  s->settings.model.star_formation.depletion_time = 10.0;
  double some = 0.0, heavy = 0.0;
  for (uint64_t i = 0; i < CLUSTER_STEPS; i++) {
    double formed = formed_in_a_step(s, &(disc){1.2e5, 1e-3}, i);
    assert_true(formed == 0.0 || formed >= 30.0 * (1.0 - 1e-12));
    assert_true(formed <= 1.01e4);
    some += formed > 0.0;
    heavy += formed > 100.0;
  }
  double several = 0.5 * some / CLUSTER_STEPS; /* share of steps with more than one cluster */
  assert_true(some > 1000.0 && several < 0.04);
  assert_near(heavy / some, 0.29789, SIGMAS * sqrt(0.3 * 0.7 / some) + several);
}

/* No cluster takes more than its share of the gas, and none forms where the lightest would. */
static void clusters_are_limited_by_the_gas(void **state) {
  stage *s = stage_fresh(state);
  set_the_stage(s);
  s->settings.model.star_formation.depletion_time = 0.05;
  s->calendar.step = 0.01;
  for (uint64_t i = 0; i < 2000; i++) {
    assert_true(formed_in_a_step(s, &(disc){200.0, 1e-5}, i) <= 60.0 + 0.3 * 140.0);
    assert_true(formed_in_a_step(s, &(disc){99.0, 1e-5}, i) == 0.0);
  }
}

/* A cluster of 0.3 of its cloud heats the other 0.7: 7/3 of its mass. */
static void clusters_heat_the_rest_of_their_clouds(void **state) {
  stage *s = stage_fresh(state);
  set_the_stage(s);
  ew_galaxy *galaxy = galaxy_with(s, &(disc){1e7, 0.01});
  ew_step step = stage_step(s, galaxy);
  ew_form_stars(&step);
  assert_true(galaxy->formed > 0.0);
  assert_close(mass_in(galaxy, EW_HEATED_GAS), galaxy->formed * 7.0 / 3.0, 1e-9);
  assert_conserved(galaxy);
}

static void nothing_forms_before_recovery(void **state) {
  stage *s = stage_fresh(state);
  set_the_stage(s);
  ew_galaxy *galaxy = galaxy_with(s, &(disc){1e7, 0.01});
  ew_step step = stage_step(s, galaxy);
  galaxy->recovers_at = step.start + 0.001;
  ew_form_stars(&step);
  assert_true(galaxy->formed == 0.0);
}

/* Half-mass radius of the molecular gas over that of all gas, by the fine rings of an exponential disc. */
static double molecular_size_by_rings(const stage *s, const disc *d) {
  double half = 0.5 * molecular_share_by_rings(s, d, INFINITY), low = 0.0, high = 10.0;
  while (high - low > 1e-3) {
    double middle = 0.5 * (low + high);
    *(molecular_share_by_rings(s, d, middle) < half ? &low : &high) = middle;
  }
  return low / 1.67835;
}

/* Radius at which stars are born over that of the gas disc, 1.678 lambda'/sqrt(2) r_vir (Mo, Mao & White 1998). */
static double birth_size(stage *s, const disc *d) {
  ew_galaxy *galaxy = galaxy_with(s, d);
  ew_step step = stage_step(s, galaxy);
  ew_form_stars(&step);
  assert_true(galaxy->formed > 0.0);
  return ew_half_mass_radius(galaxy) / (1.67835 * d->spin / sqrt(2.0) * s->environment.halo.radius);
}

/* Stars are born where the gas is molecular: all over a dense disc, but in the middle of a thin one, where the
 * molecular gas falls off as the column to the power 1 + 2 * 0.92 and so has a scale 2.84 times shorter. */
static void stars_are_born_where_gas_is_molecular(void **state) {
  stage *s = stage_fresh(state);
  set_the_stage(s);
  const disc dense = {1e9, 1e-5}, between = {3e8, 0.02}, thin = {1e9, 0.5};
  const double ring_width = 0.07;
  assert_close(birth_size(s, &dense), 1.0, 1e-3);
  assert_close(birth_size(s, &between), molecular_size_by_rings(s, &between), ring_width);
  assert_close(molecular_size_by_rings(s, &thin), 1.0 / 2.84, 0.02);
  assert_close(birth_size(s, &thin), 1.0 / 2.84, ring_width);
  s->settings.model.sizes.birth_factor = 0.5;
  assert_close(birth_size(s, &dense), 0.5, 1e-3);
}

/* Everything that waits to die. */
static ew_deaths all_pending(const ew_galaxy *galaxy) {
  ew_deaths sum = {0};
  for (size_t k = 0; k < galaxy->pending_count; k++) {
    sum.count += galaxy->pending[k].count;
    sum.energy += galaxy->pending[k].energy;
    for (int i = 0; i < EW_ELEMENT_COUNT; i++) {
      sum.ejected.mass[i] += galaxy->pending[k].ejected.mass[i];
      sum.remnant.mass[i] += galaxy->pending[k].remnant.mass[i];
      sum.made.mass[i] += galaxy->pending[k].made.mass[i];
    }
  }
  return sum;
}

/* What 1 Msun of stars should bring, by the tables. */
typedef struct {
  double number, energy, ejected, remnant, oxygen, iron;
} yield;

static yield yield_by_the_tables(const stage *s) {
  yield y = {.number = ew_supernovae_per_mass(s->stars)};
  for (int bin = 0; bin < EW_SUPERNOVA_BINS; bin++) {
    double number = ew_supernova_bin_number(s->stars, bin);
    ew_death death = ew_supernova_bin_death(s->stars, bin, GAS_METALS);
    y.energy += number * death.energy;
    y.ejected += number * death.ejected;
    y.remnant += number * death.remnant;
    y.oxygen += number * death.made.mass[EW_OXYGEN];
    y.iron += number * death.made.mass[EW_IRON];
  }
  double collapsing = ew_imf_number(40.0, 100.0), mean = ew_imf_mass(40.0, 100.0) / collapsing;
  ew_death collapse = ew_death_of(s->stars, mean, GAS_METALS, false);
  y.ejected += collapsing * collapse.ejected;
  y.remnant += collapsing * collapse.remnant;
  return y;
}

/* Over what is expected of the mass formed. */
typedef struct {
  sample number, energy, ejected, remnant, oxygen, iron;
} harvest;

static void reap(harvest *h, const ew_galaxy *galaxy, const yield *y, double mean_formed) {
  ew_deaths d = all_pending(galaxy);
  double formed = galaxy->formed;
  sample_add(&h->number, (d.count - formed * y->number) / (mean_formed * y->number));
  sample_add(&h->energy, (d.energy - formed * y->energy) / (mean_formed * y->energy));
  sample_add(&h->ejected, (ew_composition_mass(&d.ejected) - formed * y->ejected) / (mean_formed * y->ejected));
  sample_add(&h->remnant, (ew_composition_mass(&d.remnant) - formed * y->remnant) / (mean_formed * y->remnant));
  sample_add(&h->oxygen, (d.made.mass[EW_OXYGEN] - formed * y->oxygen) / (mean_formed * y->oxygen));
  sample_add(&h->iron, (d.made.mass[EW_IRON] - formed * y->iron) / (mean_formed * y->iron));
}

static void assert_as_expected(const sample *excess) {
  assert_mean(excess, 0.0);
  assert_true(sample_error(excess) < 0.02);
}

/* Few clusters in a step, of which those below that mass are drawn star by star. */
static void assert_yields(stage *s, double star_by_star_mass) {
  const disc d = {4.5e5, 0.0016};
  const yield y = yield_by_the_tables(s);
  double mean_formed = expected_mass(s, &d);
  harvest h = {0};
  s->settings.model.mixing = (ew_mixing_parameters){0}; /* yields are not linear in metals all through */
  s->settings.model.star_formation.star_by_star_mass = star_by_star_mass;
  for (uint64_t i = 0; i < 5000; i++) {
    ew_arena_mark mark = ew_arena_tell(s->arena);
    stage_realization(s, i);
    ew_galaxy *galaxy = galaxy_with(s, &d);
    ew_step step = stage_step(s, galaxy);
    ew_form_stars(&step);
    reap(&h, galaxy, &y, mean_formed);
    ew_arena_return(s->arena, mark);
  }
  assert_as_expected(&h.number);
  assert_as_expected(&h.energy);
  assert_as_expected(&h.ejected);
  assert_as_expected(&h.remnant);
  assert_as_expected(&h.oxygen);
  assert_as_expected(&h.iron);
}

/* 0.0101 supernovae of 8 to 40 Msun per Msun formed (Kroupa 2001, 0.1 to 100 Msun). */
static void supernovae_star_by_star_bring_the_mean_yields(void **state) {
  stage *s = stage_fresh(state);
  set_the_stage(s);
  assert_close(ew_supernovae_per_mass(s->stars), 0.0101, 0.01);
  assert_yields(s, 1e6);
}

static void binned_supernovae_bring_the_mean_yields(void **state) {
  stage *s = stage_fresh(state);
  set_the_stage(s);
  assert_yields(s, 0.0);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(mean_mass_formed_is_what_the_law_asks_for),
      cmocka_unit_test(mass_formed_scatters_as_clusters_do),
      cmocka_unit_test(gas_under_high_pressure_is_molecular),
      cmocka_unit_test(molecular_share_rises_with_pressure),
      cmocka_unit_test(stars_add_to_the_pressure),
      cmocka_unit_test(clusters_have_the_masses_asked_for),
      cmocka_unit_test(clusters_are_limited_by_the_gas),
      cmocka_unit_test(clusters_heat_the_rest_of_their_clouds),
      cmocka_unit_test(nothing_forms_before_recovery),
      cmocka_unit_test(stars_are_born_where_gas_is_molecular),
      cmocka_unit_test(supernovae_star_by_star_bring_the_mean_yields),
      cmocka_unit_test(binned_supernovae_bring_the_mean_yields),
  };
  return cmocka_run_group_tests(tests, open_stage, close_stage);
}
