/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The rows of the group "structure": complete, within their own ranges, and each at its own field. */
#include "elfinwood/halo.h"

#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdlib.h>
#include <string.h>

#include <cmocka.h>

static double field(const ew_structure_parameters *target, const ew_parameter *row) {
  double value;
  memcpy(&value, (const char *)target + row->offset, sizeof value);
  return value;
}

static void rows_are_complete(void **state) {
  (void)state;
  for (size_t i = 0; i < ew_rows_count(ew_structure_rows); i++) {
    const ew_parameter *row = &ew_structure_rows[i];
    double standard = strtod(row->standard, NULL);
    assert_int_equal(strncmp(row->name, "structure.", 10), 0);
    assert_int_equal(row->type, EW_REAL);
    assert_true(standard >= row->low && standard <= row->high);
    assert_true(row->unit[0] && row->meaning[0] && row->source[0]);
  }
}

/* Scatter 0.16 dex: Diemer & Joyce 2019. Spin 0.035 and 0.50: Bullock et al. 2001. */
static void each_row_has_its_field(void **state) {
  (void)state;
  static const ew_structure_parameters published = {0.16, 0.035, 0.50};
  assert_int_equal(ew_rows_count(ew_structure_rows), 3);
  for (size_t i = 0; i < ew_rows_count(ew_structure_rows); i++)
    assert_true(field(&published, &ew_structure_rows[i]) == strtod(ew_structure_rows[i].standard, NULL));
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(rows_are_complete),
      cmocka_unit_test(each_row_has_its_field),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
