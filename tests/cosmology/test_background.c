/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The expanding background: against a library's tables, against closed forms, and what is refused. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>

#include <cmocka.h>

#include "reference.h"

#include <string.h>

/* The library's constants agree with ours to some 1e-8, its table is written to 1e-10. */
static const double LIBRARY_TOLERANCE = 1e-7;
/* Its radiation constant differs from ours by up to 1e-6 in the shares that count here. */
static const double RADIATION_TOLERANCE = 1e-6;
/* Cubic interpolation over 1024 cells leaves some 1e-12 in the age. */
static const double CLOSED_FORM_TOLERANCE = 1e-10;
/* Inverse of a tabulated function by a tabulated function. */
static const double INVERSE_TOLERANCE = 1e-10;

static const double densities[] = {0.1, 0.3153, 0.6, 0.9, 1.0};
enum { DENSITIES = sizeof densities / sizeof *densities };

/* Columns of one half of the table: H, age, comoving and luminosity distance, Omega_m. */
static void compare_with_table(bool radiation, size_t first, double tolerance) {
  ew_cosmology_parameters p = planck18;
  p.radiation = radiation;
  ew_cosmology *c = make_cosmology(&p);
  reference *table = read_reference(EW_TEST_DATA "/cosmology_background.csv");
  for (size_t i = 0; i < table->count; i++) {
    double z = table->row[i][0];
    const double *expected = &table->row[i][first];
    assert_close(ew_hubble_rate(c, z), expected[0], tolerance, "H", z);
    assert_close(ew_age(c, z), expected[1], tolerance, "age", z);
    if (z > 0.0) {
      assert_close(ew_comoving_distance(c, z), expected[2], tolerance, "comoving distance", z);
      assert_close(ew_luminosity_distance(c, z), expected[3], tolerance, "luminosity distance", z);
    }
    assert_close(ew_omega_matter(c, z), expected[4], tolerance, "Omega_m", z);
  }
  free(table);
  ew_cosmology_free(c);
}

static void library_without_radiation(void **state) {
  (void)state;
  compare_with_table(false, 1, LIBRARY_TOLERANCE);
}

static void library_with_radiation(void **state) {
  (void)state;
  compare_with_table(true, 6, RADIATION_TOLERANCE);
}

/* t = 2/(3 H0 sqrt(OL)) asinh(sqrt(OL/Om) a^(3/2)); 2/(3 H0) a^(3/2) without Lambda. */
static double age_closed_form(const ew_cosmology_parameters *p, double z) {
  double lambda = 1.0 - p->omega_matter, root = sqrt(lambda / p->omega_matter);
  double scaled = pow(1.0 + z, -1.5) / sqrt(p->omega_matter);
  double ratio = root > 0.0 ? asinh(root * pow(1.0 + z, -1.5)) / (root * pow(1.0 + z, -1.5)) : 1.0;
  return 2.0 / 3.0 * EW_HUBBLE_TIME / p->hubble * scaled * ratio;
}

static void age_is_the_closed_form(void **state) {
  (void)state;
  for (size_t i = 0; i < DENSITIES; i++) {
    ew_cosmology_parameters p = planck18;
    p.omega_matter = densities[i];
    p.hubble = 0.5 + 0.1 * (double)i;
    ew_cosmology *c = make_cosmology(&p);
    for (double z = 0.0; z < EW_HIGHEST_REDSHIFT; z += 0.0237 * (1.0 + z))
      assert_close(ew_age(c, z), age_closed_form(&p, z), CLOSED_FORM_TOLERANCE, "age", z);
    ew_cosmology_free(c);
  }
}

/* Einstein-de Sitter: D_C = 2 c/H0 (1 - (1+z)^(-1/2)); written so that small z keeps its digits. */
static void distance_without_lambda(void **state) {
  (void)state;
  ew_cosmology_parameters p = planck18;
  p.omega_matter = 1.0;
  ew_cosmology *c = make_cosmology(&p);
  double length = EW_LIGHT_SPEED / (100.0 * p.hubble);
  for (double z = 1e-10; z < EW_HIGHEST_REDSHIFT; z *= 1.31) {
    double expected = -2.0 * length * expm1(-0.5 * log1p(z));
    assert_close(ew_comoving_distance(c, z), expected, 1e-8, "comoving distance", z);
  }
  ew_cosmology_free(c);
}

static void redshift_undoes_age(void **state) {
  (void)state;
  for (size_t i = 0; i < DENSITIES; i++) {
    ew_cosmology_parameters p = planck18;
    p.omega_matter = densities[i];
    p.radiation = densities[i] < 1.0;
    ew_cosmology *c = make_cosmology(&p);
    double before = (double)INFINITY;
    for (double z = 0.0; z <= EW_HIGHEST_REDSHIFT; z += 0.00137 * (1.0 + z)) {
      double age = ew_age(c, z);
      assert_true(age < before);
      before = age;
      assert_close(1.0 + ew_redshift_at(c, age), 1.0 + z, INVERSE_TOLERANCE, "1 + z", z);
    }
    ew_cosmology_free(c);
  }
}

