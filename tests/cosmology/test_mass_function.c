/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Mass functions and progenitors: against a library's table, values worked out by hand, and conservation of mass. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>

#include <cmocka.h>

#include "reference.h"

#include <gsl/gsl_integration.h>

/* What the library's tables of f and sigma are worth far out in the exponential tail. */
static const double LIBRARY_TOLERANCE = 1e-4;
/* Adaptive integration over tables good to some 1e-8. */
static const double CONSERVATION_TOLERANCE = 1e-6;

/* Built once for all tests. */
typedef struct {
  ew_cosmology *cosmology;
  ew_spectrum *spectrum;
} world;

static world make_world(int threshold) {
  ew_cosmology_parameters p = planck18;
  p.collapse_threshold = threshold;
  ew_cosmology *c = make_cosmology(&p);
  return (world){c, make_spectrum(c, EW_TRANSFER_EISENSTEIN_HU)};
}

static void free_world(world *of) {
  ew_spectrum_free(of->spectrum);
  ew_cosmology_free(of->cosmology);
}

static void library_table(void **state) {
  (void)state;
  world plain = make_world(EW_THRESHOLD_CONSTANT), corrected = make_world(EW_THRESHOLD_MO_WHITE);
  reference *table = read_reference(EW_TEST_DATA "/cosmology_mass_function.csv");
  for (size_t i = 0; i < table->count; i++) {
    const double *row = table->row[i], z = row[0], mass = row[1];
    double ps = ew_mass_function_at(&ew_press_schechter, plain.spectrum, mass, z);
    double st = ew_mass_function_at(&ew_sheth_tormen, plain.spectrum, mass, z);
    double st_corrected = ew_mass_function_at(&ew_sheth_tormen, corrected.spectrum, mass, z);
    assert_close(ps, row[2], LIBRARY_TOLERANCE, "Press-Schechter", mass);
    assert_close(st, row[3], LIBRARY_TOLERANCE, "Sheth-Tormen", mass);
    assert_close(st_corrected, row[4], LIBRARY_TOLERANCE, "corrected Sheth-Tormen", mass);
  }
  free(table);
  free_world(&plain);
  free_world(&corrected);
}

/* f of nu = 1: sqrt(2/pi) exp(-1/2), and 0.3222 sqrt(1.414/pi) (1 + 0.707^-0.3) exp(-0.3535). */
static void multiplicity_by_hand(void **state) {
  (void)state;
  assert_close(ew_press_schechter.multiplicity(1.0), 0.483941449038287, 1e-14, "f", 1.0);
  assert_close(ew_sheth_tormen.multiplicity(1.0), 0.320225849593723, 1e-14, "f", 1.0);
  assert_string_equal(ew_press_schechter.label.name, "press_schechter");
  assert_string_equal(ew_sheth_tormen.label.name, "sheth_tormen");
}

typedef struct {
  const ew_spectrum *spectrum;
  const ew_mass_function *function;
  double redshift;
  ew_progenitor_question question;
} integrand;

static double integrate(double (*rate)(double, void *), integrand *of, double from, double to) {
  gsl_integration_workspace *space = gsl_integration_workspace_alloc(1000);
  assert_non_null(space);
  gsl_function function = {rate, of};
  double integral, uncertainty;
  assert_int_equal(gsl_integration_qag(&function, log(from), log(to), 0.0, 1e-8, 1000, GSL_INTEG_GAUSS31, space,
                                       &integral, &uncertainty),
                   0);
  gsl_integration_workspace_free(space);
  return integral;
}

static double mass_in_haloes(double log_mass, void *context) {
  const integrand *of = context;
  double mass = exp(log_mass);
  return mass * ew_mass_function_at(of->function, of->spectrum, mass, of->redshift) /
         ew_matter_density(ew_spectrum_cosmology(of->spectrum));
}

/* Press-Schechter: the mass in haloes between two masses is the part of walks that first cross between the two, a
 * difference of complementary error functions that is 1 over all masses. */
static void press_schechter_holds_all_mass(void **state) {
  (void)state;
  world of = make_world(EW_THRESHOLD_CONSTANT);
  const double redshifts[] = {0.0, 2.385, 7.0};
  for (size_t i = 0; i < 3; i++) {
    integrand in = {.spectrum = of.spectrum, .function = &ew_press_schechter, .redshift = redshifts[i]};
    double barrier = ew_barrier(of.cosmology, redshifts[i]);
    double low = barrier / ew_sigma(of.spectrum, 1e3), high = barrier / ew_sigma(of.spectrum, 1e16);
    double expected = erfc(low / sqrt(2.0)) - erfc(high / sqrt(2.0));
    double mass = integrate(mass_in_haloes, &in, 1e3, 1e16);
    assert_close(mass, expected, CONSERVATION_TOLERANCE, "mass in haloes", redshifts[i]);
    assert_true(mass < 1.0);
  }
  free_world(&of);
}

static double multiplicity_per_log(double log_peak_height, void *context) {
  const integrand *of = context;
  return of->function->multiplicity(exp(log_peak_height));
}

