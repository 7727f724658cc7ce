/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The ends of what may be asked for: no branches, no threshold, no suppression, the shortest and the longest step,
 * roots at high redshift and of high mass. */
#include "sane_rows.h"

/* All rows of a run are sane; the rows are the caller's. */
static harvest sane_harvest(const char *const *assignments) {
  ew_laboratory *laboratory = laboratory_with(assignments);
  ew_plan plan = plan_of(laboratory);
  harvest h = harvest_of(&plan);
  double end = ew_age(laboratory->cosmology, laboratory->settings.roots.redshift);
  assert_int_equal(h.row_count, h.tree_count);
  for (size_t i = 0; i < h.row_count; i++)
    check_rows(&h.rows[i], 1, end);
  ew_laboratory_free(laboratory);
  return h;
}

#define HARVEST(...) sane_harvest((const char *const[]){__VA_ARGS__, NULL})

static double share_with_light(const harvest *h) {
  double count = 0.0;
  for (size_t i = 0; i < h->row_count; i++)
    count += h->rows[i].observed.luminosity_v > 0.0;
  return count / (double)h->row_count;
}

static double median_stellar_mass(const harvest *h) {
  double *mass = calloc(h->row_count, sizeof *mass);
  assert_non_null(mass);
  for (size_t i = 0; i < h->row_count; i++)
    mass[i] = h->rows[i].observed.stellar_mass;
  double result = median(mass, h->row_count);
  free(mass);
  return result;
}

/* At a resolution just below the root every tree is one branch, and all but its first node is smooth accretion. */
static void a_root_hardly_above_the_resolution_has_no_branches(void **state) {
  (void)state;
  harvest h = HARVEST("roots.kind=single", "roots.mass=1e9", "roots.count=10", "trees.resolution_mass=9.99e8");
  for (size_t i = 0; i < h.tree_count; i++) {
    assert_int_equal(h.trees[i].branches, 1);
    assert_true(fabs(h.trees[i].smooth_fraction - 0.001) < 1e-6);
  }
  free_harvest(&h);
}

/* Without branches there is nothing to merge with. */
static void a_lone_branch_forms_stars(void **state) {
  (void)state;
  harvest h = HARVEST("roots.kind=single", "roots.mass=2e10", "roots.count=10", "trees.resolution_mass=1.1e10",
                      "reionization.suppression=none");
  assert_true(share_with_light(&h) == 1.0);
  for (size_t i = 0; i < h.row_count; i++)
    assert_true(h.rows[i].observed.luminous_mergers + h.rows[i].observed.dark_mergers == 0);
  free_harvest(&h);
}

#define SMALL_HALOES "roots.kind=single", "roots.mass=7e8", "roots.count=40", "trees.resolution_mass=1e6"

static void thresholds_decide_who_shines(void **state) {
  (void)state;
  harvest molecular = HARVEST(SMALL_HALOES, "first_stars.threshold=molecular");
  harvest atomic = HARVEST(SMALL_HALOES, "first_stars.threshold=atomic");
  harvest none = HARVEST(SMALL_HALOES, "first_stars.threshold=none");
  print_message("with light: %.2f molecular, %.2f atomic, %.2f none\n", share_with_light(&molecular),
                share_with_light(&atomic), share_with_light(&none));
  assert_true(share_with_light(&molecular) > share_with_light(&atomic));
  assert_true(share_with_light(&atomic) > 0.0);
  for (size_t i = 0; i < none.row_count; i++)
    assert_true(!(none.rows[i].observed.first_star_fraction > 0.0));
  free_harvest(&molecular);
  free_harvest(&atomic);
  free_harvest(&none);
}

static void suppression_keeps_haloes_faint(void **state) {
  (void)state;
  harvest with = HARVEST(SMALL_HALOES, "reionization.suppression=characteristic_mass");
  harvest without = HARVEST(SMALL_HALOES, "reionization.suppression=none", "reionization.evaporation=false");
  assert_true(median_stellar_mass(&without) > 10.0 * median_stellar_mass(&with));
  for (size_t i = 0; i < without.row_count; i++)
    assert_int_equal(without.rows[i].observed.quenched, 0);
  free_harvest(&with);
  free_harvest(&without);
}

static void the_shortest_and_the_longest_step_run(void **state) {
  (void)state;
  harvest shortest = HARVEST("roots.kind=single", "roots.mass=3e9", "roots.count=6", "trees.resolution_mass=3e6",
                             "ensemble.time_step=0.002");
  harvest longest = HARVEST("roots.kind=single", "roots.mass=3e9", "roots.count=6", "trees.resolution_mass=3e6",
                            "ensemble.time_step=0.02");
  for (size_t i = 0; i < shortest.row_count; i++) {
    assert_true(shortest.rows[i].observed.luminosity_v > 0.0 && longest.rows[i].observed.luminosity_v > 0.0);
    assert_true(shortest.rows[i].halo_mass == longest.rows[i].halo_mass);
  }
  free_harvest(&shortest);
  free_harvest(&longest);
}

/* sane_harvest checks that nothing happens after the root's redshift. */
static void roots_at_high_redshift_are_young(void **state) {
  (void)state;
  harvest six =
      HARVEST("roots.kind=single", "roots.mass=1e9", "roots.count=12", "trees.resolution_mass=1e6", "roots.redshift=6");
  harvest ten = HARVEST("roots.kind=single", "roots.mass=1e9", "roots.count=12", "trees.resolution_mass=1e6",
                        "roots.redshift=10");
  for (size_t i = 0; i < six.row_count; i++) {
    assert_true(six.trees[i].root_redshift == 6.0 && six.trees[i].formation_redshift > 6.0);
    assert_true(ten.trees[i].root_redshift == 10.0 && ten.trees[i].formation_redshift > 10.0);
  }
  assert_true(share_with_light(&six) > 0.8);
  assert_true(share_with_light(&ten) > 0.8);
  free_harvest(&six);
  free_harvest(&ten);
}

static void a_massive_root_runs(void **state) {
  (void)state;
  harvest h = HARVEST("roots.kind=single", "roots.mass=1e12", "roots.count=3", "trees.resolution_mass=1e8");
  for (size_t i = 0; i < h.row_count; i++) {
    assert_true(h.rows[i].observed.stellar_mass > 1e9);
    assert_true(h.trees[i].branches > 300);
  }
  free_harvest(&h);
}

int main(void) {
  ew_core_start();
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(a_root_hardly_above_the_resolution_has_no_branches),
      cmocka_unit_test(a_lone_branch_forms_stars),
      cmocka_unit_test(thresholds_decide_who_shines),
      cmocka_unit_test(suppression_keeps_haloes_faint),
      cmocka_unit_test(the_shortest_and_the_longest_step_run),
      cmocka_unit_test(roots_at_high_redshift_are_young),
      cmocka_unit_test(a_massive_root_runs),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
