/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Time to sink: the friction law on an orbit of the satellite's own. */
#include "galaxy/stage.h"

static double sinking_time(stage *s, double mass, uint64_t branch, uint64_t ordinal) {
  return ew_sinking_time(&s->environment, mass, branch, ordinal);
}

/* Boylan-Kolchin, Ma & Quataert 2008, eq. 5, on the orbit that the satellite's stream gives. */
static void time_follows_the_friction_law(void **state) {
  stage *s = stage_fresh(state);
  stage_halo(s, 1e10);
  ew_stream stream = ew_stream_open(&s->draws, EW_PROCESS_ORBITS, 42, 0);
  double u_circularity = ew_draw_uniform(&stream), u_radius = ew_draw_uniform(&stream);
  ew_orbit orbit = ew_orbit_draw(u_circularity, u_radius);
  const double ratio = 8.0;
  double crossing = ew_halo_crossing_time(s->cosmology, 0.0);
  double expected =
      crossing * 0.216 * pow(ratio, 1.3) / log(1.0 + ratio) * exp(1.9 * orbit.circularity) * orbit.circular_radius;
  assert_close(sinking_time(s, 1e10 / ratio, 42, 0), expected, 1e-9);
}

static void factor_stretches_the_time(void **state) {
  stage *s = stage_fresh(state);
  double once = sinking_time(s, 1e8, 42, 0);
  s->settings.model.satellites.friction_factor = 2.5;
  assert_close(sinking_time(s, 1e8, 42, 0), 2.5 * once, ROUNDING);
  s->settings.model.satellites.friction_factor = 0.0;
  assert_true(sinking_time(s, 1e8, 42, 0) == 0.0);
}

static void every_infall_has_its_own_orbit(void **state) {
  stage *s = stage_fresh(state);
  double first = sinking_time(s, 1e8, 42, 0);
  assert_true(sinking_time(s, 1e8, 42, 0) == first);
  assert_true(sinking_time(s, 1e8, 42, 1) != first);
  assert_true(sinking_time(s, 1e8, 43, 0) != first);
  s->draws.realization[EW_PROCESS_PATCH] = 1;
  assert_true(sinking_time(s, 1e8, 42, 0) == first);
  s->draws.realization[EW_PROCESS_ORBITS] = 1;
  assert_true(sinking_time(s, 1e8, 42, 0) != first);
}

static void heavier_satellites_sink_faster(void **state) {
  stage *s = stage_fresh(state);
  double last = INFINITY;
  for (double mass = 1e5; mass < 1e9; mass *= 2.0) {
    double now = sinking_time(s, mass, 42, 0);
    assert_true(now > 0.0 && now < last);
    last = now;
  }
  assert_true(sinking_time(s, 2e9, 42, 0) == sinking_time(s, 1e9, 42, 0)); /* as heavy as the host at most */
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(time_follows_the_friction_law),
      cmocka_unit_test(factor_stretches_the_time),
      cmocka_unit_test(every_infall_has_its_own_orbit),
      cmocka_unit_test(heavier_satellites_sink_faster),
  };
  return cmocka_run_group_tests(tests, open_stage, close_stage);
}
