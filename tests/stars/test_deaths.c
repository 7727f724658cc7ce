/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Dying stars: conservation of mass over the whole grid, ejecta that stay positive for any mixture, published models
 * recovered, fates by mass. */
#include "stars/standard.h"

#include "stars/deaths.h"

#define CONSERVATION 1e-12 /* of the initial mass */

/* What a star of that birth mixture ejects of one element. */
static double ejecta_of(const ew_death *death, const ew_composition *birth, int element) {
  return death->made.mass[element] + death->ejected * birth->mass[element];
}

/* The mixture that the models are taken to be born with. */
static ew_composition birth_mixture(double metal_fraction) {
  ew_composition birth = {{0.0}};
  for (int i = EW_CARBON; i < EW_ELEMENT_COUNT; i++)
    birth.mass[i] = ew_solar.mass[i] * metal_fraction / 0.0134;
  birth.mass[EW_HELIUM] = 0.247 + 1.4 * metal_fraction;
  birth.mass[EW_HYDROGEN] = 1.0 - birth.mass[EW_HELIUM] - metal_fraction;
  return birth;
}

static void assert_conserves(const ew_death *death, double mass) {
  assert_close(death->ejected + death->remnant, mass, ROUNDING);
  assert_near(ew_composition_mass(&death->made), 0.0, CONSERVATION * mass);
  assert_true(death->ejected >= 0.0 && death->remnant >= 0.0 && death->energy >= 0.0);
}

static void assert_positive(const ew_death *death, const ew_composition *birth) {
  for (int i = 0; i < EW_ELEMENT_COUNT; i++)
    if (!(ejecta_of(death, birth, i) >= 0.0))
      fail_msg("%s: %.17g made, %.17g ejected", ew_element_name((ew_element)i), death->made.mass[i], death->ejected);
}

/* Every kind of death of one mass and metallicity, from stars of widely different mixtures. */
static void check_deaths(const ew_stars *stars, double mass, double metal_fraction) {
  const ew_composition mixtures[] = {ew_primordial, ew_solar, birth_mixture(metal_fraction), birth_mixture(0.04)};
  for (int strong = 0; strong < 2; strong++) {
    const ew_death deaths[] = {ew_death_of(stars, mass, metal_fraction, strong),
                               ew_death_of_metal_free(stars, mass, 40.0, strong),
                               ew_death_of_metal_free(stars, mass, 100.0, strong)};
    for (size_t i = 0; i < sizeof deaths / sizeof *deaths; i++) {
      assert_conserves(&deaths[i], mass);
      for (size_t k = 0; k < sizeof mixtures / sizeof *mixtures; k++)
        assert_positive(&deaths[i], &mixtures[k]);
      for (int k = EW_CARBON; k < EW_ELEMENT_COUNT; k++)
        assert_true(deaths[i].made.mass[k] >= 0.0);
    }
  }
}

static void check_grid(const ew_stars *stars) {
  static const double metallicities[] = {0.0, 1e-6, 0.0005, 0.001, 0.00238, 0.004, 0.0061, 0.008, 0.0134, 0.02, 0.05};
  for (double mass = 0.3; mass < 400.0; mass *= 1.0137)
    for (size_t z = 0; z < sizeof metallicities / sizeof *metallicities; z++)
      check_deaths(stars, mass, metallicities[z]);
}

static void mass_is_conserved_and_ejecta_are_positive(void **state) {
  check_grid(*state);
}

/* The least mass to hold the yields of 13 Msun, and models held beyond 40 Msun. */
static void also_at_the_ends_of_the_parameters(void **state) {
  (void)state;
  ew_stars_parameters parameters = standard;
  parameters.supernova_mass = 7.0;
  parameters.collapse_mass = 100.0;
  ew_stars *stars = stars_with(parameters);
  check_grid(stars);
  ew_stars_free(stars);
}

/* The promise of the header about what is destroyed of hydrogen and helium. */
static void destruction_stays_below_the_promise(void **state) {
  (void)state;
  ew_stars_parameters parameters = standard;
  parameters.supernova_mass = 7.0;
  ew_stars *stars = stars_with(parameters);
  for (double mass = 7.0; mass < 261.0; mass += 0.05)
    for (double z = 0.0; z < 0.021; z += 0.001) {
      const ew_death deaths[] = {ew_death_of(stars, mass, z, false), ew_death_of(stars, mass, z, true),
                                 ew_death_of_metal_free(stars, mass, 40.0, false)};
      for (size_t i = 0; i < sizeof deaths / sizeof *deaths; i++) {
        assert_true(deaths[i].made.mass[EW_HYDROGEN] >= -0.38 * deaths[i].ejected);
        assert_true(deaths[i].made.mass[EW_HELIUM] >= -0.12 * deaths[i].ejected);
      }
    }
  ew_stars_free(stars);
}

