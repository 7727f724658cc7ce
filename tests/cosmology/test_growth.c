/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Growth, collapse threshold, barrier and virial overdensity: against tables, closed forms and each other. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>

#include <cmocka.h>

#include "reference.h"

#include <gsl/gsl_sf_hyperg.h>

/* The library's growth integral is good to 2e-7. */
static const double LIBRARY_TOLERANCE = 1e-6;
/* The Boltzmann code starts its growth equation off the growing mode. */
static const double RADIATION_TOLERANCE = 1e-4;
/* Formulas without quadrature, in a table of eleven digits. */
static const double FORMULA_TOLERANCE = 1e-9;
/* Cubic interpolation over 1024 cells. */
static const double CLOSED_FORM_TOLERANCE = 1e-10;
/* The inverse bends most where f is small: 1.3e-10 for Omega_m = 0.1 today, 1e-11 for the default. */
static const double INVERSE_TOLERANCE = 2e-10;

static const double densities[] = {0.1, 0.3153, 0.7, 1.0};
enum { DENSITIES = sizeof densities / sizeof *densities, THRESHOLDS = 3 };

static void library_without_radiation(void **state) {
  (void)state;
  ew_cosmology *c = make_cosmology(&planck18);
  reference *table = read_reference(EW_TEST_DATA "/cosmology_growth.csv");
  for (size_t i = 0; i < table->count; i++) {
    const double *row = table->row[i], z = row[0];
    assert_close(ew_growth(c, z), row[1], LIBRARY_TOLERANCE, "D", z);
    assert_close(ew_growth_rate(c, z), row[2], FORMULA_TOLERANCE, "f", z);
    assert_close(ew_virial_overdensity(c, z), row[5], FORMULA_TOLERANCE, "virial overdensity", z);
  }
  free(table);
  ew_cosmology_free(c);
}

static void boltzmann_code_with_radiation(void **state) {
  (void)state;
  ew_cosmology_parameters p = planck18;
  p.radiation = true;
  ew_cosmology *c = make_cosmology(&p);
  reference *table = read_reference(EW_TEST_DATA "/cosmology_growth.csv");
  for (size_t i = 0; i < table->count; i++) {
    const double *row = table->row[i], z = row[0];
    assert_close(ew_growth(c, z), row[3], RADIATION_TOLERANCE, "D", z);
    assert_close(ew_growth_rate(c, z), row[4], RADIATION_TOLERANCE, "f", z);
  }
  free(table);
  ew_cosmology_free(c);
}

/* D ~ a Omega_m(a)^(1/3) 2F1(1/3, 5/6; 11/6; Omega_Lambda(a)), from the form in -Omega_Lambda a^3/Omega_m of Silveira
 * & Waga 1994, Phys. Rev. D 50, 4890, by Pfaff's transformation. */
static double growth_closed_form(double omega_matter, double z) {
  double matter = omega_matter * pow(1.0 + z, 3);
  double share = matter / (matter + 1.0 - omega_matter);
  return cbrt(share) / (1.0 + z) * gsl_sf_hyperg_2F1(1.0 / 3.0, 5.0 / 6.0, 11.0 / 6.0, 1.0 - share);
}

static void growth_is_the_closed_form(void **state) {
  (void)state;
  for (size_t i = 0; i < DENSITIES; i++) {
    ew_cosmology_parameters p = planck18;
    p.omega_matter = densities[i];
    ew_cosmology *c = make_cosmology(&p);
    double today = growth_closed_form(p.omega_matter, 0.0);
    for (double z = 0.0; z < EW_HIGHEST_REDSHIFT; z += 0.0237 * (1.0 + z))
      assert_close(ew_growth(c, z), growth_closed_form(p.omega_matter, z) / today, CLOSED_FORM_TOLERANCE, "D", z);
    ew_cosmology_free(c);
  }
}

static void growth_without_lambda_is_the_scale_factor(void **state) {
  (void)state;
  ew_cosmology_parameters p = planck18;
  p.omega_matter = 1.0;
  ew_cosmology *c = make_cosmology(&p);
  for (double z = 0.0; z < EW_HIGHEST_REDSHIFT; z += 0.71) {
    assert_close(ew_growth(c, z), 1.0 / (1.0 + z), CLOSED_FORM_TOLERANCE, "D", z);
    assert_close(ew_growth_rate(c, z), 1.0, CLOSED_FORM_TOLERANCE, "f", z);
    assert_close(ew_virial_overdensity(c, z), 18.0 * EW_PI * EW_PI, 1e-14, "virial overdensity", z);
  }
  ew_cosmology_free(c);
}

