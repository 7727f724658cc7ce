/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Supernovae in bins: they add up to all supernovae and to the integral over single stars, and give the enrichment
 * known for these yields. */
#include "stars/standard.h"

/* What a population forms or ejects per Msun formed, as one number of a death. */
typedef double (*quantity)(const ew_death *death);

static double iron_of(const ew_death *death) {
  return death->made.mass[EW_IRON];
}
static double magnesium_of(const ew_death *death) {
  return death->made.mass[EW_MAGNESIUM];
}
static double oxygen_of(const ew_death *death) {
  return death->made.mass[EW_OXYGEN];
}
static double hydrogen_of(const ew_death *death) {
  return death->made.mass[EW_HYDROGEN];
}
static double metals_of(const ew_death *death) {
  return ew_composition_metals(&death->made);
}
static double ejected_of(const ew_death *death) {
  return death->ejected;
}
static double remnant_of(const ew_death *death) {
  return death->remnant;
}
static double energy_of(const ew_death *death) {
  return death->energy;
}

/* Integral over single stars, weighted with their number; below `full_from` fewer and fewer count, none at `first`. */
typedef struct {
  const ew_stars *stars;
  quantity of;
  double metal_fraction, first, full_from;
} integral;

static double integrand(double mass, void *context) {
  const integral *over = context;
  ew_death ordinary = ew_death_of(over->stars, mass, over->metal_fraction, false);
  ew_death strong = ew_death_of(over->stars, mass, over->metal_fraction, true);
  double hypernovae = ew_stars_get(over->stars)->hypernova_fraction;
  double share = mass < over->full_from ? (mass - over->first) / (over->full_from - over->first) : 1.0;
  return share * kroupa_shape(mass) * ((1.0 - hypernovae) * over->of(&ordinary) + hypernovae * over->of(&strong));
}

static double integrate(integral over) {
  static const double smooth_between[] = {8.0, 10.0, 13.0, 15.0, 18.0, 20.0, 25.0, 30.0, 40.0};
  double sum = 0.0;
  for (size_t i = 0; i + 1 < sizeof smooth_between / sizeof *smooth_between; i++)
    if (smooth_between[i] >= over.first)
      sum += quadrature(integrand, &over, smooth_between[i], smooth_between[i + 1]);
  return kroupa_normalisation() * sum;
}

static double sum_over_bins(const ew_stars *stars, quantity of, double metal_fraction) {
  double sum = 0.0;
  for (int i = 0; i < EW_SUPERNOVA_BINS; i++) {
    ew_death death = ew_supernova_bin_death(stars, i, metal_fraction);
    sum += ew_supernova_bin_number(stars, i) * of(&death);
  }
  return sum;
}

static void bins_cover_all_supernovae(void **state) {
  const ew_stars *stars = *state;
  double sum = 0.0;
  for (int i = 0; i < EW_SUPERNOVA_BINS; i++) {
    assert_true(ew_supernova_bin_edge(stars, i) < ew_supernova_bin_edge(stars, i + 1));
    sum += ew_supernova_bin_number(stars, i);
  }
  assert_true(ew_supernova_bin_edge(stars, 0) == 8.0);
  assert_true(ew_supernova_bin_edge(stars, EW_SUPERNOVA_BINS) == 40.0);
  assert_close(sum, ew_supernovae_per_mass(stars), ROUNDING);
  assert_close(ew_supernovae_per_mass(stars), ew_imf_number(8.0, 40.0), ROUNDING);
}

static void bins_are_even_in_log_lifetime(void **state) {
  const ew_stars *stars = *state;
  const double inverse_tolerance = 1e-10; /* of mass from lifetime */
  double step = pow(ew_lifetime(stars, 40.0, 0.0) / ew_lifetime(stars, 8.0, 0.0), 1.0 / EW_SUPERNOVA_BINS);
  for (int i = 0; i < EW_SUPERNOVA_BINS; i++)
    assert_close(ew_lifetime(stars, ew_supernova_bin_edge(stars, i + 1), 0.0),
                 step * ew_lifetime(stars, ew_supernova_bin_edge(stars, i), 0.0), inverse_tolerance);
}

static void bins_reproduce_the_integral_over_stars(void **state) {
  const ew_stars *stars = *state;
  static const quantity quantities[] = {iron_of, oxygen_of, hydrogen_of, metals_of, ejected_of, remnant_of, energy_of};
  static const double metallicities[] = {0.0, 0.000385, 0.001, 0.002385, 0.0134, 0.03};
  const double quadrature_tolerance = 1e-9;
  for (size_t i = 0; i < sizeof quantities / sizeof *quantities; i++)
    for (size_t z = 0; z < sizeof metallicities / sizeof *metallicities; z++) {
      integral over = {stars, quantities[i], metallicities[z], 8.0, 8.0};
      assert_close(sum_over_bins(stars, quantities[i], metallicities[z]), integrate(over), quadrature_tolerance);
    }
}

static void mean_deaths_conserve_mass(void **state) {
  const ew_stars *stars = *state;
  for (int i = 0; i < EW_SUPERNOVA_BINS; i++)
    for (double z = 0.0; z < 0.03; z += 0.0007) {
      ew_death death = ew_supernova_bin_death(stars, i, z);
      double low = ew_supernova_bin_edge(stars, i), high = ew_supernova_bin_edge(stars, i + 1);
      double mass = ew_imf_mass(low, high) / ew_imf_number(low, high);
      assert_close(death.ejected + death.remnant, mass, 1e-12);
      assert_near(ew_composition_mass(&death.made), 0.0, 1e-12 * mass);
      assert_int_equal(death.fate, EW_FATE_CORE_COLLAPSE);
      for (int k = 0; k < EW_ELEMENT_COUNT; k++)
        assert_true(death.made.mass[k] + death.ejected * ew_primordial.mass[k] >= 0.0);
    }
}