/* Nomoto, Kobayashi & Tominaga 2013, ARA&A 51, 457: total ejecta of four models. The made mass comes on top of that
 * which the explosion, not the wind, throws out of the birth mixture. */
static void published_ejecta_are_recovered(void **state) {
  const ew_stars *stars = *state;
  static const struct {
    double mass, metal_fraction;
    bool hypernova;
    double energy, remnant, ejecta, carbon, oxygen, magnesium, iron, helium;
  } published[] = {
      {25.0, 0.001, false, 1.0, 1.910, 22.508, 0.2153, 3.818, 0.1823, 7.393e-2, 6.974},
      {13.0, 0.004, false, 1.0, 1.610, 11.255, 8.802e-2, 0.3874, 4.643e-2, 7.493e-2, 4.035},
      {40.0, 0.02, true, 30.0, 2.670, 19.165, 0.4901, 7.058, 0.4469, 0.2934, 4.780},
      {20.0, 0.0, true, 10.0, 1.880, 18.118, 0.1902, 2.031, 0.1657, 8.490e-2, 5.955},
  };
  for (size_t i = 0; i < sizeof published / sizeof *published; i++) {
    ew_death death = ew_death_of(stars, published[i].mass, published[i].metal_fraction, published[i].hypernova);
    ew_composition birth = birth_mixture(published[i].metal_fraction);
    assert_close(death.energy, published[i].energy, ROUNDING);
    assert_close(death.remnant, published[i].remnant, ROUNDING);
    death.ejected = published[i].ejecta;
    assert_close(ejecta_of(&death, &birth, EW_CARBON), published[i].carbon, ROUNDING);
    assert_close(ejecta_of(&death, &birth, EW_OXYGEN), published[i].oxygen, ROUNDING);
    assert_close(ejecta_of(&death, &birth, EW_MAGNESIUM), published[i].magnesium, ROUNDING);
    assert_close(ejecta_of(&death, &birth, EW_IRON), published[i].iron, ROUNDING);
    assert_close(ejecta_of(&death, &birth, EW_HELIUM), published[i].helium, ROUNDING);
  }
}

typedef struct {
  double metal_fraction, mass, energy, remnant, ejecta, hydrogen, helium, listed[7], metals;
} published_model;

static const published_model supernovae[] = {
#include "stars/tables/supernovae.inc"
};
static const published_model hypernovae[] = {
#include "stars/tables/hypernovae.inc"
};

/* A slip in copying would show in the sums: hydrogen, helium and metals make up the ejecta to the rounding of four
 * digits, and what leaves with the remnant never exceeds the star. */
static void assert_rows_add_up(const published_model *row, size_t count) {
  for (size_t i = 0; i < count; i++) {
    const double rounding = 5.5e-3;
    assert_near(row[i].hydrogen + row[i].helium + row[i].metals, row[i].ejecta, rounding);
    assert_true(row[i].ejecta + row[i].remnant <= row[i].mass + rounding);
    double listed = 0.0;
    for (int k = 0; k < 7; k++)
      listed += row[i].listed[k];
    assert_true(listed < row[i].metals);
  }
}

static void published_tables_add_up(void **state) {
  (void)state;
  assert_rows_add_up(supernovae, sizeof supernovae / sizeof *supernovae);
  assert_rows_add_up(hypernovae, sizeof hypernovae / sizeof *hypernovae);
}

/* Every model stands at its own place in the grid, with the hydrogen that was published. */
static void every_model_is_at_its_place(void **state) {
  const ew_stars *stars = *state;
  const double rounding = 5.5e-3; /* hydrogen takes up that of the other elements */
  enum { NORMAL = sizeof supernovae / sizeof *supernovae, ALL = NORMAL + sizeof hypernovae / sizeof *hypernovae };
  for (size_t i = 1; i < ALL; i++) {
    const published_model *row = i < NORMAL ? &supernovae[i] : &hypernovae[i - NORMAL];
    ew_death death = ew_death_of(stars, row->mass, row->metal_fraction, i >= NORMAL);
    ew_composition birth = birth_mixture(row->metal_fraction);
    assert_close(death.remnant, row->remnant, ROUNDING);
    death.ejected = row->ejecta;
    assert_near(ejecta_of(&death, &birth, EW_HYDROGEN), row->hydrogen, rounding);
    assert_close(ejecta_of(&death, &birth, EW_IRON), row->listed[6], ROUNDING);
  }
}

