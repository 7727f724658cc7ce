/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The jobs end to end: what they write, that threads do not matter, and that a catalogue can be made again from the
 * parameters that it carries. */
#include "program.h"

#define FOLDER_FILE "small.cfg"
#define FOLDER_TEXT PROGRAM_SMALL
#include "folder.h"

#include <math.h>

enum { TREES = 6, REALIZATIONS = 2 };

static void test_run_writes_a_catalogue_named_after_the_file(void **state) {
  (void)state;
  program_assert_prints(folder, "run small.cfg", "wrote small.h5 (12 galaxies of 6 trees, ");
  hid_t file = look_open(look_join(folder, "small.h5"));
  size_t rows, trees;
  int64_t *tree = look_integers(file, "/galaxies/tree", &rows);
  int64_t *realization = look_integers(file, "/galaxies/realization", NULL);
  int64_t *central = look_integers(file, "/galaxies/central", NULL);
  double *halo_mass = look_reals(file, "/galaxies/halo_mass", NULL);
  double *root_mass = look_reals(file, "/trees/root_mass", &trees);
  assert_int_equal(rows, TREES * REALIZATIONS);
  assert_int_equal(trees, TREES);
  for (size_t i = 0; i < rows; i++) {
    assert_int_equal(tree[i], i / REALIZATIONS);
    assert_int_equal(realization[i], i % REALIZATIONS);
    assert_int_equal(central[i], 1);
    assert_true(halo_mass[i] == root_mass[tree[i]]);
    assert_true(halo_mass[i] >= 1e8 && halo_mass[i] <= 1e9);
  }
  assert_int_equal(look_integer_attribute(file, "complete"), 1);
  assert_false(look_exists(look_join(folder, "small.h5.partial")));
  free(tree);
  free(realization);
  free(central);
  free(halo_mass);
  free(root_mass);
  H5Fclose(file);
}

/* Columns that have no meaning without stars are NaN, and only those. */
static void test_haloes_without_stars_are_rows(void **state) {
  (void)state;
  program_run(folder, "run small.cfg --set first_stars.threshold=atomic --set roots.kind=single --set roots.mass=1e7 "
                      "-o dark.h5 --quiet");
  hid_t file = look_open(look_join(folder, "dark.h5"));
  size_t rows;
  double *luminosity = look_reals(file, "/galaxies/luminosity_v", &rows);
  double *metallicity = look_reals(file, "/galaxies/metallicity", NULL);
  double *halo_mass = look_reals(file, "/galaxies/halo_mass", NULL);
  int64_t *quenched = look_integers(file, "/galaxies/quenched", NULL);
  assert_int_equal(rows, TREES * REALIZATIONS);
  for (size_t i = 0; i < rows; i++) {
    assert_true(luminosity[i] == 0.0);
    assert_true(isnan(metallicity[i]));
    assert_true(halo_mass[i] == 1e7);
    assert_int_equal(quenched[i], -1);
  }
  free(luminosity);
  free(metallicity);
  free(halo_mass);
  free(quenched);
  H5Fclose(file);
}

static void test_threads_and_repetition_change_nothing(void **state) {
  (void)state;
  program_run(folder, "run small.cfg --threads 1 -o one.h5");
  program_run(folder, "run small.cfg --threads 2 -o two.h5");
  program_run(folder, "run small.cfg --threads=3 --output=three.h5");
  look_assert_equal(look_join(folder, "one.h5"), look_join(folder, "two.h5"));
  look_assert_equal(look_join(folder, "one.h5"), look_join(folder, "three.h5"));
  program_run(folder, "trees small.cfg --threads 1 -o one.trees.h5");
  program_run(folder, "trees small.cfg --threads 2 -o two.trees.h5");
  look_assert_equal(look_join(folder, "one.trees.h5"), look_join(folder, "two.trees.h5"));
}

static void test_the_seed_matters_and_the_number_of_trees_does_not(void **state) {
  (void)state;
  program_run(folder, "run small.cfg -o six.h5");
  program_run(folder, "run small.cfg --set roots.count=4 -o four.h5");
  program_run(folder, "run small.cfg --seed 2 -o other.h5");
  assert_true(look_assert_prefix(look_join(folder, "four.h5"), look_join(folder, "six.h5")) > 0);
  hid_t six = look_open(look_join(folder, "six.h5")), other = look_open(look_join(folder, "other.h5"));
  double *mass = look_reals(six, "/trees/root_mass", NULL), *other_mass = look_reals(other, "/trees/root_mass", NULL);
  assert_true(mass[0] != other_mass[0]);
  free(mass);
  free(other_mass);
  H5Fclose(six);
  H5Fclose(other);
}

