/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * A stage for single galaxies: the standard tables, calendar and parameters, a patch, and an environment that tests set
 * by hand. Tests ask for a fresh stage, so none depends on what another left behind. */
#ifndef TESTS_GALAXY_STAGE_H
#define TESTS_GALAXY_STAGE_H

#include "elfinwood/population.h"
#include "galaxy/state.h"

#include <math.h>
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdlib.h>

#include <cmocka.h>

#define ROUNDING     1e-12
#define AVERAGE_SPIN 0.035
#define GALAXY_KEY   77

typedef struct {
  ew_settings settings; /* model parameters as tests change them */
  ew_settings standard;
  ew_cosmology *cosmology;
  ew_spectrum *spectrum;
  ew_concentration *concentration;
  ew_stars *stars;
  ew_calendar calendar;
  ew_world world;
  ew_arena *arena;
  ew_draws draws;
  ew_patch patch;
  ew_environment environment;
} stage;

/* `tolerance` is relative. */
static inline void assert_close(double value, double expected, double tolerance) {
  if (!(fabs(value - expected) <= tolerance * fabs(expected)))
    fail_msg("%.17g is not %.17g to %g", value, expected, tolerance);
}

/* `tolerance` is absolute. */
static inline void assert_near(double value, double expected, double tolerance) {
  if (!(fabs(value - expected) <= tolerance))
    fail_msg("%.17g is not %.17g within %g", value, expected, tolerance);
}

static inline void assert_fine(ew_status status, const ew_error *error) {
  if (status != EW_OK)
    fail_msg("%s", error->message);
}

static inline void read_defaults(ew_settings *settings) {
  ew_parameter_values values;
  ew_error error = {0};
  assert_fine(ew_parameters_open(&values, ew_settings_table(), settings, &error), &error);
  ew_parameters_close(&values);
}

/* Another time step: tests that change it put the standard one back with stage_fresh. */
static inline void stage_calendar(stage *s, double step) {
  ew_error error = {0};
  ew_calendar_clear(&s->calendar);
  assert_fine(ew_calendar_make(&s->calendar, s->cosmology, 0.0, step, &error), &error);
}

/* For cmocka_run_group_tests. */
static inline int open_stage(void **state) {
  ew_core_start();
  stage *s = calloc(1, sizeof *s);
  ew_error error = {0};
  read_defaults(&s->standard);
  assert_fine(ew_cosmology_new(&s->cosmology, &s->standard.cosmology, &error), &error);
  assert_fine(ew_spectrum_new(&s->spectrum, s->cosmology, &s->standard.spectrum, &error), &error);
  assert_fine(ew_concentration_new(&s->concentration, s->spectrum, &error), &error);
  assert_fine(ew_stars_new(&s->stars, &s->standard.stars, &error), &error);
  s->world = ew_world_of(s->cosmology, s->concentration, s->stars);
  s->arena = ew_arena_new();
  *state = s;
  return 0;
}

static inline int close_stage(void **state) {
  stage *s = *state;
  ew_arena_free(s->arena);
  ew_calendar_clear(&s->calendar);
  ew_stars_free(s->stars);
  ew_concentration_free(s->concentration);
  ew_spectrum_free(s->spectrum);
  ew_cosmology_free(s->cosmology);
  free(s);
  return 0;
}

/* Draws the patch anew, for the model as it is now. */
static inline void stage_patch(stage *s) {
  ew_error error = {0};
  assert_fine(ew_patch_draw(&s->patch, &s->world, &s->settings.model, &s->calendar, &s->draws, s->arena, &error),
              &error);
}

/* The slot in which that redshift is reached. */
static inline void stage_at(stage *s, double redshift) {
  s->environment.slot = ew_calendar_slot(&s->calendar, ew_age(s->cosmology, redshift));
  s->environment.redshift = s->calendar.redshift[s->environment.slot];
}

static inline void stage_slot(stage *s, size_t slot) {
  s->environment.slot = slot;
  s->environment.redshift = s->calendar.redshift[slot];
}

static inline void stage_halo(stage *s, double mass) {
  ew_environment_set_halo(&s->environment, mass, 1.0);
}

/* Defaults but that every patch is ionized at z = 8 exactly; a halo of 1e9 Msun at z = 0. */
static inline stage *stage_fresh(void **state) {
  stage *s = *state;
  ew_arena_return(s->arena, (ew_arena_mark){0});
  s->settings = s->standard;
  s->settings.model.reionization.redshift = 8.0;
  s->settings.model.reionization.redshift_scatter = 0.0;
  if (s->calendar.step != s->standard.ensemble.time_step)
    stage_calendar(s, s->standard.ensemble.time_step);
  s->world = ew_world_of(s->cosmology, s->concentration, s->stars);
  s->draws = (ew_draws){.seed = 5, .tree = 11};
  stage_patch(s);
  s->environment = (ew_environment){.world = &s->world,
                                    .calendar = &s->calendar,
                                    .model = &s->settings.model,
                                    .patch = &s->patch,
                                    .draws = &s->draws};
  stage_at(s, 0.0);
  stage_halo(s, 1e9);
  return s;
}