static void assert_mean(const ew_death *middle, const ew_death *one, const ew_death *other) {
  assert_close(middle->remnant, 0.5 * (one->remnant + other->remnant), ROUNDING);
  for (int i = 0; i < EW_ELEMENT_COUNT; i++)
    assert_close(middle->made.mass[i], 0.5 * (one->made.mass[i] + other->made.mass[i]), ROUNDING);
}

static void interpolation_is_linear_in_mass_and_metallicity(void **state) {
  const ew_stars *stars = *state;
  ew_death low = ew_death_of(stars, 25.0, 0.004, true), high = ew_death_of(stars, 30.0, 0.004, true);
  ew_death middle = ew_death_of(stars, 27.5, 0.004, true);
  assert_mean(&middle, &low, &high);
  low = ew_death_of(stars, 18.0, 0.0, false);
  high = ew_death_of(stars, 18.0, 0.001, false);
  middle = ew_death_of(stars, 18.0, 0.0005, false);
  assert_mean(&middle, &low, &high);
}

static void lowest_model_is_held_below(void **state) {
  const ew_stars *stars = *state;
  ew_death lowest = ew_death_of(stars, 13.0, 0.002385, false), lighter = ew_death_of(stars, 8.0, 0.002385, false);
  for (int i = 0; i < EW_ELEMENT_COUNT; i++)
    assert_close(lighter.made.mass[i], lowest.made.mass[i], ROUNDING);
  assert_close(lighter.remnant, lowest.remnant, ROUNDING);
  assert_close(lighter.ejected, lowest.ejected - 5.0, ROUNDING);
}

static void metal_free_stars_have_a_model_more(void **state) {
  const ew_stars *stars = *state;
  ew_death death = ew_death_of_metal_free(stars, 11.0, 40.0, false); /* Nomoto et al. 2013, Z = 0, 11 Msun */
  assert_close(death.made.mass[EW_IRON], 1.046e-2, ROUNDING);
  assert_close(death.remnant, 1.5, ROUNDING);
  death = ew_death_of_metal_free(stars, 12.0, 40.0, false);
  assert_close(death.made.mass[EW_IRON], 0.5 * (1.046e-2 + 7.173e-2), ROUNDING);
  for (double mass = 13.0; mass <= 40.0; mass += 0.9) {
    ew_death metal_free = ew_death_of_metal_free(stars, mass, 40.0, true), normal = ew_death_of(stars, mass, 0.0, true);
    assert_memory_equal(&metal_free.made, &normal.made, sizeof normal.made);
  }
}

static void fate_follows_mass(void **state) {
  const ew_stars *stars = *state;
  assert_int_equal(ew_death_of(stars, 7.99, 0.001, true).fate, EW_FATE_WHITE_DWARF);
  assert_int_equal(ew_death_of(stars, 8.0, 0.001, true).fate, EW_FATE_CORE_COLLAPSE);
  assert_int_equal(ew_death_of(stars, 19.99, 0.001, true).fate, EW_FATE_CORE_COLLAPSE);
  assert_int_equal(ew_death_of(stars, 20.0, 0.001, false).fate, EW_FATE_CORE_COLLAPSE);
  assert_int_equal(ew_death_of(stars, 20.0, 0.001, true).fate, EW_FATE_HYPERNOVA);
  assert_int_equal(ew_death_of(stars, 40.01, 0.001, true).fate, EW_FATE_COLLAPSE);
}

static void fate_of_metal_free_stars_follows_mass(void **state) {
  const ew_stars *stars = *state;
  assert_int_equal(ew_death_of_metal_free(stars, 7.99, 25.0, false).fate, EW_FATE_WHITE_DWARF);
  assert_int_equal(ew_death_of_metal_free(stars, 25.0, 25.0, false).fate, EW_FATE_CORE_COLLAPSE);
  assert_int_equal(ew_death_of_metal_free(stars, 25.0, 25.0, true).fate, EW_FATE_HYPERNOVA);
  assert_int_equal(ew_death_of_metal_free(stars, 25.01, 25.0, true).fate, EW_FATE_COLLAPSE);
  assert_int_equal(ew_death_of_metal_free(stars, 139.9, 25.0, true).fate, EW_FATE_COLLAPSE);
  assert_int_equal(ew_death_of_metal_free(stars, 140.0, 25.0, true).fate, EW_FATE_PAIR_INSTABILITY);
  assert_int_equal(ew_death_of_metal_free(stars, 260.0, 25.0, true).fate, EW_FATE_PAIR_INSTABILITY);
  assert_int_equal(ew_death_of_metal_free(stars, 260.1, 25.0, true).fate, EW_FATE_COLLAPSE);
  assert_int_equal(ew_death_of_metal_free(stars, 260.1, 500.0, true).fate, EW_FATE_COLLAPSE);
}