static void test_the_echo_in_a_catalogue_runs_again(void **state) {
  (void)state;
  program_run(folder, "run small.cfg --seed 5 --set cosmology.hubble=0.7 --set roots.mass_range=[2e8,7e8] -o first.h5");
  hid_t file = look_open(look_join(folder, "first.h5"));
  char *parameters = look_text_attribute(file, "/", "parameters");
  H5Fclose(file);
  look_write_text(look_join(folder, "echo.cfg"), parameters);
  free(parameters);
  program_run(folder, "run echo.cfg");
  look_assert_equal(look_join(folder, "first.h5"), look_join(folder, "echo.h5"));
}

static void test_quiet_prints_nothing(void **state) {
  (void)state;
  static const char *const lines[] = {"run small.cfg --quiet", "trees small.cfg --quiet", "spectrum small.cfg --quiet"};
  for (size_t i = 0; i < sizeof lines / sizeof lines[0]; i++) {
    char *out = program_assert_succeeds(folder, lines[i]);
    assert_string_equal(out, "");
    free(out);
  }
}

/* The tree file's trees are those that `run` grows. */
static void test_trees_writes_the_trees_of_run(void **state) {
  (void)state;
  program_run(folder, "run small.cfg");
  program_assert_prints(folder, "trees small.cfg", "wrote small.trees.h5 (6 trees, ");
  hid_t file = look_open(look_join(folder, "small.trees.h5")), catalogue = look_open(look_join(folder, "small.h5"));
  size_t trees, offsets;
  double *mass = look_reals(file, "/trees/root_mass", &trees);
  double *expected = look_reals(catalogue, "/trees/root_mass", NULL);
  int64_t *branches = look_integers(catalogue, "/trees/branches", NULL);
  int64_t *offset = look_integers(file, "/trees/branch_offset", &offsets);
  int64_t *number = look_integers(file, "/trees/number", NULL);
  assert_int_equal(trees, TREES);
  assert_int_equal(offsets, TREES + 1);
  for (size_t i = 0; i < trees; i++) {
    assert_int_equal(number[i], i);
    assert_true(mass[i] == expected[i]);
    assert_int_equal(offset[i + 1] - offset[i], branches[i]);
  }
  assert_int_equal(look_count(file, "/branches/key"), offset[TREES]);
  free(mass);
  free(expected);
  free(branches);
  free(offset);
  free(number);
  H5Fclose(file);
  H5Fclose(catalogue);
}

static void test_spectrum_writes_and_prints(void **state) {
  (void)state;
  program_assert_prints(folder, "spectrum small.cfg", "wrote small.spectrum.h5");
  hid_t file = look_open(look_join(folder, "small.spectrum.h5"));
  assert_true(look_count(file, "/background/growth") >= 400);
  char *parameters = look_text_attribute(file, "/", "parameters");
  assert_non_null(strstr(parameters, "hubble"));
  free(parameters);
  H5Fclose(file);
}

/* The demo's parameter file, cut down to what a test can wait for. */
static void test_the_demo_is_a_valid_request(void **state) {
  (void)state;
  program_assert_prints(folder, "check " EW_SOURCE_FOLDER "/params/dwarfs.cfg",
                        "300 trees of 1e+08 to 3e+10 Msun at redshift 0, resolution 300000 Msun, 5 realizations");
  program_run(folder, "run " EW_SOURCE_FOLDER "/params/dwarfs.cfg --set roots.count=2 --set trees.resolution_mass=1e7");
  hid_t file = look_open(look_join(folder, "dwarfs.h5"));
  assert_int_equal(look_count(file, "/galaxies/tree"), 10);
  H5Fclose(file);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(test_run_writes_a_catalogue_named_after_the_file),
      cmocka_unit_test(test_haloes_without_stars_are_rows),
      cmocka_unit_test(test_threads_and_repetition_change_nothing),
      cmocka_unit_test(test_the_seed_matters_and_the_number_of_trees_does_not),
      cmocka_unit_test(test_the_echo_in_a_catalogue_runs_again),
      cmocka_unit_test(test_quiet_prints_nothing),
      cmocka_unit_test(test_trees_writes_the_trees_of_run),
      cmocka_unit_test(test_spectrum_writes_and_prints),
      cmocka_unit_test(test_the_demo_is_a_valid_request),
  };
  return cmocka_run_group_tests(tests, make_folder, remove_folder);
}
