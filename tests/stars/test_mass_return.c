/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Mass returned by old stars: against quadrature over the IMF, its limits, and the fraction of population models. */
#include "stars/standard.h"

static const double metallicities[] = {0.0, 0.0004, 0.001, 0.004, 0.0134, 0.05};
enum { METALLICITIES = sizeof metallicities / sizeof *metallicities };

static double white_dwarf_mass_density(double mass, void *context) {
  (void)context;
  return (0.077 * mass + 0.48) * kroupa_shape(mass);
}

/* Table steps are 2 per cent in age; the kinks of the lifetimes between them are cut by linear interpolation. */
static void tables_agree_with_quadrature(void **state) {
  const ew_stars *stars = *state;
  const double interpolation = 2e-5; /* Msun per Msun formed */
  double norm = kroupa_normalisation();
  for (double age = 0.05; age < 19.0; age *= 1.37) {
    double dying = ew_mass_dying_at(stars, age, 0.004);
    double white_dwarfs = norm * quadrature(white_dwarf_mass_density, NULL, dying, 8.0);
    double mass = norm * quadrature(kroupa_mass_density, NULL, dying, 8.0);
    assert_near(ew_white_dwarf_mass(stars, age, 0.004), white_dwarfs, interpolation);
    assert_near(ew_returned_mass(stars, age, 0.004), mass - white_dwarfs, interpolation);
  }
}

static void living_returned_and_white_dwarfs_are_all(void **state) {
  const ew_stars *stars = *state;
  const double interpolation = 1e-3; /* Msun per Msun formed, between the metallicities of the table */
  for (int z = 0; z < METALLICITIES; z++)
    for (double age = 0.06; age < 14.0; age *= 1.1) {
      double living = ew_imf_mass(0.1, ew_mass_dying_at(stars, age, metallicities[z]));
      double dead = ew_returned_mass(stars, age, metallicities[z]) + ew_white_dwarf_mass(stars, age, metallicities[z]);
      assert_near(living + dead, ew_imf_mass(0.1, 8.0), interpolation);
    }
}

static void both_grow_with_age(void **state) {
  const ew_stars *stars = *state;
  for (int z = 0; z < METALLICITIES; z++)
    for (double age = 1e-4, returned = 0.0, white_dwarfs = 0.0; age < 30.0; age *= 1.003) {
      double more_returned = ew_returned_mass(stars, age, metallicities[z]);
      double more_white_dwarfs = ew_white_dwarf_mass(stars, age, metallicities[z]);
      assert_true(more_returned >= returned && more_white_dwarfs >= white_dwarfs);
      returned = more_returned;
      white_dwarfs = more_white_dwarfs;
    }
}

static void nothing_before_the_first_white_dwarf(void **state) {
  const ew_stars *stars = *state;
  for (int z = 0; z < METALLICITIES; z++) {
    double first = ew_lifetime(stars, 8.0, metallicities[z]);
    if (metallicities[z] == 0.004 || metallicities[z] == 0.05)
      assert_true(ew_returned_mass(stars, 0.98 * first, metallicities[z]) == 0.0);
    assert_true(ew_returned_mass(stars, 1.02 * first, metallicities[z]) > 0.0);
    assert_true(ew_returned_mass(stars, 0.0, metallicities[z]) == 0.0);
    assert_true(ew_returned_mass(stars, 50.0, metallicities[z]) == ew_returned_mass(stars, 20.0, metallicities[z]));
  }
}

/* Surviving fractions of 0.565 to 0.59 at 13.5 Gyr, integrated over PARSEC isochrones (Bressan et al. 2012, MNRAS 427,
 * 127) for the same IMF: 0.435 of the mass is returned at the lowest metallicity, 0.42 at Z = 0.004, 0.41 at solar.
 * They let stars above 40 Msun return half of their mass, 0.030 Msun per Msun formed, where here only the wind is. */
static void total_return_resembles_population_models(void **state) {
  const ew_stars *stars = *state;
  static const double published[][2] = {{0.0001, 0.435}, {0.004, 0.42}, {0.02, 0.41}};
  const double between_models = 0.04;
  for (size_t i = 0; i < sizeof published / sizeof *published; i++) {
    double z = published[i][0], mean_mass = ew_imf_mass(40.0, 100.0) / ew_imf_number(40.0, 100.0);
    double sum = ew_returned_mass(stars, 13.5, z);
    for (int bin = 0; bin < EW_SUPERNOVA_BINS; bin++)
      sum += ew_supernova_bin_number(stars, bin) * ew_supernova_bin_death(stars, bin, z).ejected;
    sum += ew_imf_number(40.0, 100.0) * ew_death_of(stars, mean_mass, z, false).ejected;
    assert_near(sum, published[i][1], between_models);
  }
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(tables_agree_with_quadrature),
      cmocka_unit_test(living_returned_and_white_dwarfs_are_all),
      cmocka_unit_test(both_grow_with_age),
      cmocka_unit_test(nothing_before_the_first_white_dwarf),
      cmocka_unit_test(total_return_resembles_population_models),
  };
  return cmocka_run_group_tests(tests, open_standard, close_standard);
}