/* Another draw of every process. */
static inline void stage_realization(stage *s, uint64_t number) {
  for (int p = 0; p < EW_PROCESS_COUNT; p++)
    s->draws.realization[p] = number;
}

static inline ew_galaxy *stage_galaxy_of(stage *s, uint64_t key) {
  const ew_branch_luck average = {.concentration_factor = 1.0, .spin = AVERAGE_SPIN};
  ew_galaxy *galaxy = ew_galaxy_new(s->arena, key, &average);
  assert_non_null(galaxy);
  return galaxy;
}

static inline ew_galaxy *stage_galaxy(stage *s) {
  return stage_galaxy_of(s, GALAXY_KEY);
}

/* A step through the slot of the environment. */
static inline ew_step stage_step(const stage *s, ew_galaxy *galaxy) {
  size_t slot = s->environment.slot;
  return (ew_step){.galaxy = galaxy,
                   .environment = &s->environment,
                   .start = (double)slot * s->calendar.step,
                   .end = ew_calendar_end_of(&s->calendar, slot),
                   .share = 1.0};
}

static inline void stage_advance(stage *s, ew_galaxy *galaxy) {
  ew_step step = stage_step(s, galaxy);
  ew_error error = {0};
  assert_fine(ew_galaxy_advance(galaxy, &s->environment, step.start, step.end, &error), &error);
}

/* Puts gas of that mass fraction of metals into a reservoir, from outside. */
static inline void put_gas(const stage *s, ew_galaxy *galaxy, ew_reservoir reservoir, double mass, double metals) {
  ew_composition gas = ew_external_gas(&s->world, mass, metals);
  ew_ledger_move(&galaxy->ledger, EW_OUTSIDE, reservoir, &gas);
}

static inline double mass_in(const ew_galaxy *galaxy, ew_reservoir reservoir) {
  return ew_ledger_mass(&galaxy->ledger, reservoir);
}

/* Normal stars of the composition that the gas of put_gas has, all formed in this step; none of them is about to die.
 */
static inline ew_star_event *put_stars(const stage *s, ew_galaxy *galaxy, double mass, double metals) {
  ew_step step = stage_step(s, galaxy);
  ew_composition fraction = ew_external_gas(&s->world, 1.0, metals);
  put_gas(s, galaxy, EW_LIVING_STARS, mass, metals);
  ew_star_event *event = ew_event_of_slot(&step, false);
  ew_event_add(event, mass, &fraction);
  ew_component_add(&step, mass, ew_disc_half_mass_radius(step.galaxy, step.environment));
  ew_cohort_add(&step, mass, &fraction);
  return event;
}

static inline void assert_conserved(const ew_galaxy *galaxy) {
  double imbalance = ew_ledger_imbalance(&galaxy->ledger);
  if (!(imbalance <= ROUNDING))
    fail_msg("an element is out of balance by %g", imbalance);
}

/* Mean, variance and how far the mean may be off. */
typedef struct {
  double count, sum, squares;
} sample;

static inline void sample_add(sample *x, double value) {
  x->count += 1.0;
  x->sum += value;
  x->squares += value * value;
}

static inline double sample_mean(const sample *x) {
  return x->sum / x->count;
}

static inline double sample_deviation(const sample *x) {
  double mean = sample_mean(x);
  return sqrt(fmax(x->squares / x->count - mean * mean, 0.0) * x->count / (x->count - 1.0));
}

#define SIGMAS 4.5 /* streams are fixed, so a test that passes once always does; by luck one in 1e5 would not */

static inline double sample_error(const sample *x) {
  return sample_deviation(x) / sqrt(x->count);
}

static inline void assert_mean(const sample *x, double expected) {
  if (!(fabs(sample_mean(x) - expected) <= SIGMAS * sample_error(x)))
    fail_msg("the mean %g +- %g is not %g", sample_mean(x), sample_error(x), expected);
}

/* The binomial share of `count` trials. */
static inline void assert_share(double successes, double count, double expected) {
  double error = sqrt(expected * (1.0 - expected) / count);
  if (!(fabs(successes / count - expected) <= SIGMAS * error))
    fail_msg("the share %g +- %g is not %g", successes / count, error, expected);
}

#endif
