/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Freezing and redrawing: a process that gets another realization number changes what depends on it and nothing else,
 * and where a process has no scatter, or nothing to act on, redrawing it changes nothing at all. */
#include "ensemble.h"

/* What may change, in parts. */
typedef enum {
  PART_ROOT = 1,  /* mass of the root */
  PART_TREE = 2,  /* how it assembled */
  PART_PATCH = 4, /* reionization redshift and streaming velocity */
  PART_GALAXY = 8 /* everything observed */
} part;

static const char *const assignments[] = {"roots.mass_range=[3e8, 1e10]", "roots.count=24", "trees.resolution_mass=1e6",
                                          NULL};

static int make_laboratory(void **state) {
  *state = laboratory_with(assignments);
  return 0;
}

static int free_laboratory(void **state) {
  ew_laboratory_free(*state);
  return 0;
}

static harvest redrawn(const ew_laboratory *laboratory, const ew_model *model, ew_process process,
                       uint64_t realization) {
  ew_plan plan = plan_of(laboratory);
  plan.models = model;
  plan.realization_offset[process] = realization;
  return harvest_of(&plan);
}

static bool same(double a, double b) {
  return a == b || (isnan(a) && isnan(b));
}

static int root_differs(const ew_galaxy_row *a, const ew_galaxy_row *b) {
  return same(a->halo_mass, b->halo_mass) ? 0 : PART_ROOT;
}

static int tree_differs(const ew_tree_row *a, const ew_tree_row *b) {
  return same(a->formation_redshift, b->formation_redshift) && a->branches == b->branches && a->nodes == b->nodes &&
                 same(a->smooth_fraction, b->smooth_fraction)
             ? 0
             : PART_TREE;
}

static int patch_differs(const ew_galaxy_row *a, const ew_galaxy_row *b) {
  bool alike =
      same(a->reionization_redshift, b->reionization_redshift) && same(a->streaming_velocity, b->streaming_velocity);
  return alike ? 0 : PART_PATCH;
}

static int galaxy_differs(const ew_galaxy_row *a, const ew_galaxy_row *b) {
  return memcmp(&a->observed, &b->observed, sizeof a->observed) == 0 ? 0 : PART_GALAXY;
}

/* All parts that differ anywhere between two runs over the same tree numbers. */
static int parts_that_differ(const harvest *a, const harvest *b) {
  int parts = 0;
  assert_int_equal(a->row_count, b->row_count);
  assert_int_equal(a->row_count, a->tree_count);
  for (size_t i = 0; i < a->row_count; i++)
    parts |= root_differs(&a->rows[i], &b->rows[i]) | tree_differs(&a->trees[i], &b->trees[i]) |
             patch_differs(&a->rows[i], &b->rows[i]) | galaxy_differs(&a->rows[i], &b->rows[i]);
  return parts;
}

/* Light and survey draw nothing yet. */
static const int changed_by[EW_PROCESS_COUNT] = {
    [EW_PROCESS_ROOTS] = PART_ROOT | PART_TREE | PART_GALAXY,
    [EW_PROCESS_ASSEMBLY] = PART_TREE | PART_GALAXY,
    [EW_PROCESS_STRUCTURE] = PART_GALAXY,
    [EW_PROCESS_ORBITS] = PART_GALAXY,
    [EW_PROCESS_PATCH] = PART_PATCH | PART_GALAXY,
    [EW_PROCESS_FIRST_STARS] = PART_GALAXY,
    [EW_PROCESS_BURSTS] = PART_GALAXY,
    [EW_PROCESS_MIXING] = PART_GALAXY,
    [EW_PROCESS_LIGHT] = 0,
    [EW_PROCESS_SURVEY] = 0,
};

static void a_process_redrawn_changes_its_part(void **state) {
  const ew_laboratory *laboratory = *state;
  const ew_model *model = &laboratory->settings.model;
  harvest base = redrawn(laboratory, model, EW_PROCESS_SURVEY, 0);
  for (int p = 0; p < EW_PROCESS_COUNT; p++) {
    harvest other = redrawn(laboratory, model, (ew_process)p, 1);
    int parts = parts_that_differ(&base, &other);
    if (parts != changed_by[p])
      fail_msg("%s redrawn changes parts %d and not %d", ew_process_name((ew_process)p), parts, changed_by[p]);
    free_harvest(&other);
  }
  free_harvest(&base);
}

/* -------------------------------------------------------------------------------------------------- without scatter */

typedef struct {
  ew_process process;
  const char *assignments[4];
} still;

