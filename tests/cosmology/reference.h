/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * What the tests of this room share: the universe of the reference tables, a reader of those tables, and comparisons
 * that print every digit. Include it after cmocka.h. */
#ifndef EW_TESTS_COSMOLOGY_REFERENCE_H
#define EW_TESTS_COSMOLOGY_REFERENCE_H

#include "planck18.h"

#include <math.h>
#include <stdlib.h>

/* The value must be within the relative tolerance of what is expected (which must not be 0); NaN is refused. */
static inline void assert_close(double value, double expected, double tolerance, const char *what, double at) {
  double off = fabs(value / expected - 1.0);
  if (!(off <= tolerance))
    fail_msg("%s at %.12g is %.15g, expected %.15g: off by %.2e, allowed %.2e", what, at, value, expected, off,
             tolerance);
}

static inline ew_cosmology *make_cosmology(const ew_cosmology_parameters *parameters) {
  ew_error error = {0};
  ew_cosmology *cosmology;
  if (ew_cosmology_new(&cosmology, parameters, &error) != EW_OK)
    fail_msg("%s", error.message);
  return cosmology;
}

static inline ew_spectrum *make_spectrum(const ew_cosmology *cosmology, int transfer) {
  ew_error error = {0};
  ew_spectrum_parameters parameters = {.transfer = transfer, .filter = EW_FILTER_TOP_HAT};
  ew_spectrum *spectrum;
  if (ew_spectrum_new(&spectrum, cosmology, &parameters, &error) != EW_OK)
    fail_msg("%s", error.message);
  return spectrum;
}

enum { REFERENCE_ROWS = 200, REFERENCE_COLUMNS = 12 };
typedef struct {
  size_t count;
  double row[REFERENCE_ROWS][REFERENCE_COLUMNS];
} reference;

/* Reads the rows below the '#' lines and the line of column names. Free the table. */
static inline reference *read_reference(const char *path) {
  FILE *file = fopen(path, "r");
  reference *table = calloc(1, sizeof *table);
  assert_non_null(file);
  assert_non_null(table);
  char line[1024];
  while (fgets(line, sizeof line, file) && table->count < REFERENCE_ROWS) {
    char *at = line, *end;
    size_t column = 0;
    for (double value = strtod(at, &end); end > at && column < REFERENCE_COLUMNS; value = strtod(at, &end)) {
      table->row[table->count][column++] = value;
      at = end + (*end == ',');
    }
    table->count += column > 0;
  }
  fclose(file);
  assert_true(table->count > 10);
  return table;
}

#endif
