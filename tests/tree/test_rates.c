/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The rates of splits and smooth loss: against a table of an independent program, against adaptive integrals of the
 * published law for odd coefficients, and the tables made of them against their definitions. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>

#include <cmocka.h>

#include "forest.h"
#include "tree/rates.h"

/* The table is said to be good to 1e-5; it is met to 1e-7. */
static const double TABLE_TOLERANCE = 1e-6;
/* The eight-point rule at the steepest mass slope: 3e-6. Otherwise linear interpolation of the variance: 4e-7. */
static const double INTEGRAL_TOLERANCE = 5e-6;
/* Two-point rules over cells of 0.004 in ln M: 2e-9 away from the resolution; 1.3e-5 from the resolution itself on,
 * where the loss diverges. */
static const double DRIFT_TOLERANCE = 1e-8;
static const double FIRST_DRIFT_TOLERANCE = 3e-5;
static const double ADAPTIVE_TOLERANCE = 1e-9;
/* A straight line of a table inverted: rounding. */
static const double INVERSE_TOLERANCE = 1e-12;

enum { WORKSPACE = 1000 };

static double integrate(double (*integrand)(double, void *), void *context, double from, double to) {
  gsl_integration_workspace *space = gsl_integration_workspace_alloc(WORKSPACE);
  assert_non_null(space);
  gsl_function function = {integrand, context};
  double value, uncertainty;
  int status =
      gsl_integration_qags(&function, from, to, 0.0, ADAPTIVE_TOLERANCE, WORKSPACE, space, &value, &uncertainty);
  gsl_integration_workspace_free(space);
  assert_int_equal(status, 0);
  return value;
}

/* --------------------------------------------------------------------------------------- table of another program */

static void compare_row(const ew_cosmology *cosmology, const ew_spectrum *spectrum, const double *row,
                        const split_coefficients coefficients, const double *expected) {
  ew_error error = {0};
  ew_tree_builder *builder;
  ew_tree_parameters parameters = tree_parameters(row[1], coefficients);
  assert_int_equal(ew_tree_builder_new(&builder, spectrum, &parameters, row[0], &error), EW_OK);
  double barrier = ew_barrier(cosmology, row[2]);
  assert_close(ew_split_rate(builder, row[0], barrier) * row[3], expected[0], TABLE_TOLERANCE, "split rate", row[0]);
  assert_close(ew_smooth_rate(builder, row[0], barrier) * row[3], expected[1], TABLE_TOLERANCE, "smooth rate", row[0]);
  ew_tree_builder_free(builder);
}

static void test_rates_of_an_independent_program(void **state) {
  (void)state;
  ew_cosmology *cosmology = make_cosmology(&planck18);
  ew_spectrum *spectrum = make_spectrum(cosmology, EW_TRANSFER_EISENSTEIN_HU);
  reference *table = read_reference(EW_TEST_DATA "/tree_split_rates.csv");
  assert_int_equal(table->count, 57);
  for (size_t i = 0; i < table->count; i++) {
    compare_row(cosmology, spectrum, table->row[i], plain, &table->row[i][4]);
    compare_row(cosmology, spectrum, table->row[i], published, &table->row[i][6]);
  }
  free(table);
  ew_spectrum_free(spectrum);
  ew_cosmology_free(cosmology);
}

/* ------------------------------------------------------------------------------------------------ the published law */

/* Their smooth loss is an integral of this over u = sigma2/sqrt(sigma1^2 - sigma2^2). */
static double law_loss(double u, void *context) {
  const law *l = context;
  return pow(1.0 + 1.0 / (u * u), 0.5 * l->coefficients[1]);
}

static double rate_density(double log_share, void *context) {
  return law_density(context, log_share);
}

static double expected_loss(law *l, double resolution) {
  double sigma2 = ew_sigma(l->spectrum, l->mass), sigma1 = ew_sigma(l->spectrum, resolution);
  double u = sigma2 / sqrt(sigma1 * sigma1 - sigma2 * sigma2);
  double factor = sqrt(2.0 / EW_PI) * l->coefficients[0] * pow(sigma2, -1.0 - l->coefficients[2]);
  return factor * integrate(law_loss, l, 0.0, u);
}

