/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Incomplete mixing: the mean over clusters is the gas's, the scatter is as asked for, and nothing takes metals that
 * are not there. */
#include "galaxy/stage.h"

#define GAS_METALS 1e-4

/* Gas enriched by that many supernovae of equal weight. */
static ew_galaxy *enriched_by(stage *s, double supernovae) {
  ew_galaxy *galaxy = stage_galaxy(s);
  put_gas(s, galaxy, EW_DISC_GAS, 1e6, GAS_METALS);
  ew_hold_supernovae(galaxy, supernovae);
  return galaxy;
}

typedef struct {
  sample metals, log_metals, log_ratio; /* metals over the gas's; its log10; log10 of O/Fe over the gas's */
} mixture;

static mixture mixture_of(stage *s, ew_galaxy *galaxy, int clusters) {
  mixture m = {0};
  ew_step step = stage_step(s, galaxy);
  const ew_composition gas = ew_external_gas(&s->world, 1.0, GAS_METALS);
  ew_stream stream = ew_step_stream(&step, EW_PROCESS_MIXING, EW_DRAW_MIXING);
  for (int i = 0; i < clusters; i++) {
    ew_composition drawn;
    ew_mix_cluster(&step, &stream, 1.0, &drawn);
    assert_close(ew_composition_mass(&drawn), 1.0, ROUNDING);
    double metals = ew_composition_metals(&drawn) / GAS_METALS;
    sample_add(&m.metals, metals);
    sample_add(&m.log_metals, log10(drawn.mass[EW_OXYGEN] / gas.mass[EW_OXYGEN]));
    sample_add(&m.log_ratio,
               log10(drawn.mass[EW_OXYGEN] / drawn.mass[EW_IRON] * gas.mass[EW_IRON] / gas.mass[EW_OXYGEN]));
  }
  return m;
}

enum { CLUSTERS = 20000 };
#define DEVIATION_ERROR (SIGMAS / sqrt(2.0 * CLUSTERS))

/* sigma^2 = 0.1^2 + 0.4^2/N + 0.05^2 of one element, in dex; the median lies 1.151 sigma^2 dex below the mean. */
static void scatter_falls_with_the_number_of_supernovae(void **state) {
  stage *s = stage_fresh(state);
  s->settings.model.mixing.mixing_scatter = 0.4;
  static const double number[] = {1.0, 4.0, 1e6};
  static const double expected[] = {0.415331, 0.229129, 0.111804};
  for (int i = 0; i < 3; i++) {
    mixture m = mixture_of(s, enriched_by(s, number[i]), CLUSTERS);
    assert_mean(&m.metals, 1.0);
    assert_close(sample_deviation(&m.log_metals), expected[i], DEVIATION_ERROR);
    assert_mean(&m.log_metals, -0.5 * log(10.0) * expected[i] * expected[i]);
  }
}

/* Two elements of one cluster part by sqrt(2) times the scatter of each. */
static void elements_share_the_draw(void **state) {
  stage *s = stage_fresh(state);
  mixture m = mixture_of(s, enriched_by(s, 10.0), CLUSTERS);
  assert_close(sample_deviation(&m.log_ratio), 0.05 * sqrt(2.0), DEVIATION_ERROR);
  assert_mean(&m.log_ratio, 0.0);
  s->settings.model.mixing.element_scatter = 0.0;
  m = mixture_of(s, enriched_by(s, 10.0), 100);
  assert_near(sample_deviation(&m.log_ratio), 0.0, 1e-7);
}

static void well_mixed_gas_gives_its_own_metals(void **state) {
  stage *s = stage_fresh(state);
  s->settings.model.mixing = (ew_mixing_parameters){0};
  mixture m = mixture_of(s, enriched_by(s, 1.0), 10);
  assert_close(sample_mean(&m.metals), 1.0, 1e-9);
  assert_near(sample_deviation(&m.log_metals), 0.0, 1e-7);
}

static void metal_free_gas_gives_no_metals(void **state) {
  stage *s = stage_fresh(state);
  ew_galaxy *galaxy = stage_galaxy(s);
  put_gas(s, galaxy, EW_DISC_GAS, 1e6, 0.0);
  ew_step step = stage_step(s, galaxy);
  ew_stream stream = ew_step_stream(&step, EW_PROCESS_MIXING, EW_DRAW_MIXING);
  ew_composition drawn;
  ew_mix_cluster(&step, &stream, 30.0, &drawn);
  assert_true(ew_composition_metals(&drawn) == 0.0);
  assert_close(drawn.mass[EW_HELIUM], 0.2470, ROUNDING);
}

