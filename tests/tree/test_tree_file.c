/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The tree file: two small trees laid out by hand, and what the file must say of them. */
#include "elfinwood/tree.h"
#include "folder.h"

/* A main branch of four nodes that one branch of two nodes joins at its second and third. */
static const ew_branch first_branches[] = {
    {.key = 0xfedcba9876543210u, .first_node = 0, .node_count = 2, .joins_branch = 1, .joins_node = 4},
    {.key = 11, .first_node = 2, .node_count = 4, .joins_branch = -1, .joins_node = 0},
};
static const double first_mass[] = {1e6, 2.5e6, 2e6, 5e6, 7.5e6, 1.25e7};
static const double first_redshift[] = {9.5, 3.25, 8.0, 3.25, 3.25, 0.5};
static const ew_tree first = {.number = 40,
                              .halo_id = -1,
                              .weight = 1.0,
                              .branch_count = 2,
                              .node_count = 6,
                              .branch = first_branches,
                              .mass = first_mass,
                              .redshift = first_redshift};

/* A root alone, with an identifier of the user's and a weight. */
static const ew_branch second_branches[] = {
    {.key = 12, .first_node = 0, .node_count = 1, .joins_branch = -1, .joins_node = 0}};
static const double second_mass[] = {3e8}, second_redshift[] = {0.5};
static const ew_tree second = {.number = 41,
                               .halo_id = 7000000000,
                               .weight = 2.385,
                               .branch_count = 1,
                               .node_count = 1,
                               .branch = second_branches,
                               .mass = second_mass,
                               .redshift = second_redshift};

static const ew_cosmology_parameters cosmology = {.hubble = 0.6736,
                                                  .omega_matter = 0.3153,
                                                  .omega_baryon = 0.0493,
                                                  .spectral_index = 0.9649,
                                                  .sigma8 = 0.8111,
                                                  .cmb_temperature = 2.7255,
                                                  .neutrino_number = 3.046,
                                                  .radiation = true};
static const ew_tree_file_header header = {"roots: { count = 2; };\n", &cosmology, 3e5, 17};

static ew_tree_file *create(const char *name) {
  ew_tree_file *file;
  ew_error error = {0};
  if (ew_tree_file_create(&file, look_join(folder, name).path, &header, &error) != EW_OK)
    fail_msg("%s", error.message);
  return file;
}

static void assert_integers(hid_t file, const char *name, const int64_t *expected, size_t expected_count) {
  size_t count;
  int64_t *values = look_integers(file, name, &count);
  assert_int_equal(count, expected_count);
  for (size_t i = 0; i < count; i++)
    if (values[i] != expected[i])
      fail_msg("%s[%zu] is %lld, not %lld", name, i, (long long)values[i], (long long)expected[i]);
  free(values);
}

static void assert_reals(hid_t file, const char *name, const double *expected, size_t expected_count) {
  size_t count;
  double *values = look_reals(file, name, &count);
  assert_int_equal(count, expected_count);
  for (size_t i = 0; i < count; i++)
    if (values[i] != expected[i])
      fail_msg("%s[%zu] is %.17g, not %.17g", name, i, values[i], expected[i]);
  free(values);
}

#define ASSERT_INTEGERS(file, name, ...)                                                                               \
  do {                                                                                                                 \
    const int64_t listed[] = {__VA_ARGS__};                                                                            \
    assert_integers(file, name, listed, sizeof listed / sizeof listed[0]);                                             \
  } while (0)
#define ASSERT_REALS(file, name, ...)                                                                                  \
  do {                                                                                                                 \
    const double listed[] = {__VA_ARGS__};                                                                             \
    assert_reals(file, name, listed, sizeof listed / sizeof listed[0]);                                                \
  } while (0)

