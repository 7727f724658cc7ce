/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The concentration-mass relation against independent values, and its table against the relation. */
#include "elfinwood/halo.h"
#include "planck18.h"

#include <math.h>
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdio.h>

#include <cmocka.h>

#define TABLE_TOLERANCE 0.005 /* promised */

typedef struct {
  ew_cosmology *cosmology;
  ew_spectrum *spectrum;
  ew_concentration *concentration;
} world;

static void universe_end(world *universe) {
  ew_concentration_free(universe->concentration);
  ew_spectrum_free(universe->spectrum);
  ew_cosmology_free(universe->cosmology);
}

static ew_status universe_begin(world *universe, const ew_cosmology_parameters *parameters, int transfer) {
  const ew_spectrum_parameters spectrum = {.transfer = transfer, .filter = EW_FILTER_TOP_HAT};
  *universe = (world){0};
  ew_status status = ew_cosmology_new(&universe->cosmology, parameters, NULL);
  if (status == EW_OK)
    status = ew_spectrum_new(&universe->spectrum, universe->cosmology, &spectrum, NULL);
  if (status == EW_OK)
    status = ew_concentration_new(&universe->concentration, universe->spectrum, NULL);
  return status;
}

static world planck;

static int begin(void **state) {
  ew_core_start();
  *state = &planck;
  return universe_begin(&planck, &planck18, EW_TRANSFER_EISENSTEIN_HU) == EW_OK ? 0 : -1;
}

static int end(void **state) {
  universe_end(*state);
  return 0;
}

static void assert_close(double value, double expected, double tolerance) {
  if (!(fabs(value / expected - 1.0) <= tolerance))
    fail_msg("%.10g is not %.10g to %g", value, expected, tolerance);
}

static double concentration_200c(const world *universe, double mass, double redshift) {
  ew_error error = {0};
  double c = (double)NAN;
  if (ew_concentration_200c(universe->spectrum, mass, redshift, &c, &error) != EW_OK)
    fail_msg("%s", error.message);
  return c;
}

static void relation_agrees_with_independent_solution(void **state) {
  const double solver_tolerance = 1e-6; /* that of sigma and its slope, read the same way from the same paper */
  FILE *file = fopen(EW_TEST_DATA "/halo_concentration_200c.csv", "r");
  assert_non_null(file);
  char line[512];
  int rows = 0;
  while (fgets(line, sizeof line, file)) {
    double z, mass, expected;
    if (sscanf(line, "%lf,%lf,%lf", &z, &mass, &expected) != 3)
      continue;
    assert_close(concentration_200c(*state, mass / planck18.hubble, z), expected, solver_tolerance);
    rows++;
  }
  fclose(file);
  assert_int_equal(rows, 48);
}

/* Another relation, fitted to other simulations of nearly this universe: Dutton & Maccio 2014, MNRAS 441, 3359, table 3
 * (from memory), c200c and c_vir at z = 0; the two relations differ by up to 10 per cent. */
static void relation_is_near_another_published_one(void **state) {
  const world *universe = *state;
  for (double log_mass = 10.5; log_mass < 13.6; log_mass += 0.5) {
    double mass = pow(10.0, log_mass) / planck18.hubble;
    assert_close(concentration_200c(universe, mass, 0.0), pow(10.0, 0.905 - 0.101 * (log_mass - 12.0)), 0.1);
    assert_close(ew_concentration_at(universe->concentration, mass, 0.0), pow(10.0, 1.025 - 0.097 * (log_mass - 12.0)),
                 0.1);
  }
}

/* The error of the table at M_vir of a halo whose M200c and c200c are known: no iteration is needed that way round. */
static double table_error(const world *universe, double mass_200c, double redshift) {
  ew_mass_conversion question = {.mass = mass_200c,
                                 .concentration = concentration_200c(universe, mass_200c, redshift),
                                 .overdensity = 200.0,
                                 .wanted = ew_virial_overdensity(universe->cosmology, redshift)};
  double expected;
  double mass = ew_convert_mass(&question, &expected);
  return fabs(ew_concentration_at(universe->concentration, mass, redshift) / expected - 1.0);
}

