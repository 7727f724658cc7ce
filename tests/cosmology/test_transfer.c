/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Transfer functions and the power spectrum: against a library's table, limits, and the records that carry them. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>

#include <cmocka.h>

#include "reference.h"

#include <string.h>

/* The library reads the paper as we do; its table has eleven digits. */
static const double TRANSFER_TOLERANCE = 1e-8;
/* The table's normalisation comes from a quadrature good to 1e-8. */
static const double POWER_TOLERANCE = 1e-7;

static void library_table(void **state) {
  (void)state;
  ew_cosmology *c = make_cosmology(&planck18);
  ew_spectrum *wiggly = make_spectrum(c, EW_TRANSFER_EISENSTEIN_HU);
  ew_spectrum *smooth = make_spectrum(c, EW_TRANSFER_EISENSTEIN_HU_SMOOTH);
  reference *table = read_reference(EW_TEST_DATA "/cosmology_transfer.csv");
  for (size_t i = 0; i < table->count; i++) {
    const double *row = table->row[i], k = row[0];
    assert_close(ew_transfer_at(wiggly, k), row[1], TRANSFER_TOLERANCE, "T", k);
    assert_close(ew_transfer_at(smooth, k), row[2], TRANSFER_TOLERANCE, "smooth T", k);
    assert_close(ew_power_at(wiggly, k), row[3], POWER_TOLERANCE, "P", k);
    assert_close(ew_power_at(smooth, k), row[4], POWER_TOLERANCE, "smooth P", k);
  }
  free(table);
  ew_spectrum_free(wiggly);
  ew_spectrum_free(smooth);
  ew_cosmology_free(c);
}

static void long_waves_are_unchanged(void **state) {
  (void)state;
  for (int choice = 0; ew_transfer_of(choice); choice++) {
    assert_close(ew_transfer_of(choice)->evaluate(&planck18, 0.0), 1.0, 1e-15, "T", 0.0);
    assert_close(ew_transfer_of(choice)->evaluate(&planck18, 1e-7), 1.0, 1e-9, "T", 1e-7);
  }
}

/* Few baryons must lead over to none, where the formulas of the sound horizon are 0/0. What is left at 1e-9 of the
 * matter are terms of that order. */
static void without_baryons(void **state) {
  (void)state;
  ew_cosmology_parameters none = planck18, few = planck18;
  none.omega_baryon = 0.0;
  few.omega_baryon = 1e-9 * few.omega_matter;
  for (int choice = 0; ew_transfer_of(choice); choice++)
    for (double k = 1e-5; k < 1e4; k *= 1.7) {
      double expected = ew_transfer_of(choice)->evaluate(&none, k);
      assert_close(ew_transfer_of(choice)->evaluate(&few, k), expected, 1e-6, "T with few baryons", k);
    }
}

/* Baryons oscillate as sin(ks)/(ks): a universe of little else must change the sign of T. */
static void mostly_baryons_oscillate(void **state) {
  (void)state;
  ew_cosmology_parameters p = planck18;
  p.omega_baryon = 0.99 * p.omega_matter;
  const ew_transfer *transfer = ew_transfer_of(EW_TRANSFER_EISENSTEIN_HU);
  int changes = 0;
  for (double k = 0.01; k < 0.2; k += 1e-3)
    changes += transfer->evaluate(&p, k) * transfer->evaluate(&p, k + 1e-3) < 0.0;
  assert_in_range(changes, 4, 20);
}

/* P ~ k^n_s where T = 1. */
static void primordial_slope(void **state) {
  (void)state;
  for (double slope = 0.8; slope < 1.25; slope += 0.1) {
    ew_cosmology_parameters p = planck18;
    p.spectral_index = slope;
    ew_cosmology *c = make_cosmology(&p);
    ew_spectrum *s = make_spectrum(c, EW_TRANSFER_EISENSTEIN_HU);
    assert_close(ew_power_at(s, 2e-7) / ew_power_at(s, 1e-7), pow(2.0, slope), 1e-8, "P ratio", slope);
    ew_spectrum_free(s);
    ew_cosmology_free(c);
  }
}

/* The n-th choice of a row must be the label of the n-th record, and there are no more records than choices. */
static void records_follow_their_rows(void **state) {
  (void)state;
  const ew_choice *transfers = ew_spectrum_rows[0].choices, *filters = ew_spectrum_rows[1].choices;
  assert_string_equal(ew_spectrum_rows[0].name, "spectrum.transfer");
  assert_string_equal(ew_spectrum_rows[1].name, "spectrum.filter");
  int i = 0;
  for (; transfers[i].name; i++)
    assert_string_equal(ew_transfer_of(i)->label->name, transfers[i].name);
  assert_null(ew_transfer_of(i));
  assert_null(ew_transfer_of(-1));
  for (i = 0; filters[i].name; i++)
    assert_string_equal(ew_filter_of(i)->label->name, filters[i].name);
  assert_null(ew_filter_of(i));
  assert_null(ew_filter_of(-1));
}

static void refuse(const ew_cosmology_parameters *p, const ew_spectrum_parameters *parameters, const char *words) {
  ew_error error = {0};
  ew_cosmology *c = make_cosmology(p);
  ew_spectrum *s;
  assert_int_equal(ew_spectrum_new(&s, c, parameters, &error), EW_REFUSED);
  assert_null(s);
  if (!strstr(error.message, words))
    fail_msg("\"%s\" does not say \"%s\"", error.message, words);
  ew_cosmology_free(c);
}

static void impossible_spectra_are_refused(void **state) {
  (void)state;
  refuse(&planck18, &(ew_spectrum_parameters){.transfer = 2}, "spectrum.transfer = 2");
  refuse(&planck18, &(ew_spectrum_parameters){.filter = -1}, "spectrum.filter = -1");
  /* alpha_Gamma of the smooth fit is negative for baryons alone at low density */
  ew_cosmology_parameters p = planck18;
  p.hubble = 0.5;
  p.omega_matter = p.omega_baryon = 0.08;
  refuse(&p, &(ew_spectrum_parameters){.transfer = EW_TRANSFER_EISENSTEIN_HU_SMOOTH}, "cosmology.omega_baryon = 0.08");
  ew_spectrum_free(NULL);
}

int main(void) {
  ew_core_start();
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(library_table),
      cmocka_unit_test(long_waves_are_unchanged),
      cmocka_unit_test(without_baryons),
      cmocka_unit_test(mostly_baryons_oscillate),
      cmocka_unit_test(primordial_slope),
      cmocka_unit_test(records_follow_their_rows),
      cmocka_unit_test(impossible_spectra_are_refused),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
