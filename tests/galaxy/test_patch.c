/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Draws of the patch and of a branch's own luck against the distributions they should have; and the world that is
 * shared by all. */
#include "galaxy/stage.h"

enum { DRAWS = 60000 };

/* A patch of the tree of that number, with a calendar of few slots to be quick. */
static ew_patch patch_of(stage *s, uint64_t tree) {
  ew_calendar brief = s->calendar;
  brief.slot_count = 2;
  ew_patch patch;
  ew_error error = {0};
  s->draws.tree = tree;
  assert_fine(ew_patch_draw(&patch, &s->world, &s->settings.model, &brief, &s->draws, s->arena, &error), &error);
  return patch;
}

/* Molecules help early on, and no more once the patch is ionized. */
static void thresholds_are_atomic_after_reionization(void **state) {
  stage *s = stage_fresh(state);
  s->settings.model.first_stars.threshold = EW_FIRST_STARS_MOLECULAR;
  s->settings.model.first_stars.streaming_rms = 0.0; /* else they are atomic before in some patches */
  s->settings.model.first_stars.background = 0.0;
  ew_patch patch;
  ew_error error = {0};
  assert_fine(ew_patch_draw(&patch, &s->world, &s->settings.model, &s->calendar, &s->draws, s->arena, &error), &error);
  for (size_t k = 0; k < s->calendar.slot_count; k++) {
    bool ionized = s->calendar.redshift[k] < patch.reionization_redshift, young = s->calendar.redshift[k] < 30.0;
    if (ionized || young)
      assert_true(ionized == (patch.threshold_mass[k] == s->calendar.atomic_mass[k]));
  }
}

/* Share of a Maxwell distribution below x times its rms: erf(y) - 2 y exp(-y^2)/sqrt(pi), y^2 = 3 x^2/2. */
static double maxwell_below(double x) {
  double y = sqrt(1.5) * x;
  return erf(y) - 2.0 * y * exp(-y * y) / sqrt(EW_PI);
}

/* Three equal Gaussian components: mean 0.921 rms = sqrt(8/(3 pi)), and 43 per cent below the most probable 0.816. */
static void streaming_is_maxwellian(void **state) {
  stage *s = stage_fresh(state);
  sample speed = {0}, square = {0};
  static const double at[] = {0.4, 0.816497, 1.3};
  double below[3] = {0.0};
  for (uint64_t i = 0; i < DRAWS; i++) {
    double v = patch_of(s, i).streaming_velocity / 30.0;
    sample_add(&speed, v);
    sample_add(&square, v * v);
    for (int k = 0; k < 3; k++)
      below[k] += v < at[k];
  }
  assert_mean(&speed, 0.921318);
  assert_mean(&square, 1.0);
  assert_close(maxwell_below(0.816497), 0.427593, 1e-5);
  for (int k = 0; k < 3; k++)
    assert_share(below[k], DRAWS, maxwell_below(at[k]));
}

static void no_streaming_when_it_is_switched_off(void **state) {
  stage *s = stage_fresh(state);
  s->settings.model.first_stars.streaming_rms = 0.0;
  assert_true(patch_of(s, 3).streaming_velocity == 0.0);
}

static void patches_are_ionized_about_the_mean(void **state) {
  stage *s = stage_fresh(state);
  s->settings.model.reionization.redshift = 7.7;
  s->settings.model.reionization.redshift_scatter = 0.5;
  sample redshift = {0};
  for (uint64_t i = 0; i < DRAWS; i++)
    sample_add(&redshift, patch_of(s, i).reionization_redshift);
  assert_mean(&redshift, 7.7);
  assert_close(sample_deviation(&redshift), 0.5, SIGMAS / sqrt(2.0 * DRAWS));
}

static void no_patch_is_ionized_at_absurd_redshifts(void **state) {
  stage *s = stage_fresh(state);
  s->settings.model.reionization.redshift_scatter = 3.0;
  for (uint64_t i = 0; i < DRAWS; i++) {
    s->settings.model.reionization.redshift = i % 2 ? 5.0 : 15.0;
    double z = patch_of(s, i).reionization_redshift;
    assert_true(z >= 5.0 && z <= 20.0);
  }
}

/* The patch belongs to the root: nothing but its own realization number changes it. */
static void patch_changes_with_its_own_realization_only(void **state) {
  stage *s = stage_fresh(state);
  s->settings.model.reionization.redshift_scatter = 1.0;
  ew_patch first = patch_of(s, 8);
  stage_realization(s, 9);
  s->draws.realization[EW_PROCESS_PATCH] = 0;
  ew_patch same = patch_of(s, 8);
  assert_true(same.streaming_velocity == first.streaming_velocity);
  assert_true(same.reionization_redshift == first.reionization_redshift);
  s->draws.realization[EW_PROCESS_PATCH] = 1;
  ew_patch other = patch_of(s, 8);
  assert_true(other.streaming_velocity != first.streaming_velocity);
  assert_true(other.reionization_redshift != first.reionization_redshift);
}

static void spin_has_its_median_and_scatter(void **state) {
  stage *s = stage_fresh(state);
  sample log_spin = {0};
  for (uint64_t key = 1; key <= DRAWS; key++)
    sample_add(&log_spin, log(ew_branch_luck_draw(&s->settings.model, &s->draws, key).spin));
  assert_mean(&log_spin, log(0.035));
  assert_close(sample_deviation(&log_spin), 0.5, SIGMAS / sqrt(2.0 * DRAWS));
}

