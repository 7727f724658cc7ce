/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Massive stars die when their time has come, in whatever time step; rings of pending deaths wrap, join and wait. */
#include "galaxy/stage.h"

static const ew_composition unenriched = {{[EW_HYDROGEN] = 0.753, [EW_HELIUM] = 0.247}};

/* A star of 20 Msun that returns 18, of which 2 Msun of hydrogen have become oxygen. */
static ew_dying star_of_age(double age, double number) {
  ew_dying dying = {.age = age, .number = number, .fraction = &unenriched};
  dying.death = (ew_death){.fate = EW_FATE_CORE_COLLAPSE, .ejected = 18.0, .remnant = 2.0, .energy = 1.5};
  dying.death.made.mass[EW_HYDROGEN] = -2.0;
  dying.death.made.mass[EW_OXYGEN] = 2.0;
  return dying;
}

static ew_galaxy *galaxy_of_stars(stage *s, uint64_t key, double mass) {
  ew_galaxy *galaxy = stage_galaxy_of(s, key);
  put_gas(s, galaxy, EW_LIVING_STARS, mass, 0.0);
  return galaxy;
}

/* Supernovae in the slot of the environment. */
static double explode(stage *s, ew_galaxy *galaxy) {
  ew_step step = stage_step(s, galaxy);
  ew_explode_supernovae(&step);
  assert_conserved(galaxy);
  return step.supernovae;
}

static void schedule(stage *s, ew_galaxy *galaxy, double age, double number) {
  ew_step step = stage_step(s, galaxy);
  ew_dying dying = star_of_age(age, number);
  ew_schedule_death(&step, &dying);
  assert_false(step.short_of_memory);
}

/* The slot, counted from that of birth, in which a star of that life dies. */
static size_t slots_until_death(stage *s, double life) {
  ew_galaxy *galaxy = galaxy_of_stars(s, GALAXY_KEY, 100.0);
  const size_t birth = 40;
  stage_slot(s, birth);
  schedule(s, galaxy, life, 1.0);
  for (size_t slot = birth; slot < birth + 100; slot++) {
    stage_slot(s, slot);
    if (explode(s, galaxy) > 0.0)
      return slot - birth;
  }
  return 1000;
}

/* What the slot had to explode has exploded when stars form in it: theirs that die at once are the next slot's. */
static void stars_born_after_the_explosions_wait_a_slot(void **state) {
  stage *s = stage_fresh(state);
  ew_galaxy *galaxy = galaxy_of_stars(s, GALAXY_KEY, 100.0);
  stage_slot(s, 40);
  schedule(s, galaxy, 0.02, 1.0);
  assert_true(explode(s, galaxy) == 0.0);
  schedule(s, galaxy, 0.001, 2.0);
  stage_slot(s, 41);
  assert_true(explode(s, galaxy) == 2.0);
}

/* Stars are born in the middle of a step. Of 10 Myr: those of 4 Myr die in it, of 42 Myr (8 Msun) four steps later. */
static void stars_die_after_their_lives(void **state) {
  stage *s = stage_fresh(state);
  static const struct {
    double step, life;
    size_t slots;
  } expected[] = {{0.01, 0.004, 0},   {0.01, 0.006, 1},   {0.01, 0.042, 4}, {0.01, 0.046, 5}, {0.002, 0.004, 2},
                  {0.002, 0.042, 21}, {0.002, 0.074, 37}, {0.05, 0.004, 0}, {0.05, 0.026, 1}, {0.05, 0.074, 1}};
  for (size_t i = 0; i < sizeof expected / sizeof expected[0]; i++) {
    stage_calendar(s, expected[i].step);
    assert_int_equal(slots_until_death(s, expected[i].life), expected[i].slots);
  }
}