/* Total ejecta per Msun formed, with stars exploding as in the original tables: 13 Msun yields fall to nothing at 10.
 */
static double total_ejecta(const ew_stars *stars, quantity made, double initial_fraction) {
  double kept = integrate((integral){stars, ejected_of, 0.001, 10.0, 13.0});
  return integrate((integral){stars, made, 0.001, 10.0, 13.0}) + initial_fraction * kept;
}

/* Yields of Nomoto, Kobayashi & Tominaga 2013 at Z = 0.001, half of the stars above 20 Msun hypernovae, per Msun of a
 * Kroupa IMF, integrated independently from the published total ejecta. */
static void enrichment_with_the_original_mass_limit(void **state) {
  const ew_stars *stars = *state;
  const double wind = 0.005; /* ours holds the wind too */
  const double scale = 0.001 / 0.0134;
  assert_close(total_ejecta(stars, oxygen_of, scale * ew_solar.mass[EW_OXYGEN]), 0.01097, wind);
  assert_close(total_ejecta(stars, magnesium_of, scale * ew_solar.mass[EW_MAGNESIUM]), 9.03e-4, wind);
  assert_close(total_ejecta(stars, iron_of, scale * ew_solar.mass[EW_IRON]), 5.36e-4, wind);
  assert_close(total_ejecta(stars, metals_of, 0.001), 0.01704, wind);
}

static double magnesium_over_iron(double magnesium, double iron) {
  ew_composition made = {{[EW_MAGNESIUM] = magnesium, [EW_IRON] = iron}};
  return ew_abundance(&made, EW_MAGNESIUM, EW_IRON);
}

/* The same integration gives [Mg/Fe] = 0.49, 0.45 with the 13 Msun yields held down to 10 Msun, and 0.40 with them held
 * to 8 Msun. The last lies where old stars of dwarf galaxies and the halo do, 0.3 to 0.4 (Tolstoy, Hill & Tosi 2009,
 * ARA&A 47, 371). */
static void plateau_of_magnesium_over_iron(void **state) {
  const ew_stars *stars = *state;
  const double last_digit = 0.01;
  double magnesium = integrate((integral){stars, magnesium_of, 0.001, 10.0, 13.0});
  double iron = integrate((integral){stars, iron_of, 0.001, 10.0, 13.0});
  assert_near(magnesium_over_iron(magnesium, iron), 0.49, last_digit);
  magnesium = integrate((integral){stars, magnesium_of, 0.001, 10.0, 10.0});
  iron = integrate((integral){stars, iron_of, 0.001, 10.0, 10.0});
  assert_near(magnesium_over_iron(magnesium, iron), 0.45, last_digit);
  magnesium = sum_over_bins(stars, magnesium_of, 0.001);
  iron = sum_over_bins(stars, iron_of, 0.001);
  assert_near(magnesium_over_iron(magnesium, iron), 0.40, last_digit);
}

static void hypernovae_matter_above_20_only(void **state) {
  (void)state;
  ew_stars_parameters none = standard, all = standard;
  none.hypernova_fraction = 0.0;
  all.hypernova_fraction = 1.0;
  ew_stars *without = stars_with(none), *with = stars_with(all);
  for (int i = 0; i < EW_SUPERNOVA_BINS; i++) {
    double energy = ew_supernova_bin_death(with, i, 0.004).energy;
    assert_close(ew_supernova_bin_death(without, i, 0.004).energy, 1.0, ROUNDING);
    if (ew_supernova_bin_edge(with, i + 1) <= 20.0)
      assert_close(energy, 1.0, ROUNDING);
    if (ew_supernova_bin_edge(with, i) >= 20.0)
      assert_true(energy >= 10.0);
  }
  ew_stars_free(without);
  ew_stars_free(with);
}

/* Stars beyond the models count with the last one. */
static void bins_reach_beyond_the_models(void **state) {
  (void)state;
  ew_stars_parameters parameters = standard;
  parameters.collapse_mass = 100.0;
  ew_stars *stars = stars_with(parameters);
  int last = EW_SUPERNOVA_BINS - 1;
  assert_true(ew_supernova_bin_edge(stars, last) > 40.0);
  double expected = 0.5 * (ew_death_of(stars, 40.0, 0.001, false).made.mass[EW_OXYGEN] +
                           ew_death_of(stars, 40.0, 0.001, true).made.mass[EW_OXYGEN]);
  assert_close(ew_supernova_bin_death(stars, last, 0.001).made.mass[EW_OXYGEN], expected, ROUNDING);
  ew_stars_free(stars);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(bins_cover_all_supernovae),
      cmocka_unit_test(bins_are_even_in_log_lifetime),
      cmocka_unit_test(bins_reproduce_the_integral_over_stars),
      cmocka_unit_test(mean_deaths_conserve_mass),
      cmocka_unit_test(enrichment_with_the_original_mass_limit),
      cmocka_unit_test(plateau_of_magnesium_over_iron),
      cmocka_unit_test(hypernovae_matter_above_20_only),
      cmocka_unit_test(bins_reach_beyond_the_models),
  };
  return cmocka_run_group_tests(tests, open_standard, close_standard);
}
