/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The catalogue file with invented rows: every field comes back in the column of its name. */
#include "elfinwood/catalogue.h"
#include "folder.h"

#include <math.h>

enum { TREES = 40, PER_TREE = 3 };

static const ew_catalogue_header header = {"ensemble: { realizations = 3; };\n", 23};

/* Fills every column with a value of its own, by the table. */
static void fill(void *row, const ew_column *columns, size_t count, int64_t number) {
  for (size_t i = 0; i < count; i++) {
    void *field = (char *)row + columns[i].offset;
    double real = 1000.0 * (double)number + (double)i + 0.385;
    int64_t integer = 1000 * number + (int64_t)i;
    uint64_t key = UINT64_MAX - (uint64_t)integer;
    memcpy(field,
           columns[i].type == EW_COLUMN_REAL      ? (const void *)&real
           : columns[i].type == EW_COLUMN_INTEGER ? (const void *)&integer
                                                  : (const void *)&key,
           8);
  }
}

static ew_catalogue *write_rows(const char *name, int64_t trees) {
  ew_error error = {0};
  ew_catalogue *catalogue;
  if (ew_catalogue_create(&catalogue, look_join(folder, name).path, &header, &error) != EW_OK)
    fail_msg("%s", error.message);
  ew_row_sink sink = ew_catalogue_sink(catalogue);
  for (int64_t t = 0; t < trees; t++) {
    ew_tree_row tree = {0};
    ew_galaxy_row rows[PER_TREE] = {0};
    fill(&tree, ew_tree_columns, ew_tree_column_count, t);
    for (int64_t r = 0; r < PER_TREE; r++)
      fill(&rows[r], ew_galaxy_columns, ew_galaxy_column_count, PER_TREE * t + r);
    rows[1].observed.metallicity = (double)NAN;
    assert_int_equal(sink.take(sink.context, &tree, rows, PER_TREE, &error), EW_OK);
  }
  return catalogue;
}

static void finish(ew_catalogue *catalogue) {
  ew_error error = {0};
  assert_int_equal(ew_catalogue_finish(catalogue, &error), EW_OK);
  ew_catalogue_close(catalogue);
}

/* Value `row` of column `i` is what `fill` gave it. */
static void assert_value(const ew_column *column, size_t i, size_t row, const void *value) {
  int64_t integer;
  double real;
  memcpy(&integer, value, 8);
  memcpy(&real, value, 8);
  int64_t expected = 1000 * (int64_t)row + (int64_t)i;
  if (column->type == EW_COLUMN_INTEGER)
    assert_int_equal(integer, expected);
  else if (column->type == EW_COLUMN_KEY)
    assert_int_equal(integer, -1 - expected);
  else if (strcmp(column->name, "metallicity") == 0 && row % PER_TREE == 1)
    assert_true(isnan(real));
  else
    assert_true(real == (double)expected + 0.385);
}

static void assert_table(hid_t file, const char *group, const ew_column *columns, size_t count, size_t rows) {
  for (size_t i = 0; i < count; i++) {
    char name[128];
    snprintf(name, sizeof name, "%s/%s", group, columns[i].name);
    size_t found;
    char *values = look_values(file, name, &found);
    assert_int_equal(found, rows);
    for (size_t row = 0; row < rows; row++)
      assert_value(&columns[i], i, row, values + 8 * row);
    free(values);
    char *unit = look_text_attribute(file, name, "unit"), *meaning = look_text_attribute(file, name, "meaning");
    assert_string_equal(unit, columns[i].unit);
    assert_string_equal(meaning, columns[i].meaning);
    free(unit);
    free(meaning);
  }
}

static void assert_catalogue(look_path path, size_t trees, int64_t complete) {
  hid_t file = look_open(path);
  assert_int_equal(look_integer_attribute(file, "complete"), complete);
  assert_table(file, "/galaxies", ew_galaxy_columns, ew_galaxy_column_count, PER_TREE * trees);
  assert_table(file, "/trees", ew_tree_columns, ew_tree_column_count, trees);
  H5Fclose(file);
}

static void test_every_field_comes_back_in_its_column(void **state) {
  (void)state;
  finish(write_rows("whole.h5", TREES));
  assert_catalogue(look_join(folder, "whole.h5"), TREES, 1);
  hid_t file = look_open(look_join(folder, "whole.h5"));
  char *parameters = look_text_attribute(file, "/", "parameters"), *version = look_text_attribute(file, "/", "version");
  assert_string_equal(parameters, header.parameter_text);
  assert_string_equal(version, ew_version());
  assert_int_equal(look_integer_attribute(file, "seed"), 23);
  free(parameters);
  free(version);
  H5Fclose(file);
}

static void test_an_unfinished_catalogue_holds_whole_trees(void **state) {
  (void)state;
  ew_catalogue *catalogue = write_rows("half.h5", 7);
  assert_int_equal(ew_catalogue_kept(catalogue), 7);
  ew_catalogue_close(catalogue);
  ew_catalogue_close(NULL);
  assert_false(look_exists(look_join(folder, "half.h5")));
  assert_catalogue(look_join(folder, "half.h5.partial"), 7, 0);
}

static void test_an_older_catalogue_stands_until_the_new_one_is_whole(void **state) {
  (void)state;
  look_path path = look_join(folder, "again.h5");
  finish(write_rows("again.h5", 3));
  ew_catalogue *catalogue = write_rows("again.h5", 5);
  assert_int_equal(ew_catalogue_kept(catalogue), 5);
  assert_catalogue(path, 3, 1);
  finish(catalogue);
  assert_catalogue(path, 5, 1);
}

static void test_two_catalogues_of_the_same_rows_are_equal(void **state) {
  (void)state;
  finish(write_rows("a.h5", TREES));
  finish(write_rows("b.h5", TREES));
  look_assert_equal(look_join(folder, "a.h5"), look_join(folder, "b.h5"));
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(test_every_field_comes_back_in_its_column),
      cmocka_unit_test(test_an_unfinished_catalogue_holds_whole_trees),
      cmocka_unit_test(test_an_older_catalogue_stands_until_the_new_one_is_whole),
      cmocka_unit_test(test_two_catalogues_of_the_same_rows_are_equal),
  };
  return cmocka_run_group_tests(tests, make_folder, remove_folder);
}