static void outside_is_clamped(void **state) {
  (void)state;
  ew_cosmology *c = make_cosmology(&planck18);
  double (*const functions[])(const ew_cosmology *, double) = {
      ew_hubble_rate, ew_omega_matter, ew_critical_density,   ew_age,     ew_comoving_distance, ew_luminosity_distance,
      ew_growth,      ew_growth_rate,  ew_collapse_threshold, ew_barrier, ew_virial_overdensity};
  for (size_t i = 0; i < sizeof functions / sizeof *functions; i++) {
    assert_true(functions[i](c, -0.5) == functions[i](c, 0.0));
    assert_true(functions[i](c, (double)NAN) == functions[i](c, 0.0));
    assert_true(functions[i](c, 1e9) == functions[i](c, EW_HIGHEST_REDSHIFT));
  }
  assert_true(ew_redshift_at(c, 2.0 * ew_age(c, 0.0)) == 0.0);
  assert_close(ew_redshift_at(c, -1.0), EW_HIGHEST_REDSHIFT, 1e-12, "redshift at age", -1.0);
  assert_true(ew_redshift_of_barrier(c, 0.0) == 0.0);
  assert_close(ew_redshift_of_barrier(c, 1e9), EW_HIGHEST_REDSHIFT, 1e-12, "redshift of barrier", 1e9);
  ew_cosmology_free(c);
}

/* rho_m = Omega_m h^2 2.77536627e11 Msun/Mpc^3, as in colossus 1.3.6 (8.75072986e10 h^2 for this universe). */
static void densities_agree(void **state) {
  (void)state;
  ew_cosmology *c = make_cosmology(&planck18);
  double h = planck18.hubble;
  assert_close(ew_matter_density(c), 8.75072986e10 * h * h, 1e-8, "matter density", 0.0);
  assert_close(ew_baryon_fraction(c), 0.0493 / 0.3153, 1e-15, "baryon fraction", 0.0);
  for (double z = 0.0; z < 50.0; z += 2.385) {
    double proper = ew_matter_density(c) * pow(1.0 + z, 3) * 1e-9;
    assert_close(ew_critical_density(c, z) * ew_omega_matter(c, z), proper, 1e-14, "proper matter density", z);
  }
  ew_cosmology_free(c);
}

/* Each universe must be refused with these words. */
static void refuse(const ew_cosmology_parameters *p, const char *words) {
  ew_error error = {0};
  ew_cosmology *c;
  assert_int_equal(ew_cosmology_new(&c, p, &error), EW_REFUSED);
  assert_null(c);
  assert_int_equal(error.status, EW_REFUSED);
  if (!strstr(error.message, words))
    fail_msg("\"%s\" does not say \"%s\"", error.message, words);
  assert_null(strchr(error.message, '\n'));
}

static void impossible_universes_are_refused(void **state) {
  (void)state;
  ew_cosmology_parameters p = planck18;
  p.omega_baryon = 0.4;
  refuse(&p, "cosmology.omega_baryon = 0.4 exceeds cosmology.omega_matter = 0.3153");
  p = planck18;
  p.omega_matter = 1.0;
  p.radiation = true;
  refuse(&p, "cosmology.omega_matter = 1 exceeds 0.9999");
  p = planck18;
  p.hubble = 67.36;
  refuse(&p, "cosmology.hubble = 67.36 is outside 0.4 to 1.2");
  p.hubble = (double)NAN;
  refuse(&p, "cosmology.hubble");
  p = planck18;
  p.collapse_threshold = 3;
  refuse(&p, "cosmology.collapse_threshold = 3");
}

static void free_accepts_nothing(void **state) {
  (void)state;
  ew_cosmology_free(NULL);
}

static void parameters_are_kept(void **state) {
  (void)state;
  ew_cosmology *c = make_cosmology(&planck18);
  assert_true(ew_cosmology_get(c)->spectral_index == planck18.spectral_index);
  ew_cosmology_free(c);
}

int main(void) {
  ew_core_start();
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(library_without_radiation), cmocka_unit_test(library_with_radiation),
      cmocka_unit_test(age_is_the_closed_form),    cmocka_unit_test(distance_without_lambda),
      cmocka_unit_test(redshift_undoes_age),       cmocka_unit_test(outside_is_clamped),
      cmocka_unit_test(densities_agree),           cmocka_unit_test(impossible_universes_are_refused),
      cmocka_unit_test(free_accepts_nothing),      cmocka_unit_test(parameters_are_kept),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