/* int f dln nu = 1: exactly for Press-Schechter, to the digits of A = 0.3222 for Sheth-Tormen. The power law at low
 * nu, nu^0.4 of Sheth-Tormen, leaves 1e-5 below 1e-12. */
static void multiplicities_are_normalised(void **state) {
  (void)state;
  integrand ps = {.function = &ew_press_schechter}, st = {.function = &ew_sheth_tormen};
  assert_close(integrate(multiplicity_per_log, &ps, 1e-9, 30.0), 1.0, 1e-8, "int f dln nu", 0.0);
  assert_close(integrate(multiplicity_per_log, &st, 1e-12, 30.0), 1.0, 1e-4, "int f dln nu", 0.0);
}

static double mass_in_progenitors(double log_mass, void *context) {
  const integrand *of = context;
  double mass = exp(log_mass);
  return ew_progenitor_number(of->spectrum, &of->question, mass) * mass / of->question.mass;
}

static void progenitors_add_up(void **state) {
  (void)state;
  world of = make_world(EW_THRESHOLD_CONSTANT);
  const ew_progenitor_question questions[] = {{1e12, 0.0, 0.3}, {1e12, 0.0, 4.0}, {3e9, 1.0, 6.0}, {2e8, 7.0, 20.0}};
  for (size_t i = 0; i < sizeof questions / sizeof *questions; i++)
    for (double share = 1e-4; share < 0.9; share *= 5.0) {
      integrand in = {.spectrum = of.spectrum, .question = questions[i]};
      double mass = share * questions[i].mass;
      double above = ew_progenitor_fraction_above(of.spectrum, &questions[i], mass);
      double summed = integrate(mass_in_progenitors, &in, mass, questions[i].mass);
      assert_close(summed, above, CONSERVATION_TOLERANCE, "mass in progenitors", mass);
    }
  free_world(&of);
}

/* By hand from the tables' sigma, slope and D(2): the first mass is a progenitor of the last. */
static void progenitors_from_tables(void **state) {
  (void)state;
  world of = make_world(EW_THRESHOLD_CONSTANT);
  reference *table = read_reference(EW_TEST_DATA "/cosmology_sigma.csv");
  const double *low = table->row[9], *high = table->row[21];
  ew_progenitor_question question = {.mass = high[0], .redshift = 0.0, .earlier = 2.0};
  double rise = 1.68647 * (1.0 / 0.41705705992 - 1.0), spread = low[1] * low[1] - high[1] * high[1];
  double fraction = erfc(rise / sqrt(2.0 * spread));
  double number = high[0] / low[0] * sqrt(2.0 / EW_PI) * rise * low[1] * low[1] / pow(spread, 1.5) *
                  exp(-0.5 * rise * rise / spread) * -low[2];
  assert_close(ew_progenitor_fraction_above(of.spectrum, &question, low[0]), fraction, 1e-6, "fraction", low[0]);
  assert_close(ew_progenitor_number(of.spectrum, &question, low[0]), number, 1e-6, "number", low[0]);
  free(table);
  free_world(&of);
}

static void no_progenitors(void **state) {
  (void)state;
  world of = make_world(EW_THRESHOLD_CONSTANT);
  const ew_spectrum *s = of.spectrum;
  ew_progenitor_question question = {.mass = 1e10, .redshift = 1.0, .earlier = 3.0};
  assert_true(ew_progenitor_number(s, &question, 1e10) == 0.0);
  assert_true(ew_progenitor_number(s, &question, 2e10) == 0.0);
  assert_true(ew_progenitor_fraction_above(s, &question, 1e10) == 0.0);
  /* below the table, like its lowest mass */
  assert_true(ew_progenitor_number(s, &question, 1.0) == ew_progenitor_number(s, &question, EW_LOWEST_MASS));
  assert_true(ew_progenitor_fraction_above(s, &question, (double)NAN) ==
              ew_progenitor_fraction_above(s, &question, EW_LOWEST_MASS));
  assert_true(ew_progenitor_fraction_above(s, &question, EW_LOWEST_MASS) > 0.0);
  question.earlier = 1.0; /* no time for any change: all is in the halo itself */
  assert_true(ew_progenitor_number(s, &question, 1e9) == 0.0);
  assert_true(ew_progenitor_fraction_above(s, &question, 1e9) == 1.0);
  question.earlier = 0.5; /* later than the halo */
  assert_true(ew_progenitor_number(s, &question, 1e9) == 0.0);
  assert_true(ew_progenitor_fraction_above(s, &question, 1e9) == 1.0);
  free_world(&of);
}

int main(void) {
  ew_core_start();
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(library_table),
      cmocka_unit_test(multiplicity_by_hand),
      cmocka_unit_test(press_schechter_holds_all_mass),
      cmocka_unit_test(multiplicities_are_normalised),
      cmocka_unit_test(progenitors_add_up),
      cmocka_unit_test(progenitors_from_tables),
      cmocka_unit_test(no_progenitors),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
