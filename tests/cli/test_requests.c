/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * What the program refuses, and how it says so: exit status 2, one line on stderr, nothing written. */
#include "program.h"

#define FOLDER_FILE "small.cfg"
#define FOLDER_TEXT PROGRAM_SMALL
#include "folder.h"

static void test_help_and_version_go_to_standard_output(void **state) {
  (void)state;
  static const char *const commands[] = {"run", "check", "parameters", "trees", "spectrum"};
  program_assert_prints(folder, "--version", "elfinwood 0.");
  for (size_t i = 0; i < sizeof commands / sizeof commands[0]; i++) {
    char line[64], part[64];
    snprintf(line, sizeof line, "%s --help", commands[i]);
    snprintf(part, sizeof part, "elfinwood %s", commands[i]);
    program_assert_prints(folder, "--help", commands[i]);
    program_assert_prints(folder, line, part);
  }
  program_assert_prints(folder, "run nothing.cfg --quiet --help", "Options:");
}

static void test_the_command_line_is_checked(void **state) {
  (void)state;
  static const struct {
    const char *line, *part;
  } wrong[] = {
      {"", "usage: elfinwood COMMAND"},
      {"rnu small.cfg", "no command rnu; did you mean run?"},
      {"run", "no parameter file given"},
      {"run small.cfg other.cfg", "given small.cfg and other.cfg"},
      {"run small.cfg --quite", "no option --quite; did you mean --quiet?"},
      {"run small.cfg --thread 2", "did you mean --threads?"},
      {"run small.cfg -x", "no option -x"},
      {"run small.cfg --quiet=yes", "--quiet takes no value"},
      {"run small.cfg --seed", "--seed needs N"},
      {"run small.cfg -o", "-o needs FILE"},
      {"run small.cfg --output=", "the name of the output is empty"},
      {"run small.cfg --threads 0", "--threads = 0: not possible; allowed: a whole number from 1 to 1024"},
      {"run small.cfg --threads two", "--threads = two"},
      {"run small.cfg --threads 99999999999999999999", "a whole number from 1 to 1024"},
      {"parameters small.cfg", "takes no file"},
      {"parameters --seed 1", "no option --seed"},
      {"run missing.cfg", "missing.cfg: No such file or directory"},
      {"run .", "Is a directory"},
      {"check missing.cfg", "missing.cfg"},
  };
  for (size_t i = 0; i < sizeof wrong / sizeof wrong[0]; i++)
    program_assert_fails(folder, wrong[i].line, 2, wrong[i].part);
}

/* The engine has its own tests over the whole table; here its words must reach the user. */
static void test_parameter_files_are_checked(void **state) {
  (void)state;
  static const struct {
    const char *text, *part;
  } wrong[] = {
      {"roots: { cuont = 6; };\n",
       "wrong.cfg:1: roots.cuont = 6: no parameter of that name; did you mean roots.count?"},
      {"rots: { count = 6; };\n", "did you mean roots.count?"},
      {"\nroots: { count = 6; count = 7; };\n", "wrong.cfg:2: roots.count"},
      {"roots: { count = 0; };\n", "roots.count = 0"},
      {"roots: { count = \"many\"; };\n", "roots.count = \"many\": wrong type"},
      {"cosmology: { hubble = nan; };\n", "wrong.cfg:1: cosmology.hubble = nan"},
      {"roots: { kind = \"rang\"; };\n", "roots.kind = \"rang\""},
      {"roots: { mass_range = [3e10, 1e8]; };\n", "roots.mass_range"},
      {"roots: { count = 6; ", "wrong.cfg:1"},
      {"cosmology: { omega_baryon = 0.2; omega_matter = 0.15; };\n", "wrong.cfg:1: cosmology.omega_baryon = 0.2"},
      {"trees: { resolution_mass = 1e9; };\n", "roots.mass_range"},
  };
  for (size_t i = 0; i < sizeof wrong / sizeof wrong[0]; i++) {
    look_write_text(look_join(folder, "wrong.cfg"), wrong[i].text);
    program_assert_fails(folder, "run wrong.cfg", 2, wrong[i].part);
    program_assert_fails(folder, "check wrong.cfg", 2, wrong[i].part);
  }
  assert_false(look_exists(look_join(folder, "wrong.h5")));
  assert_false(look_exists(look_join(folder, "wrong.h5.partial")));
}