/* Renzini & Ciotti 1993: 0.077 m + 0.48 Msun. */
static void light_stars_leave_white_dwarfs(void **state) {
  const ew_stars *stars = *state;
  ew_death death = ew_death_of(stars, 2.0, 0.01, false);
  assert_close(death.remnant, 0.634, ROUNDING);
  assert_true(death.energy == 0.0);
  assert_true(ew_composition_metals(&death.made) == 0.0);
  assert_true(ew_death_of(stars, 0.2385, 0.01, false).ejected == 0.0);
}

/* Wind of the 40 Msun models: 40 - 2.21 - 19.622 Msun at Z = 0.02, nothing without metals. */
static void collapse_returns_the_wind_only(void **state) {
  const ew_stars *stars = *state;
  ew_death death = ew_death_of(stars, 60.0, 0.02, true);
  assert_close(death.ejected, 1.5 * 18.168, ROUNDING);
  assert_true(death.energy == 0.0 && death.made.mass[EW_IRON] == 0.0);
  assert_true(ew_death_of(stars, 60.0, 0.0, true).ejected == 0.0);
  assert_true(ew_death_of_metal_free(stars, 60.0, 40.0, true).ejected == 0.0);
}

/* Heger & Woosley 2002, ApJ 567, 532, Table 3, helium core of 100 Msun, and halfway to that of 105; no remnant. Helium
 * left in the core takes up what the published sums miss, here 0.01 Msun. */
static void published_pair_instability(void **state) {
  const ew_stars *stars = *state;
  const double mass = 20.0 + 100.0 * 24.0 / 13.0;
  ew_death death = ew_death_of_metal_free(stars, mass, 40.0, false);
  assert_true(death.remnant == 0.0 && death.ejected == mass);
  assert_close(death.made.mass[EW_OXYGEN], 43.9, ROUNDING);
  assert_close(death.made.mass[EW_MAGNESIUM], 4.416, ROUNDING);
  assert_close(death.made.mass[EW_IRON], 5.978, ROUNDING);
  assert_close(ew_composition_metals(&death.made), 98.52, ROUNDING);
  double envelope_helium = (mass - 100.0) * 0.247;
  assert_near(ejecta_of(&death, &ew_primordial, EW_HELIUM) - envelope_helium, 1.470, 0.011);
  assert_near(ejecta_of(&death, &ew_primordial, EW_HYDROGEN), (mass - 100.0) * 0.753, CONSERVATION * mass);
  death = ew_death_of_metal_free(stars, mass + 2.5 * 24.0 / 13.0, 40.0, false);
  assert_close(death.made.mass[EW_IRON], 0.5 * (5.978 + 9.762), ROUNDING);
}

/* The linear fit to the energies of those models at its ends: 6.3e51 and 91e51 erg. */
static void pair_instability_energies(void **state) {
  const ew_stars *stars = *state;
  assert_near(ew_death_of_metal_free(stars, 140.0, 40.0, false).energy, 6.3, 0.01);
  assert_near(ew_death_of_metal_free(stars, 260.0, 40.0, false).energy, 91.1, 0.05);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(mass_is_conserved_and_ejecta_are_positive),
      cmocka_unit_test(also_at_the_ends_of_the_parameters),
      cmocka_unit_test(destruction_stays_below_the_promise),
      cmocka_unit_test(published_ejecta_are_recovered),
      cmocka_unit_test(published_tables_add_up),
      cmocka_unit_test(every_model_is_at_its_place),
      cmocka_unit_test(interpolation_is_linear_in_mass_and_metallicity),
      cmocka_unit_test(lowest_model_is_held_below),
      cmocka_unit_test(metal_free_stars_have_a_model_more),
      cmocka_unit_test(fate_follows_mass),
      cmocka_unit_test(fate_of_metal_free_stars_follows_mass),
      cmocka_unit_test(light_stars_leave_white_dwarfs),
      cmocka_unit_test(collapse_returns_the_wind_only),
      cmocka_unit_test(published_pair_instability),
      cmocka_unit_test(pair_instability_energies),
  };
  return cmocka_run_group_tests(tests, open_standard, close_standard);
}