/* Fifth-order central difference over ln a; its error is some 1e-9 at this step. */
static void rate_is_the_slope_of_growth(void **state) {
  (void)state;
  ew_cosmology_parameters p = planck18;
  p.radiation = true;
  ew_cosmology *c = make_cosmology(&p);
  const double step = 0.02;
  for (double x = 0.1; x < 4.0; x += 0.0931) {
    double near = log(ew_growth(c, expm1(x - step)) / ew_growth(c, expm1(x + step)));
    double far = log(ew_growth(c, expm1(x - 2.0 * step)) / ew_growth(c, expm1(x + 2.0 * step)));
    assert_close(ew_growth_rate(c, expm1(x)), (8.0 * near - far) / (12.0 * step), 1e-7, "f", expm1(x));
  }
  ew_cosmology_free(c);
}

static ew_cosmology *with_threshold(int threshold) {
  ew_cosmology_parameters p = planck18;
  p.collapse_threshold = threshold;
  return make_cosmology(&p);
}

static void thresholds_agree_with_tables(void **state) {
  (void)state;
  ew_cosmology *constant = with_threshold(EW_THRESHOLD_CONSTANT);
  ew_cosmology *mo_white = with_threshold(EW_THRESHOLD_MO_WHITE);
  ew_cosmology *nakamura_suto = with_threshold(EW_THRESHOLD_NAKAMURA_SUTO);
  reference *table = read_reference(EW_TEST_DATA "/cosmology_growth.csv");
  for (size_t i = 0; i < table->count; i++) {
    const double *row = table->row[i], z = row[0];
    /* (3/20) (12 pi)^(2/3) = 1.6864702, of which six decimals are kept */
    assert_close(ew_collapse_threshold(constant, z), 0.15 * pow(12.0 * EW_PI, 2.0 / 3.0), 2e-7, "delta_c", z);
    assert_close(ew_collapse_threshold(mo_white, z), row[6], FORMULA_TOLERANCE, "delta_c", z);
    /* how well the fit describes the collapse: 6e-5 */
    assert_close(ew_collapse_threshold(nakamura_suto, z), row[7], 1e-4, "delta_c", z);
  }
  free(table);
  ew_cosmology_free(constant);
  ew_cosmology_free(mo_white);
  ew_cosmology_free(nakamura_suto);
}

static void check_barrier(const ew_cosmology *c) {
  double before = 0.0;
  for (double z = 0.0; z <= EW_HIGHEST_REDSHIFT; z += 0.00173 * (1.0 + z)) {
    double barrier = ew_barrier(c, z);
    assert_true(barrier > before);
    before = barrier;
    assert_close(barrier, ew_collapse_threshold(c, z) / ew_growth(c, z), CLOSED_FORM_TOLERANCE, "barrier", z);
    assert_close(1.0 + ew_redshift_of_barrier(c, barrier), 1.0 + z, INVERSE_TOLERANCE, "1 + z", z);
  }
}

static void barrier_and_its_inverse(void **state) {
  (void)state;
  for (int threshold = 0; threshold < THRESHOLDS; threshold++)
    for (size_t i = 0; i < 2 * DENSITIES; i++) {
      ew_cosmology_parameters p = planck18;
      p.omega_matter = fmin(densities[i / 2], i % 2 ? 0.99 : 1.0);
      p.radiation = i % 2;
      p.collapse_threshold = threshold;
      ew_cosmology *c = make_cosmology(&p);
      check_barrier(c);
      ew_cosmology_free(c);
    }
}

int main(void) {
  ew_core_start();
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(library_without_radiation),   cmocka_unit_test(boltzmann_code_with_radiation),
      cmocka_unit_test(growth_is_the_closed_form),   cmocka_unit_test(growth_without_lambda_is_the_scale_factor),
      cmocka_unit_test(rate_is_the_slope_of_growth), cmocka_unit_test(thresholds_agree_with_tables),
      cmocka_unit_test(barrier_and_its_inverse),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