static void test_set_and_seed_are_checked_and_named(void **state) {
  (void)state;
  program_assert_fails(folder, "check small.cfg --set roots.cuont=3", 2,
                       "--set: roots.cuont = 3: no parameter of that name; did you mean roots.count?");
  program_assert_fails(folder, "check small.cfg --set roots.count=many", 2, "--set: roots.count = many: wrong type");
  program_assert_fails(folder, "check small.cfg --set roots.count=0", 2, "--set: roots.count = 0");
  program_assert_fails(folder, "check small.cfg --set roots.count", 2, "--set");
  program_assert_fails(folder, "check small.cfg --seed many", 2, "--seed: random.seed = many");
  program_assert_fails(folder, "check small.cfg --seed=-1", 2, "--seed: random.seed = -1");
}

static void test_check_tells_the_facts_and_writes_nothing(void **state) {
  (void)state;
  program_assert_prints(folder, "check small.cfg", "small.cfg is fine: 6 trees of 1e+08 to 1e+09 Msun");
  program_assert_prints(folder, "check small.cfg --set roots.kind=single --set roots.mass=5e9",
                        "6 trees of 5e+09 Msun at redshift 0, resolution 1e+06 Msun, 2 realizations");
  char *out = program_assert_succeeds(folder, "check small.cfg --quiet -o fine.h5");
  assert_string_equal(out, "");
  free(out);
  assert_false(look_exists(look_join(folder, "small.h5")));
  assert_false(look_exists(look_join(folder, "fine.h5.partial")));
}

static void test_the_order_of_precedence(void **state) {
  (void)state;
  program_assert_prints(folder, "check small.cfg --set roots.count=3 --set roots.count=4", "fine: 4 trees");
  program_assert_prints(folder, "check --set=roots.count=3 -- small.cfg", "fine: 3 trees");
  program_run(folder, "run --seed 7 small.cfg --set random.seed=8 --set roots.count=1 -o seed.h5");
  hid_t file = look_open(look_join(folder, "seed.h5"));
  assert_int_equal(look_integer_attribute(file, "seed"), 7);
  char *parameters = look_text_attribute(file, "/", "parameters");
  assert_non_null(strstr(parameters, "seed = 7"));
  free(parameters);
  H5Fclose(file);
}

static void test_the_parameter_file_is_never_the_output(void **state) {
  (void)state;
  static const char part[] = "would replace the parameter file";
  look_write_text(look_join(folder, "mine.h5"), PROGRAM_SMALL);
  look_write_text(look_join(folder, "his.h5.partial"), PROGRAM_SMALL);
  program_assert_fails(folder, "run mine.h5", 2, part);
  program_assert_fails(folder, "run mine.h5 -o ./mine.h5", 2, part);
  program_assert_fails(folder, "run his.h5.partial -o his.h5", 2, part);
  char *text = look_read_text(look_join(folder, "his.h5.partial"));
  assert_string_equal(text, PROGRAM_SMALL);
  free(text);
}

static void test_parameters_lists_the_table(void **state) {
  (void)state;
  static const char *const names[] = {"cosmology.hubble", "roots.mass_range", "trees.resolution_mass", "random.seed"};
  for (size_t i = 0; i < sizeof names / sizeof names[0]; i++)
    program_assert_prints(folder, "parameters", names[i]);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(test_help_and_version_go_to_standard_output),
      cmocka_unit_test(test_the_command_line_is_checked),
      cmocka_unit_test(test_parameter_files_are_checked),
      cmocka_unit_test(test_set_and_seed_are_checked_and_named),
      cmocka_unit_test(test_check_tells_the_facts_and_writes_nothing),
      cmocka_unit_test(test_the_order_of_precedence),
      cmocka_unit_test(test_the_parameter_file_is_never_the_output),
      cmocka_unit_test(test_parameters_lists_the_table),
  };
  return cmocka_run_group_tests(tests, make_folder, remove_folder);
}
