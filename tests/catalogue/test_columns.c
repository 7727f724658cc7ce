/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The column tables: the names that scripts rely on, and that each column has a field of its own. */
#include "elfinwood/catalogue.h"
#include "look.h"

/* The interface, in order: a change here is a change for every script. */
static const char *const galaxy_names[] = {
    "tree",
    "realization",
    "branch",
    "halo_id",
    "central",
    "weight",
    "halo_mass",
    "peak_halo_mass",
    "stellar_mass",
    "stellar_mass_formed",
    "gas_mass",
    "luminosity_v",
    "magnitude_v",
    "metallicity",
    "metallicity_spread",
    "carbon",
    "nitrogen",
    "oxygen",
    "magnesium",
    "silicon",
    "calcium",
    "half_light_radius",
    "velocity_dispersion",
    "time_50",
    "time_90",
    "first_star_fraction",
    "luminous_mergers",
    "dark_mergers",
    "last_merger_redshift",
    "formation_redshift",
    "reionization_redshift",
    "streaming_velocity",
    "quenched",
};

static void test_names_are_those_of_the_interface(void **state) {
  (void)state;
  assert_int_equal(ew_galaxy_column_count, sizeof galaxy_names / sizeof galaxy_names[0]);
  for (size_t i = 0; i < ew_galaxy_column_count; i++)
    assert_string_equal(ew_galaxy_columns[i].name, galaxy_names[i]);
}

static void check_table(const ew_column *columns, size_t count, size_t row_size) {
  for (size_t i = 0; i < count; i++) {
    assert_true(columns[i].offset % 8 == 0 && columns[i].offset + 8 <= row_size);
    assert_true(strlen(columns[i].unit) > 0 && strlen(columns[i].meaning) > 10);
    for (size_t j = 0; j < i; j++) {
      assert_int_not_equal(columns[i].offset, columns[j].offset);
      assert_string_not_equal(columns[i].name, columns[j].name);
    }
  }
}

static void test_each_column_has_its_own_field_unit_and_meaning(void **state) {
  (void)state;
  check_table(ew_galaxy_columns, ew_galaxy_column_count, sizeof(ew_galaxy_row));
  check_table(ew_tree_columns, ew_tree_column_count, sizeof(ew_tree_row));
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(test_names_are_those_of_the_interface),
      cmocka_unit_test(test_each_column_has_its_own_field_unit_and_meaning),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