/* No star that explodes outlives the span of the ring, whatever mass explodes and whatever its metals. */
static void ring_is_longer_than_any_life(void **state) {
  stage *s = stage_fresh(state);
  for (double metals = 1e-6; metals < 0.1; metals *= 1.3)
    assert_true(ew_lifetime(s->stars, ew_stars_rows[0].low, metals) < EW_PENDING_SPAN);
  assert_string_equal(ew_stars_rows[0].name, "enrichment.supernova_mass");
  assert_true(ew_lifetime_metal_free(s->stars, ew_stars_rows[0].low) < EW_PENDING_SPAN);
}

/* Ejecta carry the star's own mixture with what it made; the rest of it is a remnant. */
static void dying_stars_give_back_and_leave_remnants(void **state) {
  stage *s = stage_fresh(state);
  ew_galaxy *galaxy = galaxy_of_stars(s, GALAXY_KEY, 100.0);
  put_gas(s, galaxy, EW_DISC_GAS, 1000.0, 0.0);
  schedule(s, galaxy, 0.001, 2.0);
  ew_step step = stage_step(s, galaxy);
  ew_explode_supernovae(&step);
  assert_close(mass_in(galaxy, EW_LIVING_STARS), 60.0, ROUNDING);
  assert_close(mass_in(galaxy, EW_REMNANTS), 4.0, ROUNDING);
  assert_close(mass_in(galaxy, EW_DISC_GAS), 1036.0, ROUNDING);
  assert_close(galaxy->ledger.in[EW_DISC_GAS].mass[EW_OXYGEN], 4.0, ROUNDING);
  assert_close(galaxy->ledger.in[EW_DISC_GAS].mass[EW_HYDROGEN], 0.753 * 1036.0 - 4.0, 1e-9);
  assert_near(mass_in(galaxy, EW_MADE), 0.0, 1e-9);
  assert_close(step.supernovae, 2.0, ROUNDING);
  assert_close(step.energy, 3.0, ROUNDING);
  assert_close(ew_effective_supernovae(galaxy), 2.0, ROUNDING);
  assert_conserved(galaxy);
}

/* A small cluster may draw more massive stars than it has mass: no more is given back than was there, and no mass is
 * made. */
static void no_more_dies_than_lives(void **state) {
  stage *s = stage_fresh(state);
  static const double lived[] = {39.0, 20.0, 4.5, 3.0, 0.0};
  for (int i = 0; i < 5; i++) {
    ew_galaxy *galaxy = galaxy_of_stars(s, GALAXY_KEY, lived[i]);
    schedule(s, galaxy, 0.001, 2.0);
    assert_true(explode(s, galaxy) > 0.0);
    assert_near(mass_in(galaxy, EW_LIVING_STARS), 0.0, 1e-9);
    assert_close(mass_in(galaxy, EW_DISC_GAS) + mass_in(galaxy, EW_REMNANTS), lived[i], 1e-9);
    assert_near(mass_in(galaxy, EW_MADE), 0.0, 1e-9);
  }
}

/* Over hundreds of turns of the ring as many die as were born, each in its time. */
static void ring_wraps(void **state) {
  stage *s = stage_fresh(state);
  static const double step[] = {0.002, 0.01, 0.05};
  for (int i = 0; i < 3; i++) {
    stage_calendar(s, step[i]);
    ew_galaxy *galaxy = galaxy_of_stars(s, GALAXY_KEY, 1e7);
    double died = 0.0, expected = 0.0;
    size_t wait = slots_until_death(s, 0.06), first = 30, count = 200;
    for (size_t slot = first; slot < first + count; slot++) {
      stage_slot(s, slot);
      schedule(s, galaxy, 0.06, (double)(slot - first + 1));
      double now = explode(s, galaxy);
      died += now;
      if (slot >= first + wait)
        assert_close(now, (double)(slot - first - wait + 1), ROUNDING);
      else
        assert_true(now == 0.0);
      expected += now;
    }
    assert_true(died > 0.0 && died == expected);
  }
}