static void compare_with_law(const ew_spectrum *spectrum, const split_coefficients coefficients, double resolution) {
  ew_error error = {0};
  ew_tree_builder *builder;
  ew_tree_parameters parameters = tree_parameters(resolution, coefficients);
  assert_int_equal(ew_tree_builder_new(&builder, spectrum, &parameters, 3e5 * resolution, &error), EW_OK);
  for (double ratio = 1.02; ratio < 3e5; ratio *= 2.385) {
    law l = {spectrum, coefficients, ratio * resolution};
    double scale = pow(2.385, coefficients[2]); /* at the barrier 2.385 */
    if (ratio > 2.0)
      assert_close(ew_split_rate(builder, l.mass, 2.385), scale * integrate(rate_density, &l, -log(ratio), -log(2.0)),
                   INTEGRAL_TOLERANCE, "split rate", l.mass);
    assert_close(ew_smooth_rate(builder, l.mass, 2.385), scale * expected_loss(&l, resolution), INTEGRAL_TOLERANCE,
                 "smooth rate", l.mass);
  }
  ew_tree_builder_free(builder);
}

static void test_rates_of_odd_coefficients(void **state) {
  (void)state;
  for (size_t u = 0; u < ODD_UNIVERSES; u++) {
    ew_cosmology_parameters universe = odd_universe(u);
    ew_cosmology *cosmology = make_cosmology(&universe);
    ew_spectrum *spectrum = make_spectrum(cosmology, EW_TRANSFER_EISENSTEIN_HU);
    for (size_t k = 0; k < ODD_COEFFICIENTS; k++) {
      compare_with_law(spectrum, odd_coefficients[k], 1e4);
      compare_with_law(spectrum, odd_coefficients[k], 1e8);
    }
    ew_spectrum_free(spectrum);
    ew_cosmology_free(cosmology);
  }
}

static void test_rates_at_the_resolution(void **state) {
  (void)state;
  ew_tree_parameters parameters = tree_parameters(1e7, published);
  forest f = plant(&planck18, &parameters, 1e10);
  assert_true(ew_split_rate(f.builder, 1e7, 2.0) == 0.0);
  assert_true(ew_split_rate(f.builder, 1.99e7, 2.0) == 0.0);
  assert_true(ew_split_rate(f.builder, 2.01e7, 2.0) > 0.0);
  assert_true(isinf(ew_smooth_rate(f.builder, 1e7, 2.0)));
  assert_true(ew_smooth_rate(f.builder, 1.001e7, 2.0) > 5.0 * ew_smooth_rate(f.builder, 1.1e7, 2.0));
  fell(&f);
}

/* ----------------------------------------------------------------------------------------------------------- tables */

static ew_split_tables make_tables(const ew_spectrum *spectrum, double resolution,
                                   const split_coefficients coefficients, double largest_mass) {
  ew_error error = {0};
  ew_split_tables tables;
  ew_tree_parameters parameters = tree_parameters(resolution, coefficients);
  if (ew_split_tables_make(&tables, spectrum, &parameters, largest_mass, &error) != EW_OK)
    fail_msg("%s", error.message);
  return tables;
}

static double time_density(double log_mass, void *tables) {
  return 1.0 / ew_smooth_rate_on_clock(tables, log_mass);
}

static double hazard_density(double log_mass, void *tables) {
  return ew_split_rate_on_clock(tables, log_mass) / ew_smooth_rate_on_clock(tables, log_mass);
}

static double risen(const ew_table *table, double from, double to) {
  return ew_table_at(table, to) - ew_table_at(table, from);
}

/* The integrands are those of the tables themselves, smooth between grid points: integrate over ten cells at a time. */
static void test_drift_and_hazard(void **state) {
  (void)state;
  ew_cosmology *cosmology = make_cosmology(&planck18);
  ew_spectrum *spectrum = make_spectrum(cosmology, EW_TRANSFER_EISENSTEIN_HU);
  ew_split_tables t = make_tables(spectrum, 1e6, published, 1e12);
  for (size_t i = 200; i + 10 < t.drift.count; i += 293) {
    double from = ew_table_position(&t.drift, i), to = ew_table_position(&t.drift, i + 10);
    double time = 0.0, splits = 0.0;
    for (size_t k = i; k < i + 10; k++) {
      double low = ew_table_position(&t.drift, k), high = ew_table_position(&t.drift, k + 1);
      time += integrate(time_density, &t, low, high);
      splits += integrate(hazard_density, &t, low, high);
    }
    assert_close(risen(&t.drift, from, to), time, DRIFT_TOLERANCE, "drift", from);
    assert_close(risen(&t.hazard, from, to), splits, DRIFT_TOLERANCE, "hazard", from);
  }
  ew_split_tables_clear(&t);
  ew_spectrum_free(spectrum);
  ew_cosmology_free(cosmology);
}

