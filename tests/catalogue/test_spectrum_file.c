/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The spectrum file: its grids as scripts rely on them, and values as the cosmology room gives them (which has its own
 * tests against published tables). */
#include "elfinwood/catalogue.h"
#include "look.h"

#include <math.h>

/* Flat, without radiation: Planck Collaboration VI 2020, A&A 641, A6, Table 2. */
static const ew_cosmology_parameters planck = {.hubble = 0.6736,
                                               .omega_matter = 0.3153,
                                               .omega_baryon = 0.0493,
                                               .spectral_index = 0.9649,
                                               .sigma8 = 0.8111,
                                               .cmb_temperature = 2.7255,
                                               .neutrino_number = 3.046};

static look_path folder;
static ew_cosmology *cosmology;
static ew_spectrum *spectrum;
static hid_t file;

/* One file for all tests. */
static int write_file(void **state) {
  (void)state;
  ew_error error = {0};
  const ew_spectrum_parameters parameters = {0};
  folder = look_make_folder();
  look_path path = look_join(folder, "spectrum.h5");
  if (ew_cosmology_new(&cosmology, &planck, &error) != EW_OK ||
      ew_spectrum_new(&spectrum, cosmology, &parameters, &error) != EW_OK ||
      ew_spectrum_write(spectrum, path.path, "cosmology: {};\n", &error) != EW_OK) {
    print_error("%s\n", error.message);
    return 1;
  }
  file = look_open(path);
  return 0;
}

static int remove_file(void **state) {
  (void)state;
  H5Fclose(file);
  ew_spectrum_free(spectrum);
  ew_cosmology_free(cosmology);
  look_remove_folder(folder);
  return 0;
}

static void test_background_is_even_in_ln_a(void **state) {
  (void)state;
  size_t count;
  double *redshift = look_reals(file, "/background/redshift", &count);
  assert_true(count >= 400);
  assert_true(redshift[0] == 0.0 && redshift[count - 1] == 50.0);
  double step = log1p(50.0) / (double)(count - 1);
  for (size_t i = 0; i < count; i++)
    assert_true(fabs(log1p(redshift[i]) - step * (double)i) < 1e-12); /* rounding */
  free(redshift);
}

typedef double background_function(const ew_cosmology *of, double redshift);

static void assert_background(const char *name, background_function *expected) {
  size_t count;
  double *redshift = look_reals(file, "/background/redshift", NULL), *value = look_reals(file, name, &count);
  for (size_t i = 0; i < count; i++)
    assert_true(value[i] == expected(cosmology, redshift[i]));
  free(redshift);
  free(value);
}

static void test_background_columns_are_those_of_the_cosmology(void **state) {
  (void)state;
  assert_background("/background/time", ew_age);
  assert_background("/background/hubble_rate", ew_hubble_rate);
  assert_background("/background/comoving_distance", ew_comoving_distance);
  assert_background("/background/luminosity_distance", ew_luminosity_distance);
  assert_background("/background/growth", ew_growth);
}

static void test_power_columns_are_those_of_the_spectrum(void **state) {
  (void)state;
  size_t count, powers;
  double *wavenumber = look_reals(file, "/power/wavenumber", &count);
  double *transfer = look_reals(file, "/power/transfer", NULL), *power = look_reals(file, "/power/power", &powers);
  assert_int_equal(count, powers);
  for (size_t i = 0; i < count; i++) {
    assert_true(i == 0 || wavenumber[i] > wavenumber[i - 1]);
    assert_true(transfer[i] == ew_transfer_at(spectrum, wavenumber[i]));
    assert_true(power[i] == ew_power_at(spectrum, wavenumber[i]));
  }
  free(wavenumber);
  free(transfer);
  free(power);
}

static void test_variance_covers_1e4_to_1e15(void **state) {
  (void)state;
  size_t count;
  double *mass = look_reals(file, "/variance/mass", &count), *sigma = look_reals(file, "/variance/sigma", NULL);
  double *slope = look_reals(file, "/variance/slope", NULL);
  assert_true(count >= 11 * 20 + 1);
  assert_true(fabs(mass[0] / 1e4 - 1.0) < 1e-12 && fabs(mass[count - 1] / 1e15 - 1.0) < 1e-12); /* rounding */
  for (size_t i = 0; i < count; i++) {
    assert_true(i == 0 || (mass[i] > mass[i - 1] && sigma[i] < sigma[i - 1]));
    assert_true(sigma[i] == ew_sigma(spectrum, mass[i]) && slope[i] == ew_sigma_slope(spectrum, mass[i]));
  }
  free(mass);
  free(sigma);
  free(slope);
}

static bool has(const double *values, size_t count, double wanted) {
  for (size_t i = 0; i < count; i++)
    if (values[i] == wanted)
      return true;
  return false;
}

static void assert_mass_function(const char *name, const ew_mass_function *function) {
  size_t masses, redshifts;
  double *mass = look_reals(file, "/mass_function/mass", &masses);
  double *redshift = look_reals(file, "/mass_function/redshift", &redshifts);
  double *value = look_reals(file, name, NULL);
  hid_t dataset = H5Dopen2(file, name, H5P_DEFAULT), space = H5Dget_space(dataset);
  hsize_t extent[2] = {0, 0};
  assert_int_equal(H5Sget_simple_extent_ndims(space), 2);
  H5Sget_simple_extent_dims(space, extent, NULL);
  assert_true(extent[0] == redshifts && extent[1] == masses);
  for (size_t z = 0; z < redshifts; z++)
    for (size_t i = 0; i < masses; i++)
      assert_true(value[z * masses + i] == ew_mass_function_at(function, spectrum, mass[i], redshift[z]));
  H5Sclose(space);
  H5Dclose(dataset);
  free(mass);
  free(redshift);
  free(value);
}

static void test_mass_functions_are_redshift_by_mass(void **state) {
  (void)state;
  static const double wanted[] = {0, 1, 2, 4, 6, 10};
  size_t count, masses, variances;
  double *redshift = look_reals(file, "/mass_function/redshift", &count);
  for (size_t i = 0; i < sizeof wanted / sizeof wanted[0]; i++)
    assert_true(has(redshift, count, wanted[i]));
  double *mass = look_reals(file, "/mass_function/mass", &masses);
  double *of_variance = look_reals(file, "/variance/mass", &variances);
  assert_int_equal(masses, variances);
  assert_memory_equal(mass, of_variance, masses * sizeof *mass);
  assert_mass_function("/mass_function/press_schechter", &ew_press_schechter);
  assert_mass_function("/mass_function/sheth_tormen", &ew_sheth_tormen);
  free(redshift);
  free(mass);
  free(of_variance);
}

static void test_the_file_is_complete_and_says_its_parameters(void **state) {
  (void)state;
  assert_int_equal(look_integer_attribute(file, "complete"), 1);
  char *parameters = look_text_attribute(file, "/", "parameters");
  char *unit = look_text_attribute(file, "/background/time", "unit");
  assert_string_equal(parameters, "cosmology: {};\n");
  assert_string_equal(unit, "Gyr");
  free(parameters);
  free(unit);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(test_background_is_even_in_ln_a),
      cmocka_unit_test(test_background_columns_are_those_of_the_cosmology),
      cmocka_unit_test(test_power_columns_are_those_of_the_spectrum),
      cmocka_unit_test(test_variance_covers_1e4_to_1e15),
      cmocka_unit_test(test_mass_functions_are_redshift_by_mass),
      cmocka_unit_test(test_the_file_is_complete_and_says_its_parameters),
  };
  return cmocka_run_group_tests(tests, write_file, remove_file);
}
