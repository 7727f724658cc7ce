/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The haloes that trees grow from. */
#include "ensemble.h"

enum { ROOTS = 20000 };

static ew_root root_at(const ew_settings *settings, uint64_t number) {
  return ew_root_draw(settings, &(ew_draws){.seed = (uint64_t)settings->random.seed, .tree = number});
}

/* Kolmogorov's distance between the roots' ln M and an even distribution. The fixed seed makes it one number: 1.63/sqrt
 * n is passed by chance in 99 of 100 seeds. */
static void a_range_is_even_in_log_mass(void **state) {
  (void)state;
  ew_settings settings = SETTINGS("roots.mass_range=[2e7, 7e10]");
  double *place = calloc(ROOTS, sizeof *place), distance = 0.0;
  assert_non_null(place);
  for (uint64_t i = 0; i < ROOTS; i++) {
    double mass = root_at(&settings, i).mass;
    assert_true(mass >= 2e7 && mass <= 7e10);
    place[i] = log(mass / 2e7) / log(7e10 / 2e7);
  }
  qsort(place, ROOTS, sizeof *place, ascending);
  for (int i = 0; i < ROOTS; i++)
    distance = fmax(distance, fmax(place[i] - (double)i / ROOTS, (i + 1.0) / ROOTS - place[i]));
  assert_true(distance < 1.63 / sqrt(ROOTS));
  free(place);
}

static void neighbouring_roots_know_nothing_of_each_other(void **state) {
  (void)state;
  ew_settings settings = SETTINGS("roots.mass_range=[1e8, 1e10]");
  double sum = 0.0;
  for (uint64_t i = 0; i < ROOTS; i++) {
    double one = log10(root_at(&settings, i).mass) - 9.0, next = log10(root_at(&settings, i + 1).mass) - 9.0;
    sum += one * next / (1.0 / 3.0);
  }
  const double four_sigma = 4.0 / sqrt(ROOTS);
  assert_true(fabs(sum / ROOTS) < four_sigma);
}

static void a_root_does_not_depend_on_how_many_are_asked_for(void **state) {
  (void)state;
  ew_settings few = SETTINGS("roots.count=3"), many = SETTINGS("roots.count=1000000");
  for (uint64_t i = 0; i < 3; i++) {
    ew_root a = root_at(&few, i), b = root_at(&many, i);
    assert_true(a.mass == b.mass);
    assert_int_equal(a.number, i);
    assert_int_equal(a.halo_id, -1);
    assert_true(a.weight == 1.0);
  }
}

static void seed_and_realization_give_other_roots(void **state) {
  (void)state;
  ew_settings settings = SETTINGS("random.seed=1"), other = SETTINGS("random.seed=2");
  assert_true(root_at(&settings, 5).mass != root_at(&other, 5).mass);
  ew_draws draws = {.seed = 1, .tree = 5};
  double mass = ew_root_draw(&settings, &draws).mass;
  for (int p = 0; p < EW_PROCESS_COUNT; p++) {
    ew_draws redrawn = draws;
    redrawn.realization[p] = 1;
    assert_true((ew_root_draw(&settings, &redrawn).mass == mass) == (p != EW_PROCESS_ROOTS));
  }
}

static void single_roots_are_all_alike(void **state) {
  (void)state;
  ew_settings settings = SETTINGS("roots.kind=single", "roots.mass=2.385e9", "roots.redshift=1.5");
  for (uint64_t i = 0; i < 100; i++) {
    assert_true(root_at(&settings, i).mass == 2.385e9);
    assert_true(root_at(&settings, i).redshift == 1.5);
  }
  assert_true(ew_roots_largest_mass(&settings) == 2.385e9);
}

static void a_range_of_one_mass_is_that_mass(void **state) {
  (void)state;
  ew_settings settings = SETTINGS("roots.mass_range=[2.385e9, 2.385e9]", "roots.redshift=3");
  for (uint64_t i = 0; i < 100; i++) {
    assert_true(root_at(&settings, i).mass == 2.385e9);
    assert_true(root_at(&settings, i).redshift == 3.0);
  }
  assert_true(ew_roots_largest_mass(&settings) == 2.385e9);
}

int main(void) {
  ew_core_start();
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(a_range_is_even_in_log_mass),
      cmocka_unit_test(neighbouring_roots_know_nothing_of_each_other),
      cmocka_unit_test(a_root_does_not_depend_on_how_many_are_asked_for),
      cmocka_unit_test(seed_and_realization_give_other_roots),
      cmocka_unit_test(single_roots_are_all_alike),
      cmocka_unit_test(a_range_of_one_mass_is_that_mass),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