/* From the resolution itself, where the loss diverges as 1/sqrt(M - resolution). */
static void test_drift_from_the_resolution(void **state) {
  (void)state;
  ew_cosmology *cosmology = make_cosmology(&planck18);
  ew_spectrum *spectrum = make_spectrum(cosmology, EW_TRANSFER_EISENSTEIN_HU);
  ew_split_tables t = make_tables(spectrum, 1e6, published, 1e8);
  double time = 0.0;
  for (size_t k = 0; k < 100; k++)
    time += integrate(time_density, &t, ew_table_position(&t.drift, k), ew_table_position(&t.drift, k + 1));
  assert_close(ew_table_at(&t.drift, ew_table_position(&t.drift, 100)), time, FIRST_DRIFT_TOLERANCE, "drift", 0.4);
  assert_true(ew_table_at(&t.hazard, t.log_resolution + log(2.0) - 0.004) == 0.0);
  ew_split_tables_clear(&t);
  ew_spectrum_free(spectrum);
  ew_cosmology_free(cosmology);
}

static void inverts_exactly(const ew_table *table, double from, double step) {
  for (double wanted = ew_table_at(table, from); wanted > 0.0; wanted -= step, step *= 1.7) {
    double log_mass = ew_table_inverse(table, from, wanted);
    assert_true(log_mass <= from);
    assert_close(ew_table_at(table, log_mass), wanted, INVERSE_TOLERANCE, "inverse at", from);
  }
}

/* Where a halo waits for 1e-6 of ln M, an inverse that is good to 1e-7 would be far off. */
static void test_inverse(void **state) {
  (void)state;
  ew_cosmology *cosmology = make_cosmology(&planck18);
  ew_spectrum *spectrum = make_spectrum(cosmology, EW_TRANSFER_EISENSTEIN_HU);
  ew_split_tables t = make_tables(spectrum, 1e5, published, 1e12);
  for (double from = t.log_resolution; from < log(1e12); from += 0.2385) {
    inverts_exactly(&t.hazard, from, 1e-7);
    inverts_exactly(&t.drift, from, 1e-7);
  }
  assert_true(ew_table_inverse(&t.hazard, log(1e12), 0.0) <= t.log_resolution + log(2.0));
  ew_split_tables_clear(&t);
  ew_spectrum_free(spectrum);
  ew_cosmology_free(cosmology);
}

static double envelope_excess(const ew_split_tables *t, double log_mass, double log_share) {
  return ew_log_split_density(t, log_mass, log_share) - ew_table_at(&t->envelope_slope, log_mass) * log_share -
         ew_table_at(&t->log_envelope, log_mass);
}

/* The share is drawn by rejection, so the density must stay below its envelope, and not far below. */
static void check_envelope(const ew_split_tables *t, double largest_mass) {
  for (double log_mass = t->log_resolution + log(2.0) + 1e-6; log_mass < log(largest_mass); log_mass += 0.137) {
    double low = t->log_resolution - log_mass, high = -log(2.0), highest = -INFINITY;
    for (int i = 0; i <= 300; i++)
      highest = fmax(highest, envelope_excess(t, log_mass, low + (high - low) * i / 300.0));
    if (!(highest <= 0.0 && highest > -0.1))
      fail_msg("envelope at %g times the resolution: highest density over it is exp(%g)",
               exp(log_mass - t->log_resolution), highest);
  }
}

static void test_envelope(void **state) {
  (void)state;
  for (size_t u = 0; u < ODD_UNIVERSES; u++) {
    ew_cosmology_parameters universe = odd_universe(u);
    ew_cosmology *cosmology = make_cosmology(&universe);
    ew_spectrum *spectrum = make_spectrum(cosmology, EW_TRANSFER_EISENSTEIN_HU);
    for (size_t k = 0; k < ODD_COEFFICIENTS; k++) {
      double resolution = k % 2 ? 1e10 : 1e5;
      ew_split_tables t = make_tables(spectrum, resolution, odd_coefficients[k], 3e5 * resolution);
      check_envelope(&t, 3e5 * resolution);
      ew_split_tables_clear(&t);
    }
    ew_spectrum_free(spectrum);
    ew_cosmology_free(cosmology);
  }
}

int main(void) {
  ew_core_start();
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(test_rates_of_an_independent_program),
      cmocka_unit_test(test_rates_of_odd_coefficients),
      cmocka_unit_test(test_rates_at_the_resolution),
      cmocka_unit_test(test_drift_and_hazard),
      cmocka_unit_test(test_drift_from_the_resolution),
      cmocka_unit_test(test_inverse),
      cmocka_unit_test(test_envelope),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
