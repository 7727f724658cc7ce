/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * sigma(M) and its slope: against a table, the table in memory against adaptive integration in many universes, and
 * identities. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>

#include <cmocka.h>

#include "reference.h"

/* Quadrature of the table: sigma 1e-9, slope 1e-8; its masses and values have eleven digits. */
static const double LIBRARY_TOLERANCE = 1e-7;
/* Cubic interpolation between sums over a uniform grid against adaptive integration. */
static const double SIGMA_TOLERANCE = 1e-8;
/* The slope is the derivative of that cubic: worst at the highest masses, where sigma(M) bends. */
static const double SLOPE_TOLERANCE = 5e-7;
static const double SIGMA8_TOLERANCE = 1e-8;

/* h, Omega_m, Omega_b, n_s, sigma8 */
static const double universes[][5] = {
    {0.6736, 0.3153, 0.0493, 0.9649, 0.8111}, /* Planck */
    {0.5, 1.0, 0.05, 1.0, 0.6},               /* no Lambda */
    {1.0, 1.0, 0.0493, 0.95, 0.9},            /* the densest */
    {0.5, 0.1, 0.02, 1.2, 1.5},               /* the emptiest */
    {0.7, 0.3, 0.0, 0.8, 0.3},                /* no baryons */
    {0.7, 0.3, 0.15, 0.95, 0.8},              /* half baryons */
    {1.2, 0.05, 0.01, 1.5, 3.0},              /* a corner of what is allowed */
};
enum { UNIVERSES = sizeof universes / sizeof *universes };

static ew_cosmology_parameters universe(size_t index) {
  ew_cosmology_parameters p = planck18;
  p.hubble = universes[index][0];
  p.omega_matter = universes[index][1];
  p.omega_baryon = universes[index][2];
  p.spectral_index = universes[index][3];
  p.sigma8 = universes[index][4];
  return p;
}

static void integrate(const ew_spectrum *spectrum, double mass, double *sigma, double *slope) {
  ew_error error = {0};
  if (ew_sigma_integrate(spectrum, mass, sigma, slope, &error) != EW_OK)
    fail_msg("%s", error.message);
}

static void compare_with_table(int transfer, size_t column) {
  ew_cosmology *c = make_cosmology(&planck18);
  ew_spectrum *s = make_spectrum(c, transfer);
  reference *table = read_reference(EW_TEST_DATA "/cosmology_sigma.csv");
  for (size_t i = 0; i < table->count; i++) {
    const double *row = table->row[i], mass = row[0];
    assert_close(ew_sigma(s, mass), row[column], LIBRARY_TOLERANCE, "sigma", mass);
    assert_close(ew_sigma_slope(s, mass), row[column + 1], LIBRARY_TOLERANCE, "slope", mass);
    double sigma, slope;
    integrate(s, mass, &sigma, &slope);
    assert_close(sigma, row[column], LIBRARY_TOLERANCE, "integrated sigma", mass);
    assert_close(slope, row[column + 1], LIBRARY_TOLERANCE, "integrated slope", mass);
  }
  free(table);
  ew_spectrum_free(s);
  ew_cosmology_free(c);
}

static void library_table(void **state) {
  (void)state;
  compare_with_table(EW_TRANSFER_EISENSTEIN_HU, 1);
  compare_with_table(EW_TRANSFER_EISENSTEIN_HU_SMOOTH, 3);
}

static void for_each_universe(void (*check)(const ew_spectrum *)) {
  for (size_t i = 0; i < UNIVERSES; i++)
    for (int transfer = 0; ew_transfer_of(transfer); transfer++) {
      ew_cosmology_parameters p = universe(i);
      ew_cosmology *c = make_cosmology(&p);
      ew_spectrum *s = make_spectrum(c, transfer);
      check(s);
      ew_spectrum_free(s);
      ew_cosmology_free(c);
    }
}

static void check_table(const ew_spectrum *s) {
  for (double mass = EW_LOWEST_MASS; mass < EW_HIGHEST_MASS; mass *= 2.385) {
    double sigma, slope;
    integrate(s, mass, &sigma, &slope);
    assert_close(ew_sigma(s, mass), sigma, SIGMA_TOLERANCE, "sigma", mass);
    assert_close(ew_sigma_slope(s, mass), slope, SLOPE_TOLERANCE, "slope", mass);
  }
}

static void table_is_the_integral(void **state) {
  (void)state;
  for_each_universe(check_table);
}

