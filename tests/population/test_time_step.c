/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Half the time step on the same trees, patches and structures: how far galaxies move. What is drawn slot by slot (star
 * clusters, supernovae, mixing) is drawn anew, as slots are other ones, so medians over haloes of the change are
 * compared with what chance leaves of them. */
#include "ensemble.h"

enum { HALOES = EW_TREES(304), QUANTITIES = 3 };

/* What is measured here is 0.002 dex for each; chance leaves up to 0.01. */
static const double tolerance[QUANTITIES] = {0.02, 0.02, 0.02};
static const char *const quantity_names[QUANTITIES] = {"log10 stellar mass", "[Fe/H]", "log10 half-light radius"};

static harvest with_step(const char *step) {
  ew_laboratory *laboratory = LABORATORY("roots.mass_range=[1e9, 1e10]", "trees.resolution_mass=1e6", step);
  ew_plan plan = plan_of(laboratory);
  plan.tree_count = HALOES;
  harvest h = harvest_of(&plan);
  ew_laboratory_free(laboratory);
  return h;
}

static double quantity_of(const ew_galaxy_row *row, int quantity) {
  const ew_observables *o = &row->observed;
  double values[QUANTITIES] = {log10(o->stellar_mass), o->metallicity, log10(o->half_light_radius)};
  return o->luminosity_v > 0.0 ? values[quantity] : NAN;
}

static double median_change(const harvest *from, const harvest *to, int quantity, size_t *count) {
  double change[HALOES];
  *count = 0;
  for (size_t i = 0; i < HALOES; i++) {
    double difference = quantity_of(&to->rows[i], quantity) - quantity_of(&from->rows[i], quantity);
    if (!isnan(difference))
      change[(*count)++] = difference;
  }
  return median(change, *count);
}

static void half_the_step_hardly_moves_medians(void **state) {
  (void)state;
  harvest whole = with_step("ensemble.time_step=0.01"), half = with_step("ensemble.time_step=0.005");
  for (int q = 0; q < QUANTITIES; q++) {
    size_t count;
    double change = median_change(&whole, &half, q, &count);
    print_message("%s changes by %+.4f dex, median of %zu haloes\n", quantity_names[q], change, count);
    assert_true(count > HALOES / 2);
    assert_true(fabs(change) < tolerance[q] * sqrt(EW_SLOWNESS));
  }
  free_harvest(&whole);
  free_harvest(&half);
}

int main(void) {
  ew_core_start();
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(half_the_step_hardly_moves_medians),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
