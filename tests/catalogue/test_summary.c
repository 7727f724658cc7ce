/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The closing tables: quantiles from cells against sorted values, and what the printed lines say of invented rows. */
#include "catalogue/distribution.h"
#include "elfinwood/catalogue.h"
#include "look.h"

#include <math.h>

/* ---------------------------------------------------------------------------------------------------- distributions */

static const ew_distribution_range range = {-5.0, 11.0};
static const double cell = 16.0 / EW_DISTRIBUTION_CELLS;

/* Values i / 100 for i = 0..99, each in a cell of its own: quantiles are exact, between the steps at multiples of 1 %.
 */
static void test_quantiles_of_lone_values_are_exact(void **state) {
  (void)state;
  ew_distribution *distribution = calloc(1, sizeof *distribution);
  for (int i = 0; i < 100; i++)
    ew_distribution_add(distribution, range, 0.01 * ((i * 37) % 100), 1.0);
  for (int i = 0; i < 100; i++)
    assert_true(ew_distribution_quantile(distribution, 0.01 * i + 0.005) == 0.01 * i);
  free(distribution);
}

/* Ten thousand values share cells: quantiles are good to the width of one. */
static void test_quantiles_are_good_to_a_cell(void **state) {
  (void)state;
  ew_distribution *distribution = calloc(1, sizeof *distribution);
  for (int i = 0; i < 10000; i++)
    ew_distribution_add(distribution, range, 1e-4 * ((i * 37) % 10000), 2.385);
  for (double share = 0.005; share < 1.0; share += 0.01)
    assert_true(fabs(ew_distribution_quantile(distribution, share) - share) <= cell);
  free(distribution);
}

static void test_weights_count(void **state) {
  (void)state;
  ew_distribution *distribution = calloc(1, sizeof *distribution);
  ew_distribution_add(distribution, range, 2.0, 1.0);
  ew_distribution_add(distribution, range, 7.0, 3.0);
  assert_true(fabs(ew_distribution_quantile(distribution, 0.2) - 2.0) <= cell);
  assert_true(fabs(ew_distribution_quantile(distribution, 0.3) - 7.0) <= cell);
  free(distribution);
}

static void test_values_without_a_place(void **state) {
  (void)state;
  ew_distribution *distribution = calloc(1, sizeof *distribution);
  ew_distribution_add(distribution, range, (double)NAN, 1.0);
  ew_distribution_add(distribution, range, -(double)INFINITY, 1.0);
  assert_true(distribution->total == 0.0);
  assert_true(isnan(ew_distribution_quantile(distribution, 0.5)));
  ew_distribution_add(distribution, range, 99.0, 1.0);
  ew_distribution_add(distribution, range, -99.0, 9.0);
  assert_true(ew_distribution_quantile(distribution, 0.5) == -99.0);
  assert_true(ew_distribution_quantile(distribution, 1.0) == 99.0);
  free(distribution);
}

/* ----------------------------------------------------------------------------------------------------------- tables */

static ew_galaxy_row galaxy(double halo_mass, double luminosity, double metallicity) {
  ew_galaxy_row row = {.central = 1, .weight = 1.0, .halo_mass = halo_mass};
  row.observed.luminosity_v = luminosity;
  row.observed.stellar_mass = 2.0 * luminosity;
  row.observed.metallicity = metallicity;
  row.observed.half_light_radius = 243.2;
  row.observed.velocity_dispersion = 7.31;
  row.observed.time_90 = 3.14;
  return row;
}

/* The summary of these rows as printed; free it. */
static char *printed(const ew_galaxy_row *rows, size_t count) {
  char *text = NULL;
  size_t size;
  ew_summary *summary = ew_summary_new();
  assert_non_null(summary);
  FILE *out = open_memstream(&text, &size);
  assert_non_null(out);
  ew_summary_add(summary, rows, count);
  ew_summary_print(summary, out);
  assert_int_equal(fclose(out), 0);
  ew_summary_free(summary);
  return text;
}

static void assert_line(const char *text, const char *line) {
  if (!strstr(text, line))
    fail_msg("no line \"%s\" in\n%s", line, text);
}

static void test_lines_hold_numbers_medians_and_shares(void **state) {
  (void)state;
  const ew_galaxy_row rows[] = {
      galaxy(2e8, 0.0, (double)NAN), galaxy(2e8, 500.0, -3.0), galaxy(2e8, 700.0, -2.5),
      galaxy(2e8, 999.0, -2.0),      galaxy(4e9, 2e6, -1.5),   galaxy(4e9, 3e6, (double)NAN),
  };
  char *text = printed(rows, sizeof rows / sizeof rows[0]);
  assert_line(text, "\nno stars            1\n");
  assert_line(text, "\n1e2 - 1e3           3  -2.50 (-3.00 -2.00)  243 (243 243)      7.31 (7.31 7.31)   3.14 (");
  assert_line(text, "\n1e6 - 1e7           2  -1.50 (-1.50 -1.50)");
  assert_line(text, "\n1e8 - 3e8           4     0.750  1.40e+03\n");
  assert_line(text, "\n3e9 - 1e10          2     1.000  4.00e+06\n");
  free(text);
}

static void test_only_centrals_count_and_by_weight(void **state) {
  (void)state;
  ew_galaxy_row rows[] = {galaxy(2e10, 2e5, -2.0), galaxy(2e10, 2e5, -1.0), galaxy(2e10, 0.0, (double)NAN)};
  rows[0].central = 0;
  rows[1].weight = 2.5;
  rows[2].weight = 7.5;
  char *text = printed(rows, 3);
  assert_line(text, "\nno stars         7.50\n");
  assert_line(text, "\n1e5 - 1e6        2.50  -1.00 (");
  assert_line(text, "\n1e10 - 3e10        10     0.250  4.00e+05\n");
  free(text);
}

/* Extreme rows: the page stays within 100 columns and the last bins are open. */
static void test_lines_fit_a_page(void **state) {
  (void)state;
  ew_galaxy_row rows[] = {galaxy(9e17, 3e14, -10.25), galaxy(1.0, 1e-7, -10.25), galaxy(1e11, 1e11, -10.25)};
  for (size_t i = 0; i < 3; i++) {
    rows[i].weight = 12345678.0;
    rows[i].observed.half_light_radius = 54321.0;
    rows[i].observed.velocity_dispersion = 1234.5;
    rows[i].observed.time_90 = 13.75;
  }
  char *text = printed(rows, 3);
  assert_line(text, "\nbelow 1 ");
  assert_line(text, "\n1e11 - 1e12  24691356  -10.2 (");
  for (char *line = strtok(text, "\n"); line; line = strtok(NULL, "\n"))
    assert_true(strlen(line) <= 100);
  free(text);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(test_quantiles_of_lone_values_are_exact),
      cmocka_unit_test(test_quantiles_are_good_to_a_cell),
      cmocka_unit_test(test_weights_count),
      cmocka_unit_test(test_values_without_a_place),
      cmocka_unit_test(test_lines_hold_numbers_medians_and_shares),
      cmocka_unit_test(test_only_centrals_count_and_by_weight),
      cmocka_unit_test(test_lines_fit_a_page),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