/* However the draw falls: at most half of the cluster is metals, and no metal is more than half of what the gas has. */
static void assert_held(stage *s, double gas_metals) {
  ew_galaxy *galaxy = stage_galaxy(s);
  put_gas(s, galaxy, EW_DISC_GAS, 1e6, gas_metals);
  ew_step step = stage_step(s, galaxy);
  ew_stream stream = ew_step_stream(&step, EW_PROCESS_MIXING, EW_DRAW_MIXING);
  double at_the_limit = 0.0;
  for (int i = 0; i < 2000; i++) {
    ew_composition drawn;
    ew_mix_cluster(&step, &stream, 2e5, &drawn);
    double metals = ew_composition_metals(&drawn);
    assert_true(metals <= 0.5 * (1.0 + ROUNDING));
    at_the_limit += metals > 0.7 * fmin(0.5, 2.5 * gas_metals);
    assert_close(ew_composition_mass(&drawn), 1.0, ROUNDING);
    for (int e = 0; e < EW_ELEMENT_COUNT; e++)
      assert_true(2e5 * drawn.mass[e] <=
                  (e > EW_HELIUM ? 0.5 : 1.0) * galaxy->ledger.in[EW_DISC_GAS].mass[e] * (1.0 + ROUNDING));
  }
  assert_true(at_the_limit > 10.0);
}

static void draws_are_held_to_what_there_is(void **state) {
  stage *s = stage_fresh(state);
  s->settings.model.mixing.mixing_scatter = 1.0;
  assert_held(s, 0.3);
  assert_held(s, 1e-3);
}

/* However low the draw falls, normal stars are no first stars. */
static void normal_stars_have_the_critical_metals(void **state) {
  stage *s = stage_fresh(state);
  s->settings.model.mixing.mixing_scatter = 2.0;
  s->settings.model.first_stars.critical_metallicity = -4.5;
  ew_galaxy *galaxy = stage_galaxy(s);
  double critical = EW_SOLAR_METALS * pow(10.0, -4.5);
  put_gas(s, galaxy, EW_DISC_GAS, 1e6, 3.0 * critical);
  ew_step step = stage_step(s, galaxy);
  ew_stream stream = ew_step_stream(&step, EW_PROCESS_MIXING, EW_DRAW_MIXING);
  int at_the_limit = 0;
  for (int i = 0; i < 1000; i++) {
    ew_composition drawn;
    ew_mix_cluster(&step, &stream, 30.0, &drawn);
    double metals = ew_composition_metals(&drawn);
    assert_true(metals >= critical * (1.0 - 1e-9));
    at_the_limit += metals < critical * (1.0 + 1e-9);
  }
  assert_in_range(at_the_limit, 10, 990);
}

/* Winds take the same part of every supernova's metals: what is left stems from as many. */
static void winds_leave_the_effective_number(void **state) {
  stage *s = stage_fresh(state);
  ew_galaxy *galaxy = stage_galaxy(s);
  assert_true(ew_effective_supernovae(galaxy) == 1.0);
  ew_hold_supernovae(galaxy, 10.0);
  assert_close(ew_effective_supernovae(galaxy), 10.0, ROUNDING);
  ew_release_supernovae(galaxy, 0.9);
  ew_release_supernovae(galaxy, 0.5);
  assert_close(ew_effective_supernovae(galaxy), 10.0, ROUNDING);
}

/* Ten supernovae of which half is left and five whole: (5 + 5)^2 / (10/4 + 5) = 13.333. */
static void fresh_supernovae_weigh_more(void **state) {
  stage *s = stage_fresh(state);
  ew_galaxy *galaxy = stage_galaxy(s);
  ew_hold_supernovae(galaxy, 10.0);
  ew_release_supernovae(galaxy, 0.5);
  ew_hold_supernovae(galaxy, 5.0);
  assert_close(ew_effective_supernovae(galaxy), 100.0 / 7.5, ROUNDING);
  ew_release_supernovae(galaxy, 7.0);
  assert_true(ew_effective_supernovae(galaxy) == 1.0);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(scatter_falls_with_the_number_of_supernovae),
      cmocka_unit_test(elements_share_the_draw),
      cmocka_unit_test(well_mixed_gas_gives_its_own_metals),
      cmocka_unit_test(metal_free_gas_gives_no_metals),
      cmocka_unit_test(draws_are_held_to_what_there_is),
      cmocka_unit_test(normal_stars_have_the_critical_metals),
      cmocka_unit_test(winds_leave_the_effective_number),
      cmocka_unit_test(fresh_supernovae_weigh_more),
  };
  return cmocka_run_group_tests(tests, open_stage, close_stage);
}
