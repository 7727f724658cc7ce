/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Every parameter row of the room: well formed, its default inside its range, its offset on the right field, and each
 * value at the ends of its range either a universe or refused in words. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>

#include <cmocka.h>

#include "reference.h"

#include <string.h>

static int choice_of(const ew_parameter *row) {
  size_t length = strlen(row->standard);
  assert_true(length > 2 && row->standard[0] == '"' && row->standard[length - 1] == '"');
  for (int i = 0; row->choices[i].name; i++)
    if (strlen(row->choices[i].name) == length - 2 && !strncmp(row->choices[i].name, row->standard + 1, length - 2))
      return i;
  fail_msg("%s: %s is no choice", row->name, row->standard);
  return -1;
}

/* Puts the default of a row into its field. */
static void set_default(const ew_parameter *row, void *target) {
  char *field = (char *)target + row->offset;
  double real = strtod(row->standard, NULL);
  bool flag = !strcmp(row->standard, "true");
  int choice = row->type == EW_CHOICE ? choice_of(row) : 0;
  if (row->type == EW_REAL)
    memcpy(field, &real, sizeof real);
  else if (row->type == EW_FLAG)
    memcpy(field, &flag, sizeof flag);
  else
    memcpy(field, &choice, sizeof choice);
}

static void check_row(const ew_parameter *row, const char *prefix) {
  assert_true(strncmp(row->name, prefix, strlen(prefix)) == 0 && strlen(row->name) > strlen(prefix));
  assert_non_null(row->unit);
  assert_true(strlen(row->meaning) > 10 && strlen(row->source) > 3);
  if (row->type == EW_REAL) {
    char *end;
    double standard = strtod(row->standard, &end);
    assert_true(*end == '\0' && strlen(row->unit) > 0);
    assert_true(row->low < standard && standard < row->high);
  } else if (row->type == EW_CHOICE) {
    assert_true(choice_of(row) >= 0);
    for (int i = 0; row->choices[i].name; i++)
      assert_true(strlen(row->choices[i].meaning) > 0 && strlen(row->choices[i].source) > 0);
  } else
    assert_int_equal(row->type, EW_FLAG);
}

static void rows_are_well_formed(void **state) {
  (void)state;
  for (size_t i = 0; i < ew_rows_count(ew_cosmology_rows); i++)
    check_row(&ew_cosmology_rows[i], "cosmology.");
  for (size_t i = 0; i < ew_rows_count(ew_spectrum_rows); i++)
    check_row(&ew_spectrum_rows[i], "spectrum.");
  for (size_t i = 0; i < ew_rows_count(ew_cosmology_rows); i++)
    for (size_t j = 0; j < i; j++)
      assert_true(strcmp(ew_cosmology_rows[i].name, ew_cosmology_rows[j].name) != 0 &&
                  ew_cosmology_rows[i].offset != ew_cosmology_rows[j].offset);
}

/* The rows must fill every field with the universe of the reference tables. */
static void defaults_are_the_reference_universe(void **state) {
  (void)state;
  ew_cosmology_parameters p = {.radiation = true, .collapse_threshold = -1};
  for (size_t i = 0; i < ew_rows_count(ew_cosmology_rows); i++)
    set_default(&ew_cosmology_rows[i], &p);
  assert_true(p.hubble == planck18.hubble && p.omega_matter == planck18.omega_matter);
  assert_true(p.omega_baryon == planck18.omega_baryon && p.spectral_index == planck18.spectral_index);
  assert_true(p.sigma8 == planck18.sigma8 && p.cmb_temperature == planck18.cmb_temperature);
  assert_true(p.neutrino_number == planck18.neutrino_number && p.radiation == planck18.radiation);
  assert_int_equal(p.collapse_threshold, EW_THRESHOLD_CONSTANT);
  ew_spectrum_parameters s = {-1, -1};
  for (size_t i = 0; i < ew_rows_count(ew_spectrum_rows); i++)
    set_default(&ew_spectrum_rows[i], &s);
  assert_int_equal(s.transfer, EW_TRANSFER_EISENSTEIN_HU);
  assert_int_equal(s.filter, EW_FILTER_TOP_HAT);
}

/* A universe, if allowed, must have finite and sensible numbers; if not, a line that names a parameter. */
static void build_or_refuse(const ew_cosmology_parameters *p) {
  ew_error error = {0};
  ew_cosmology *c;
  ew_spectrum *s = NULL;
  ew_spectrum_parameters choices = {0};
  ew_status status = ew_cosmology_new(&c, p, &error);
  if (status == EW_OK)
    status = ew_spectrum_new(&s, c, &choices, &error);
  if (status == EW_OK) {
    assert_true(isfinite(ew_age(c, 0.0)) && isfinite(ew_barrier(c, 60.0)) && ew_growth(c, 60.0) > 0.0);
    assert_true(isfinite(ew_sigma(s, 1e3)) && ew_sigma(s, 1e16) > 0.0);
  } else {
    assert_int_equal(status, EW_REFUSED);
    assert_non_null(strstr(error.message, "cosmology."));
  }
  ew_spectrum_free(s);
  ew_cosmology_free(c);
}

static void ends_of_ranges(void **state) {
  (void)state;
  for (size_t i = 0; i < ew_rows_count(ew_cosmology_rows); i++) {
    const ew_parameter *row = &ew_cosmology_rows[i];
    for (int end = 0; row->type == EW_REAL && end < 2; end++) {
      ew_cosmology_parameters p = planck18;
      double value = end ? row->high : row->low;
      memcpy((char *)&p + row->offset, &value, sizeof value);
      build_or_refuse(&p);
      p.radiation = true;
      build_or_refuse(&p);
    }
  }
}

/* Every corner of the box of densities, expansion and slope at once. */
static void corners_of_ranges(void **state) {
  (void)state;
  for (unsigned corner = 0; corner < 32; corner++) {
    ew_cosmology_parameters p = planck18;
    for (unsigned i = 0; i < 5; i++) {
      double value = corner >> i & 1 ? ew_cosmology_rows[i].high : ew_cosmology_rows[i].low;
      memcpy((char *)&p + ew_cosmology_rows[i].offset, &value, sizeof value);
    }
    build_or_refuse(&p);
  }
}

static void outside_ranges(void **state) {
  (void)state;
  for (size_t i = 0; i < ew_rows_count(ew_cosmology_rows); i++) {
    const ew_parameter *row = &ew_cosmology_rows[i];
    const double values[] = {row->low - 0.1, row->high + 0.1, (double)NAN};
    for (int j = 0; row->type == EW_REAL && j < 3; j++) {
      ew_cosmology_parameters p = planck18;
      ew_cosmology *c;
      ew_error error = {0};
      memcpy((char *)&p + row->offset, &values[j], sizeof values[j]);
      assert_int_equal(ew_cosmology_new(&c, &p, &error), EW_REFUSED);
      assert_non_null(strstr(error.message, row->name));
    }
  }
}

int main(void) {
  ew_core_start();
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(rows_are_well_formed), cmocka_unit_test(defaults_are_the_reference_universe),
      cmocka_unit_test(ends_of_ranges),       cmocka_unit_test(corners_of_ranges),
      cmocka_unit_test(outside_ranges),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