static void test_indices_count_through_the_whole_file(void **state) {
  (void)state;
  ew_error error = {0};
  ew_tree_file *made = create("two.h5");
  assert_int_equal(ew_tree_file_append(made, &first, &error), EW_OK);
  assert_int_equal(ew_tree_file_append(made, &second, &error), EW_OK);
  assert_int_equal(ew_tree_file_append(made, &first, &error), EW_OK);
  assert_int_equal(ew_tree_file_finish(made, &error), EW_OK);
  assert_int_equal(ew_tree_file_kept(made), 3);
  ew_tree_file_close(made);

  hid_t file = look_open(look_join(folder, "two.h5"));
  ASSERT_INTEGERS(file, "/trees/number", 40, 41, 40);
  ASSERT_INTEGERS(file, "/trees/halo_id", -1, 7000000000, -1);
  ASSERT_INTEGERS(file, "/trees/branch_offset", 0, 2, 3, 5);
  ASSERT_REALS(file, "/trees/root_mass", 1.25e7, 3e8, 1.25e7);
  ASSERT_REALS(file, "/trees/root_redshift", 0.5, 0.5, 0.5);
  ASSERT_REALS(file, "/trees/weight", 1.0, 2.385, 1.0);
  ASSERT_INTEGERS(file, "/branches/node_offset", 0, 2, 6, 7, 9, 13);
  ASSERT_INTEGERS(file, "/branches/joins_branch", 1, -1, -1, 4, -1);
  ASSERT_INTEGERS(file, "/branches/joins_node", 4, -1, -1, 11, -1);
  ASSERT_INTEGERS(file, "/branches/key", (int64_t)0xfedcba9876543210u, 11, 12, (int64_t)0xfedcba9876543210u, 11);
  ASSERT_REALS(file, "/nodes/mass", 1e6, 2.5e6, 2e6, 5e6, 7.5e6, 1.25e7, 3e8, 1e6, 2.5e6, 2e6, 5e6, 7.5e6, 1.25e7);
  ASSERT_REALS(file, "/nodes/redshift", 9.5, 3.25, 8.0, 3.25, 3.25, 0.5, 0.5, 9.5, 3.25, 8.0, 3.25, 3.25, 0.5);
  H5Fclose(file);
}

static void test_attributes_say_how_the_trees_were_made(void **state) {
  (void)state;
  ew_error error = {0};
  ew_tree_file *made = create("empty.h5");
  assert_int_equal(ew_tree_file_finish(made, &error), EW_OK);
  ew_tree_file_close(made);

  hid_t file = look_open(look_join(folder, "empty.h5"));
  static const struct {
    const char *name;
    double value;
  } expected[] = {{"hubble", 0.6736},         {"omega_matter", 0.3153}, {"omega_baryon", 0.0493},
                  {"spectral_index", 0.9649}, {"sigma8", 0.8111},       {"cmb_temperature", 2.7255},
                  {"neutrino_number", 3.046}, {"resolution_mass", 3e5}};
  for (size_t i = 0; i < sizeof expected / sizeof expected[0]; i++) {
    double value;
    look_attribute(file, "/", expected[i].name, &value);
    assert_true(value == expected[i].value);
  }
  assert_int_equal(look_integer_attribute(file, "seed"), 17);
  assert_int_equal(look_integer_attribute(file, "radiation"), 1);
  assert_int_equal(look_integer_attribute(file, "complete"), 1);
  char *parameters = look_text_attribute(file, "/", "parameters");
  assert_string_equal(parameters, header.parameter_text);
  free(parameters);
  ASSERT_INTEGERS(file, "/trees/branch_offset", 0);
  ASSERT_INTEGERS(file, "/branches/node_offset", 0);
  assert_int_equal(look_count(file, "/nodes/mass"), 0);
  H5Fclose(file);
}

static void test_an_unfinished_file_holds_whole_trees(void **state) {
  (void)state;
  ew_error error = {0};
  ew_tree_file *made = create("half.h5");
  assert_int_equal(ew_tree_file_append(made, &first, &error), EW_OK);
  assert_int_equal(ew_tree_file_kept(made), 1);
  assert_int_equal(ew_tree_file_append(made, &second, &error), EW_OK);
  ew_tree_file_close(made);
  ew_tree_file_close(NULL);
  assert_false(look_exists(look_join(folder, "half.h5")));
  hid_t file = look_open(look_join(folder, "half.h5.partial"));
  assert_int_equal(look_integer_attribute(file, "complete"), 0);
  ASSERT_INTEGERS(file, "/trees/branch_offset", 0, 2, 3);
  ASSERT_INTEGERS(file, "/branches/node_offset", 0, 2, 6, 7);
  assert_int_equal(look_count(file, "/nodes/mass"), 7);
  H5Fclose(file);
}

/* Offsets cannot express branches whose nodes lie elsewhere. */
static void test_a_tree_out_of_order_is_not_written(void **state) {
  (void)state;
  ew_error error = {0};
  ew_branch swapped[2] = {first_branches[0], first_branches[1]};
  swapped[0].first_node = 4;
  swapped[1].first_node = 0;
  ew_tree wrong = first;
  wrong.branch = swapped;
  ew_tree_file *made = create("wrong.h5");
  assert_int_equal(ew_tree_file_append(made, &wrong, &error), EW_FAILED);
  assert_non_null(strstr(error.message, "tree 40"));
  assert_int_equal(ew_tree_file_kept(made), 0);
  ew_tree_file_close(made);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(test_indices_count_through_the_whole_file),
      cmocka_unit_test(test_attributes_say_how_the_trees_were_made),
      cmocka_unit_test(test_an_unfinished_file_holds_whole_trees),
      cmocka_unit_test(test_a_tree_out_of_order_is_not_written),
  };
  return cmocka_run_group_tests(tests, make_folder, remove_folder);
}