static void join(stage *s, ew_galaxy *host, ew_galaxy *satellite) {
  ew_merger merger = {.host = s->environment.halo, .satellite = s->environment.halo, .mass_ratio = 0.1};
  ew_error error = {0};
  assert_fine(ew_galaxy_merge(host, satellite, &merger, &s->environment, &error), &error);
}

/* Slots from the one after the merger until the satellite's star dies, which has 5 slots to go then. The host had a
 * star `before` slots ago (or none: 0) and has been advanced since, or not. */
static size_t slots_after_merger(stage *s, size_t before, bool advanced) {
  const size_t now = 300;
  ew_galaxy *host = galaxy_of_stars(s, 1, 1e4), *satellite = galaxy_of_stars(s, 2, 1e4);
  for (size_t slot = now - before; before > 0 && slot <= now; slot++) {
    stage_slot(s, slot);
    if (slot == now - before)
      schedule(s, host, 0.001, 1.0);
    if (advanced || slot == now - before)
      explode(s, host);
  }
  stage_slot(s, now);
  schedule(s, satellite, 0.06, 1.0);
  explode(s, satellite);
  join(s, host, satellite);
  for (size_t slot = now + 1; slot < now + 100; slot++) {
    stage_slot(s, slot);
    if (explode(s, host) > 0.0)
      return slot - now;
  }
  return 1000;
}

static void rings_join_at_mergers(void **state) {
  stage *s = stage_fresh(state);
  assert_int_equal(slots_after_merger(s, 0, true), 6);
  assert_int_equal(slots_after_merger(s, 3, true), 6);
  assert_int_equal(slots_after_merger(s, 200, true), 6);
  assert_int_equal(slots_after_merger(s, 200, false), 6); /* the host was idle */
}

/* Deaths of both wait side by side. */
static void joined_rings_keep_all_deaths(void **state) {
  stage *s = stage_fresh(state);
  ew_galaxy *host = galaxy_of_stars(s, 1, 1e6), *satellite = galaxy_of_stars(s, 2, 1e6);
  double expected = 0.0, died = 0.0;
  for (size_t slot = 300; slot < 320; slot++) {
    stage_slot(s, slot);
    schedule(s, host, 0.03, 2.0);
    schedule(s, satellite, 0.05, 3.0);
    expected += 5.0;
    died += explode(s, host) + explode(s, satellite);
  }
  join(s, host, satellite);
  for (size_t slot = 320; slot < 340; slot++) {
    stage_slot(s, slot);
    died += explode(s, host);
  }
  assert_close(died, expected, ROUNDING);
}

/* A galaxy that was idle for long starts anew: its new stars live as long as any. */
static void stars_born_after_a_pause_live_their_time(void **state) {
  stage *s = stage_fresh(state);
  ew_galaxy *galaxy = galaxy_of_stars(s, GALAXY_KEY, 1e4);
  stage_slot(s, 100);
  schedule(s, galaxy, 0.001, 1.0);
  explode(s, galaxy);
  stage_slot(s, 700);
  schedule(s, galaxy, 0.042, 1.0);
  for (size_t slot = 700; slot < 704; slot++) {
    stage_slot(s, slot);
    assert_true(explode(s, galaxy) == 0.0);
  }
  stage_slot(s, 704);
  assert_true(explode(s, galaxy) == 1.0);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(stars_born_after_the_explosions_wait_a_slot),
      cmocka_unit_test(stars_die_after_their_lives),
      cmocka_unit_test(ring_is_longer_than_any_life),
      cmocka_unit_test(dying_stars_give_back_and_leave_remnants),
      cmocka_unit_test(no_more_dies_than_lives),
      cmocka_unit_test(ring_wraps),
      cmocka_unit_test(rings_join_at_mergers),
      cmocka_unit_test(joined_rings_keep_all_deaths),
      cmocka_unit_test(stars_born_after_a_pause_live_their_time),
  };
  return cmocka_run_group_tests(tests, open_stage, close_stage);
}