static void table_agrees_with_relation(void **state) {
  double worst = 0.0;
  for (double z = 0.0; z < 40.0; z = 1.0137 * (1.0 + z) - 1.0)
    for (double mass = 1.01e4; mass < 7.9e15; mass *= 1.093) /* M_vir within the table */
      worst = fmax(worst, table_error(*state, mass, z));
  if (!(worst < TABLE_TOLERANCE))
    fail_msg("the table is off by %g", worst);
}

static void small_haloes_are_more_concentrated_today(void **state) {
  const world *universe = *state;
  double last = (double)INFINITY;
  for (double mass = 1e4; mass < 1e14; mass *= 1.3) {
    double c = ew_concentration_at(universe->concentration, mass, 0.0);
    assert_true(c < last);
    last = c;
  }
}

static void concentration_grows_with_time(void **state) {
  const world *universe = *state;
  double last = (double)INFINITY;
  for (double z = 0.0; z < 5.0; z += 0.05) {
    double c = ew_concentration_at(universe->concentration, 1e10, z);
    assert_true(c < last);
    last = c;
  }
}

static void table_holds_its_ends_outside(void **state) {
  const ew_concentration *table = ((world *)*state)->concentration;
  assert_true(ew_concentration_at(table, 1.0, 1.0) == ew_concentration_at(table, 0.999e4, 1.0));
  assert_true(ew_concentration_at(table, 1e19, 1.0) == ew_concentration_at(table, 1.001e16, 1.0));
  assert_true(ew_concentration_at(table, 1e8, -0.5) == ew_concentration_at(table, 1e8, 0.0));
  assert_true(ew_concentration_at(table, 1e8, 1e3) == ew_concentration_at(table, 1e8, 40.001));
  assert_true(ew_concentration_at(table, 0.0, (double)NAN) > 1.0);
  assert_true(ew_concentration_at(table, (double)NAN, (double)INFINITY) > 1.0);
}

static void relation_refuses_what_is_outside(void **state) {
  const ew_spectrum *spectrum = ((world *)*state)->spectrum;
  static const double bad[][2] = {{0.0, 1.0},  {-1e9, 1.0},        {1e17, 1.0}, {(double)NAN, 1.0},
                                  {1e9, -0.1}, {1e9, (double)NAN}, {1e9, 61.0}};
  for (size_t i = 0; i < sizeof bad / sizeof bad[0]; i++) {
    ew_error error = {0};
    double c;
    assert_int_equal(ew_concentration_200c(spectrum, bad[i][0], bad[i][1], &c, &error), EW_REFUSED);
    assert_true(error.message[0]);
  }
}

/* In every universe somebody may ask for, from haloes that are everywhere to haloes that are nowhere (peak heights up
 * to a few hundred), the relation has a solution. The smallest that it can give is about 2. */
static void every_universe_has_concentrations(void **state) {
  (void)state;
  for (int i = 0; i < 16; i++) {
    ew_cosmology_parameters parameters = planck18;
    parameters.spectral_index = i & 1 ? 1.2 : 0.8;
    parameters.sigma8 = i & 2 ? 1.1 : 0.5;
    parameters.omega_matter = i & 4 ? 0.9 : 0.15;
    parameters.radiation = i & 8;
    world other;
    assert_int_equal(universe_begin(&other, &parameters, i & 1 ? EW_TRANSFER_EISENSTEIN_HU_SMOOTH : 0), EW_OK);
    for (double z = 0.0; z <= EW_HIGHEST_REDSHIFT; z += 3.0)
      for (double mass = EW_LOWEST_MASS; mass <= EW_HIGHEST_MASS; mass *= 9.99)
        assert_true(concentration_200c(&other, mass, z) > 1.5);
    universe_end(&other);
  }
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(relation_agrees_with_independent_solution),
      cmocka_unit_test(relation_is_near_another_published_one),
      cmocka_unit_test(table_agrees_with_relation),
      cmocka_unit_test(small_haloes_are_more_concentrated_today),
      cmocka_unit_test(concentration_grows_with_time),
      cmocka_unit_test(table_holds_its_ends_outside),
      cmocka_unit_test(relation_refuses_what_is_outside),
      cmocka_unit_test(every_universe_has_concentrations),
  };
  return cmocka_run_group_tests(tests, begin, end);
}