/* What takes the chance out of each process. */
static const still stills[] = {
    {EW_PROCESS_STRUCTURE,
     {"structure.concentration_scatter=0", "structure.spin_scatter=0", "gas.external_enrichment=false"}},
    {EW_PROCESS_ORBITS, {"satellites.friction_factor=0"}},
    {EW_PROCESS_PATCH, {"reionization.redshift_scatter=0", "first_stars.streaming_rms=0"}},
    {EW_PROCESS_FIRST_STARS, {"first_stars.threshold=none"}},
    {EW_PROCESS_MIXING, {"enrichment.mixing_floor=0", "enrichment.mixing_scatter=0", "enrichment.element_scatter=0"}},
};

static void a_process_without_scatter_changes_nothing(void **state) {
  for (size_t i = 0; i < sizeof stills / sizeof *stills; i++) {
    ew_settings settings = settings_with(stills[i].assignments);
    harvest base = redrawn(*state, &settings.model, stills[i].process, 0);
    harvest other = redrawn(*state, &settings.model, stills[i].process, 1);
    if (parts_that_differ(&base, &other) != 0)
      fail_msg("%s redrawn has an effect without scatter", ew_process_name(stills[i].process));
    free_harvest(&base);
    free_harvest(&other);
  }
}

/* Haloes too small for stars know only their tree and their patch. */
static void starless_haloes_have_no_luck(void **state) {
  (void)state;
  ew_laboratory *laboratory = LABORATORY("roots.kind=single", "roots.mass=1e7", "roots.count=10",
                                         "trees.resolution_mass=1e5", "first_stars.threshold=atomic");
  const ew_model *model = &laboratory->settings.model;
  harvest base = redrawn(laboratory, model, EW_PROCESS_SURVEY, 0);
  for (int p = EW_PROCESS_ASSEMBLY; p < EW_PROCESS_COUNT; p++) {
    harvest other = redrawn(laboratory, model, (ew_process)p, 1);
    assert_int_equal(parts_that_differ(&base, &other), changed_by[p] & (PART_TREE | PART_PATCH));
    free_harvest(&other);
  }
  for (size_t i = 0; i < base.row_count; i++)
    assert_true(base.rows[i].observed.stellar_mass_formed == 0.0);
  free_harvest(&base);
  ew_laboratory_free(laboratory);
}

/* Mixing moves metals between clusters. Masses and sizes follow only through lifetimes and returned mass, which hardly
 * depend on metals: by less than one per cent. */
static void mixing_leaves_masses_and_sizes(void **state) {
  const ew_laboratory *laboratory = *state;
  const double little = 0.03;
  harvest base = redrawn(laboratory, &laboratory->settings.model, EW_PROCESS_MIXING, 0);
  harvest other = redrawn(laboratory, &laboratory->settings.model, EW_PROCESS_MIXING, 1);
  size_t luminous = 0;
  for (size_t i = 0; i < base.row_count; i++) {
    const ew_observables *a = &base.rows[i].observed, *b = &other.rows[i].observed;
    if (!(a->luminosity_v > 0.0))
      continue;
    luminous++;
    assert_true(fabs(b->stellar_mass / a->stellar_mass - 1.0) < little);
    assert_true(fabs(b->half_light_radius / a->half_light_radius - 1.0) < little);
    assert_true(a->metallicity != b->metallicity);
  }
  assert_true(luminous > base.row_count / 2);
  free_harvest(&base);
  free_harvest(&other);
}

/* ----------------------------------------------------------------------------------------------------- realizations */

/* The second realization of a run is the first of a run in which all processes but roots and assembly are redrawn. */
static void a_realization_redraws_all_but_the_tree(void **state) {
  ew_laboratory *laboratory = *state;
  laboratory->settings.ensemble.realizations = 2;
  ew_plan plan = plan_of(laboratory);
  harvest both = harvest_of(&plan);
  laboratory->settings.ensemble.realizations = 1;
  for (int p = EW_PROCESS_ASSEMBLY + 1; p < EW_PROCESS_COUNT; p++)
    plan.realization_offset[p] = 1;
  harvest second = harvest_of(&plan);
  assert_int_equal(both.row_count, 2 * second.row_count);
  for (size_t i = 0; i < second.row_count; i++) {
    assert_int_equal(both.rows[2 * i].realization, 0);
    assert_int_equal(both.rows[2 * i + 1].realization, 1);
    both.rows[2 * i + 1].realization = 0;
    assert_memory_equal(&both.rows[2 * i + 1], &second.rows[i], sizeof second.rows[i]);
  }
  free_harvest(&both);
  free_harvest(&second);
}

int main(void) {
  ew_core_start();
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(a_process_redrawn_changes_its_part),
      cmocka_unit_test(a_process_without_scatter_changes_nothing),
      cmocka_unit_test(starless_haloes_have_no_luck),
      cmocka_unit_test(mixing_leaves_masses_and_sizes),
      cmocka_unit_test(a_realization_redraws_all_but_the_tree),
  };
  return cmocka_run_group_tests(tests, make_laboratory, free_laboratory);
}
