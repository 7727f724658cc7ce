/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * How finely trees are resolved changes neither how much gas a halo takes in nor, as long as the branches that form
 * stars are there, the stars of a massive one. */
#include "ensemble.h"
#include "galaxy/state.h"
#include "population/evolution.h"

enum { TREES = EW_TREES(120) };

/* Trees of different resolution are different trees, so medians differ by chance too: at 1e10 Msun the logarithm of
 * stellar mass scatters by 0.2 dex, its median over 120 trees by 0.023 dex, the difference of two by 0.03. */
#define STELLAR_TOLERANCE       (0.12 * sqrt(EW_SLOWNESS)) /* dex: three of those, and 0.03 for what resolution changes */
#define SMALL_STELLAR_TOLERANCE (0.45 * sqrt(EW_SLOWNESS)) /* dex: the same with a scatter of 0.7 dex, at 1e9 Msun */
#define BARYON_TOLERANCE        (0.03 * sqrt(EW_SLOWNESS)) /* as they follow from few late nodes */

typedef struct {
  double baryons;      /* of the central's own and all that joined it, over the mean share of the halo */
  double stellar_mass; /* log10 of Msun */
  double branches;
} outcome;

static outcome medians(const char *mass, const char *resolution, const char *suppression) {
  ew_laboratory *lab = LABORATORY("roots.kind=single", mass, resolution, suppression);
  ew_tree_memory *memory = ew_tree_memory_new();
  ew_evolution *evolution = ew_evolution_new();
  double baryons[TREES], stars[TREES], branches[TREES];
  for (uint64_t i = 0; i < TREES; i++) {
    ew_draws draws = {.seed = 1, .tree = i};
    ew_root root = ew_root_draw(&lab->settings, &draws);
    ew_tree tree;
    ew_error error = {0};
    need_success(ew_tree_grow(lab->builder, &root, &draws, memory, &tree, &error), &error);
    need_success(ew_evolution_load(evolution, lab, &tree, &error), &error);
    need_success(ew_evolution_run(evolution, &lab->settings.model, &draws, &error), &error);
    const ew_galaxy *central = evolution->arrival[tree.branch_count - 1].galaxy;
    baryons[i] = ew_galaxy_baryons(central) / (ew_baryon_fraction(lab->cosmology) * root.mass);
    stars[i] = log10(evolution->rows[0].observed.stellar_mass);
    branches[i] = (double)tree.branch_count;
  }
  ew_evolution_free(evolution);
  ew_tree_memory_free(memory);
  ew_laboratory_free(lab);
  return (outcome){median(baryons, TREES), median(stars, TREES), median(branches, TREES)};
}

static void report(const char *what, const outcome *fine, const outcome *coarse) {
  print_message("%s: baryons %.4f and %.4f of the mean, log10 M* %.3f and %.3f, branches %.0f and %.0f\n", what,
                fine->baryons, coarse->baryons, fine->stellar_mass, coarse->stellar_mass, fine->branches,
                coarse->branches);
}

static void massive_haloes_do_not_depend_on_resolution(void **state) {
  (void)state;
  const char *mass = "roots.mass=1e10", *suppressed = "reionization.suppression=characteristic_mass";
  outcome fine = medians(mass, "trees.resolution_mass=3e5", suppressed);
  outcome coarse = medians(mass, "trees.resolution_mass=1e6", suppressed);
  report("1e10 Msun", &fine, &coarse);
  assert_true(fine.branches > 2.0 * coarse.branches);
  assert_true(fabs(fine.baryons / coarse.baryons - 1.0) < BARYON_TOLERANCE);
  assert_true(fabs(fine.stellar_mass - coarse.stellar_mass) < STELLAR_TOLERANCE);
}

/* Haloes that are cut off by reionization have what their resolved progenitors had by then, so the total rises with
 * resolution, by a sixth here; most of it evaporates again out of haloes without stars. */
static void small_haloes_depend_on_it_weakly(void **state) {
  (void)state;
  const char *mass = "roots.mass=1e9", *suppressed = "reionization.suppression=characteristic_mass";
  outcome fine = medians(mass, "trees.resolution_mass=3e5", suppressed);
  outcome coarse = medians(mass, "trees.resolution_mass=1e6", suppressed);
  report("1e9 Msun", &fine, &coarse);
  assert_true(fine.baryons > coarse.baryons && fine.baryons < 1.3 * coarse.baryons);
  assert_true(fabs(fine.stellar_mass - coarse.stellar_mass) < SMALL_STELLAR_TOLERANCE);
}

/* Without suppression a halo has taken in the mean share of its mass, to rounding, however it was put together. */
static void unsuppressed_haloes_take_in_the_mean_share(void **state) {
  (void)state;
  const char *mass = "roots.mass=1e10", *unsuppressed = "reionization.suppression=none";
  assert_true(fabs(medians(mass, "trees.resolution_mass=3e6", unsuppressed).baryons - 1.0) < 1e-12);
  assert_true(fabs(medians(mass, "trees.resolution_mass=3e7", unsuppressed).baryons - 1.0) < 1e-12);
}

int main(void) {
  ew_core_start();
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(massive_haloes_do_not_depend_on_resolution),
      cmocka_unit_test(small_haloes_depend_on_it_weakly),
      cmocka_unit_test(unsuppressed_haloes_take_in_the_mean_share),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