static void check_sigma8(const ew_spectrum *s) {
  const ew_cosmology_parameters *p = ew_cosmology_get(ew_spectrum_cosmology(s));
  double mass = 4.0 * EW_PI / 3.0 * pow(8.0 / p->hubble, 3) * ew_matter_density(ew_spectrum_cosmology(s));
  assert_close(ew_sigma(s, mass), p->sigma8, SIGMA8_TOLERANCE, "sigma", mass);
}

static void sigma_in_8_megaparsecs_is_sigma8(void **state) {
  (void)state;
  for_each_universe(check_sigma8);
}

/* Fifth-order central difference of the adaptive integrals, themselves good to some 1e-10. */
static void check_slope(const ew_spectrum *s) {
  const double step = 0.05;
  for (double mass = 1e4; mass < 1e15; mass *= 47.1) {
    double sigma[5], slope[5];
    for (int i = 0; i < 5; i++)
      integrate(s, mass * exp((i - 2) * step), &sigma[i], &slope[i]);
    double difference = (8.0 * log(sigma[3] / sigma[1]) - log(sigma[4] / sigma[0])) / (12.0 * step);
    assert_close(slope[2], difference, 1e-6, "slope", mass);
  }
}

static void slope_is_the_derivative(void **state) {
  (void)state;
  for_each_universe(check_slope);
}

static void check_falling(const ew_spectrum *s) {
  double before = (double)INFINITY;
  for (double mass = EW_LOWEST_MASS; mass < EW_HIGHEST_MASS; mass *= 1.01) {
    double sigma = ew_sigma(s, mass);
    assert_true(sigma < before && sigma > 0.0 && ew_sigma_slope(s, mass) < 0.0);
    before = sigma;
  }
}

static void sigma_falls_with_mass(void **state) {
  (void)state;
  for_each_universe(check_falling);
}

static void outside_is_clamped(void **state) {
  (void)state;
  ew_cosmology *c = make_cosmology(&planck18);
  ew_spectrum *s = make_spectrum(c, EW_TRANSFER_EISENSTEIN_HU);
  double (*const functions[])(const ew_spectrum *, double) = {ew_sigma, ew_sigma_slope};
  for (size_t i = 0; i < 2; i++) {
    assert_true(functions[i](s, 1.0) == functions[i](s, EW_LOWEST_MASS));
    assert_true(functions[i](s, -1.0) == functions[i](s, EW_LOWEST_MASS));
    assert_true(functions[i](s, (double)NAN) == functions[i](s, EW_LOWEST_MASS));
    assert_close(functions[i](s, 1e20), functions[i](s, EW_HIGHEST_MASS), 1e-12, "sigma", 1e20);
  }
  ew_spectrum_free(s);
  ew_cosmology_free(c);
}

/* int dx x^2 W^2 = 3 pi/2 over the half line is Parseval's theorem for a sphere; and W has its zero where tan x = x. */
static void top_hat_is_a_sphere(void **state) {
  (void)state;
  const ew_filter *top_hat = ew_filter_of(EW_FILTER_TOP_HAT);
  const double step = 1e-3, end = 2e3;
  double sum = 0.0;
  for (double x = 0.5 * step; x < end; x += step)
    sum += step * pow(x * top_hat->window(x), 2);
  assert_close(sum + 4.5 / end, 1.5 * EW_PI, 1e-6, "int x^2 W^2", end);
  assert_true(fabs(top_hat->window(4.493409457909064)) < 1e-15);
  assert_close(top_hat->window(0.0), 1.0, 1e-15, "W", 0.0);
  assert_close(4.0 * EW_PI / 3.0 * 2.385 * pow(top_hat->radius(7.1, 2.385), 3), 7.1, 1e-14, "mass", 7.1);
}

/* Through the seam between series and closed form, too. The difference's own error is 1e-10. */
static void top_hat_derivative(void **state) {
  (void)state;
  const ew_filter *top_hat = ew_filter_of(EW_FILTER_TOP_HAT);
  const double step = 1e-3;
  for (double x = 0.05; x < 4.0; x += 0.05) {
    double near = top_hat->window(x + step) - top_hat->window(x - step);
    double far = top_hat->window(x + 2.0 * step) - top_hat->window(x - 2.0 * step);
    assert_close(top_hat->window_derivative(x), (8.0 * near - far) / (12.0 * step), 1e-9, "dW/dx", x);
  }
}

int main(void) {
  ew_core_start();
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(library_table),
      cmocka_unit_test(table_is_the_integral),
      cmocka_unit_test(sigma_in_8_megaparsecs_is_sigma8),
      cmocka_unit_test(slope_is_the_derivative),
      cmocka_unit_test(sigma_falls_with_mass),
      cmocka_unit_test(outside_is_clamped),
      cmocka_unit_test(top_hat_is_a_sphere),
      cmocka_unit_test(top_hat_derivative),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
