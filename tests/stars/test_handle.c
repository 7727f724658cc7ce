/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The room's parameters: complete rows, the promised defaults, and refusal of what is outside their ranges. */
#include "stars/standard.h"

#include <stdlib.h>
#include <string.h>

static double *field(ew_stars_parameters *parameters, const ew_parameter *row) {
  return (double *)(void *)((char *)parameters + row->offset);
}

static void rows_are_complete(void **state) {
  (void)state;
  assert_int_equal(ew_rows_count(ew_stars_rows), 7);
  for (size_t i = 0; i < ew_rows_count(ew_stars_rows); i++) {
    const ew_parameter *row = &ew_stars_rows[i];
    assert_memory_equal(row->name, "enrichment.", strlen("enrichment."));
    assert_true(row->unit && row->standard && row->meaning[0] && row->source[0]);
    assert_true(row->type == EW_CHOICE ? row->choices != NULL : row->low < row->high);
  }
}

static void defaults_are_the_standard_model(void **state) {
  (void)state;
  for (size_t i = 0; i < ew_rows_count(ew_stars_rows); i++) {
    ew_stars_parameters expected = standard;
    if (ew_stars_rows[i].type == EW_REAL)
      assert_true(strtod(ew_stars_rows[i].standard, NULL) == *field(&expected, &ew_stars_rows[i]));
    else
      assert_string_equal(ew_stars_rows[i].standard, "\"W7\"");
  }
}

static void assert_refused(ew_stars_parameters parameters, const char *name) {
  ew_stars *stars = (ew_stars *)(void *)&parameters;
  ew_error error = {0};
  assert_int_equal(ew_stars_new(&stars, &parameters, &error), EW_REFUSED);
  assert_null(stars);
  assert_non_null(strstr(error.message, name));
}

static void values_outside_the_ranges_are_refused(void **state) {
  (void)state;
  for (size_t i = 0; i < ew_rows_count(ew_stars_rows); i++) {
    const ew_parameter *row = &ew_stars_rows[i];
    if (row->type != EW_REAL)
      continue;
    const double wrong[] = {row->low - 1e-6, row->high + 1e-6, (double)NAN};
    for (size_t k = 0; k < sizeof wrong / sizeof *wrong; k++) {
      ew_stars_parameters parameters = standard;
      *field(&parameters, row) = wrong[k];
      assert_refused(parameters, row->name);
    }
  }
}

static void models_that_do_not_exist_are_refused(void **state) {
  (void)state;
  ew_stars_parameters parameters = standard;
  parameters.ia_model = -1;
  assert_refused(parameters, "enrichment.ia_model");
  parameters.ia_model = 7;
  assert_refused(parameters, "enrichment.ia_model");
}

static void values_at_the_ends_of_the_ranges_are_accepted(void **state) {
  (void)state;
  for (size_t i = 0; i < ew_rows_count(ew_stars_rows); i++) {
    const ew_parameter *row = &ew_stars_rows[i];
    if (row->type != EW_REAL)
      continue;
    for (int end = 0; end < 2; end++) {
      ew_stars_parameters parameters = standard;
      *field(&parameters, row) = end ? row->high : row->low;
      ew_stars *stars = stars_with(parameters);
      assert_true(*field(&parameters, row) ==
                  *(const double *)(const void *)((const char *)ew_stars_get(stars) + row->offset));
      ew_stars_free(stars);
    }
  }
}

static void nothing_can_be_freed(void **state) {
  (void)state;
  ew_stars_free(NULL);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(rows_are_complete),
      cmocka_unit_test(defaults_are_the_standard_model),
      cmocka_unit_test(values_outside_the_ranges_are_refused),
      cmocka_unit_test(models_that_do_not_exist_are_refused),
      cmocka_unit_test(values_at_the_ends_of_the_ranges_are_accepted),
      cmocka_unit_test(nothing_can_be_freed),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