static void concentration_scatters_about_the_median(void **state) {
  stage *s = stage_fresh(state);
  sample log_factor = {0};
  for (uint64_t key = 1; key <= DRAWS; key++)
    sample_add(&log_factor, log10(ew_branch_luck_draw(&s->settings.model, &s->draws, key).concentration_factor));
  assert_mean(&log_factor, 0.0);
  assert_close(sample_deviation(&log_factor), 0.16, SIGMAS / sqrt(2.0 * DRAWS));
}

/* Enriched from outside by redshift z with probability min(1, 10^(-(z-6)/3)): 1/2 by z = 6.903, 1/10 by 9. */
static void enrichment_has_the_probability_asked_for(void **state) {
  stage *s = stage_fresh(state);
  static const double redshift[] = {6.90309, 9.0, 12.0}, expected[] = {0.5, 0.1, 0.01};
  double enriched[3] = {0.0};
  for (uint64_t key = 1; key <= DRAWS; key++) {
    double z = ew_branch_luck_draw(&s->settings.model, &s->draws, key).enrichment_redshift;
    assert_true(z == ew_enrichment_redshift_draw(&s->draws, key));
    assert_true(z > 6.0);
    for (int k = 0; k < 3; k++)
      enriched[k] += z > redshift[k];
  }
  for (int k = 0; k < 3; k++)
    assert_share(enriched[k], DRAWS, expected[k]);
}

/* Solar metals are 0.0134 of the mass (Asplund et al. 2009). */
static void external_metals_have_their_median_and_scatter(void **state) {
  stage *s = stage_fresh(state);
  sample log_metals = {0};
  for (uint64_t key = 1; key <= DRAWS; key++)
    sample_add(&log_metals, log10(ew_branch_luck_draw(&s->settings.model, &s->draws, key).external_metals / 0.0134));
  assert_mean(&log_metals, -3.5);
  assert_close(sample_deviation(&log_metals), 0.5, SIGMAS / sqrt(2.0 * DRAWS));
  s->settings.model.gas.external_metallicity = -1.0;
  s->settings.model.gas.external_scatter = 2.0;
  for (uint64_t key = 1; key <= DRAWS; key++)
    assert_true(ew_branch_luck_draw(&s->settings.model, &s->draws, key).external_metals <= 0.0134);
}

/* The draws of one branch do not hang together: spin tells nothing of concentration or metals. */
static void luck_is_independent(void **state) {
  stage *s = stage_fresh(state);
  sample with_concentration = {0}, with_metals = {0};
  for (uint64_t key = 1; key <= DRAWS; key++) {
    ew_branch_luck luck = ew_branch_luck_draw(&s->settings.model, &s->draws, key);
    double spin = log(luck.spin / 0.035) / 0.5;
    sample_add(&with_concentration, spin * log10(luck.concentration_factor) / 0.16);
    sample_add(&with_metals, spin * (log10(luck.external_metals / 0.0134) + 3.5) / 0.5);
  }
  assert_mean(&with_concentration, 0.0);
  assert_mean(&with_metals, 0.0);
}

/* Oxygen is most of what core collapse makes; no hydrogen and helium among metals. */
static void external_metals_are_those_of_supernovae(void **state) {
  stage *s = stage_fresh(state);
  const ew_composition *metals = &s->world.external_metals;
  assert_close(ew_composition_mass(metals), 1.0, ROUNDING);
  assert_true(metals->mass[EW_HYDROGEN] == 0.0 && metals->mass[EW_HELIUM] == 0.0);
  assert_true(metals->mass[EW_OXYGEN] > 0.4 && metals->mass[EW_OXYGEN] < 0.8);
  double alpha = ew_abundance(metals, EW_OXYGEN, EW_IRON);
  assert_true(alpha > 0.2 && alpha < 0.8);
  ew_composition gas = ew_external_gas(&s->world, 5.0, 0.01);
  assert_close(ew_composition_mass(&gas), 5.0, ROUNDING);
  assert_close(ew_composition_metals(&gas), 0.05, ROUNDING);
  assert_close(gas.mass[EW_HELIUM], 5.0 * 0.99 * ew_primordial.mass[EW_HELIUM], ROUNDING);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(thresholds_are_atomic_after_reionization),
      cmocka_unit_test(streaming_is_maxwellian),
      cmocka_unit_test(no_streaming_when_it_is_switched_off),
      cmocka_unit_test(patches_are_ionized_about_the_mean),
      cmocka_unit_test(no_patch_is_ionized_at_absurd_redshifts),
      cmocka_unit_test(patch_changes_with_its_own_realization_only),
      cmocka_unit_test(spin_has_its_median_and_scatter),
      cmocka_unit_test(concentration_scatters_about_the_median),
      cmocka_unit_test(enrichment_has_the_probability_asked_for),
      cmocka_unit_test(external_metals_have_their_median_and_scatter),
      cmocka_unit_test(luck_is_independent),
      cmocka_unit_test(external_metals_are_those_of_supernovae),
  };
  return cmocka_run_group_tests(tests, open_stage, close_stage);
}
