/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Whatever the parameters and whatever happens to its halo, a galaxy loses and gains no mass: random models, random
 * growth, infall, mergers and time steps, with every element balanced, every reservoir positive and every book equal to
 * the ledger. */
#include "galaxy/stage.h"

#include <string.h>

#define BALANCE 1e-10 /* of each element, of all that was ever moved of it */
#define BOOKS   1e-9  /* of sums kept by addition over thousands of steps */
enum { MODELS = 24, ACTORS = 5 };

/* ---------------------------------------------------------------------------------------------- random parameters */

static double any_number(ew_stream *stream, double low, double high) {
  double u = ew_draw_uniform(stream);
  bool wide = low > 0.0 && high > 30.0 * low;
  return wide ? low * pow(high / low, u) : low + (high - low) * u;
}

static int choices_of(const ew_parameter *row) {
  int count = 0;
  while (row->choices[count].name)
    count++;
  return count;
}

static void draw_row(const ew_parameter *row, char *group, ew_stream *stream) {
  void *field = group + row->offset;
  double one = any_number(stream, row->low, row->high), two = any_number(stream, row->low, row->high);
  if (row->type == EW_REAL)
    memcpy(field, &one, sizeof one);
  else if (row->type == EW_INTERVAL)
    memcpy(field, (double[]){fmin(one, two), fmax(one, two)}, 2 * sizeof one);
  else if (row->type == EW_FLAG)
    memcpy(field, &(bool){ew_draw_uniform(stream) < 0.5}, sizeof(bool));
  else if (row->type == EW_CHOICE)
    memcpy(field, &(int){(int)(ew_draw_uniform(stream) * choices_of(row))}, sizeof(int));
  else
    fail_msg("%s is of a type that this test does not draw", row->name);
}

static void draw_group(const ew_parameter *rows, void *group, ew_stream *stream) {
  for (const ew_parameter *row = rows; row->name; row++)
    draw_row(row, group, stream);
}

static void draw_model(ew_model *model, ew_stream *stream) {
  draw_group(ew_structure_rows, &model->structure, stream);
  draw_group(ew_reionization_rows, &model->reionization, stream);
  draw_group(ew_first_star_rows, &model->first_stars, stream);
  model->first_stars.burst_mass = fmin(model->first_stars.burst_mass, 1e3); /* as many stars as a burst has room for */
  draw_group(ew_gas_rows, &model->gas, stream);
  draw_group(ew_star_formation_rows, &model->star_formation, stream);
  draw_group(ew_feedback_rows, &model->feedback, stream);
  draw_group(ew_mixing_rows, &model->mixing, stream);
  draw_group(ew_size_rows, &model->sizes, stream);
  draw_group(ew_satellite_rows, &model->satellites, stream);
  ew_error error = {0};
  const char *name = NULL;
  assert_fine(ew_model_check(model, &name, &error), &error);
}

/* -------------------------------------------------------------------------------------------------- what must hold */

static double sum_of_events(const ew_galaxy *galaxy) {
  double sum = 0.0;
  for (const ew_star_event *event = galaxy->event; event; event = event->next)
    sum += event->mass;
  return sum;
}

static double sum_of_components(const ew_galaxy *galaxy) {
  double sum = 0.0;
  for (const ew_component *c = galaxy->component; c; c = c->next) {
    assert_true(c->radius > 0.0 && isfinite(c->radius));
    sum += c->mass;
  }
  return sum;
}

static double sum_of_cohorts(const ew_galaxy *galaxy) {
  double sum = 0.0;
  for (size_t i = 0; i < galaxy->cohort_count; i++)
    sum += galaxy->cohort[i].mass;
  return sum;
}

static void assert_sound(const ew_galaxy *galaxy) {
  const ew_ledger *ledger = &galaxy->ledger;
  assert_true(ew_ledger_imbalance(ledger) <= BALANCE);
  for (int r = EW_HALO_GAS; r <= EW_REMNANTS; r++)
    for (int i = 0; i < EW_ELEMENT_COUNT; i++)
      assert_true(ledger->in[r].mass[i] >= 0.0 && isfinite(ledger->in[r].mass[i]));
  assert_near(ew_ledger_mass(ledger, EW_MADE), 0.0, BALANCE * galaxy->formed);
  assert_true(ew_stellar_mass(galaxy) <= galaxy->formed * (1.0 + BOOKS));
  assert_close(sum_of_events(galaxy), galaxy->formed, BOOKS);
  assert_close(sum_of_components(galaxy), galaxy->formed, BOOKS);
  assert_close(sum_of_cohorts(galaxy), galaxy->formed - galaxy->formed_metal_free, BOOKS);
  assert_true(galaxy->held >= 0.0 && galaxy->held_squares >= 0.0 && isfinite(galaxy->held));
}

/* -------------------------------------------------------------------------------------------------- random histories
 */

typedef struct {
  ew_galaxy *galaxy;
  bool satellite;
  double mass, growth; /* Msun, and e-foldings per Gyr while it is a central */
  ew_nfw halo;         /* at infall */
  double mass_ratio;
} actor;

typedef struct {
  stage *s;
  ew_stream stream;
  actor actor[ACTORS]; /* the first is the host of all */
  uint64_t keys;
  ew_ledger gone; /* of galaxies that were dissolved */
  int mergers, infalls;
  double taken_in; /* Msun, by all, from outside */
} play;

static void enter(play *p, actor *a, double mass) {
  ew_branch_luck luck = ew_branch_luck_draw(&p->s->settings.model, &p->s->draws, ++p->keys);
  *a = (actor){.galaxy = ew_galaxy_new(p->s->arena, p->keys, &luck), .mass = mass};
  a->growth = 4.0 * ew_draw_uniform(&p->stream);
}

static void set_environment(play *p, const actor *a) {
  ew_environment *e = &p->s->environment;
  ew_environment_set_halo(e, a->mass, ew_galaxy_luck(a->galaxy)->concentration_factor);
  e->satellite = a->satellite;
  if (!a->satellite)
    return;
  e->halo = a->halo;
  e->virial_velocity = ew_nfw_circular_velocity(&a->halo, a->halo.radius);
}

static void fall_in(play *p, actor *a) {
  actor *host = &p->actor[0];
  set_environment(p, a);
  a->halo = p->s->environment.halo;
  a->mass_ratio = a->mass / host->mass;
  p->infalls++;
  if (ew_galaxy_has_stars(a->galaxy)) {
    ew_galaxy_fall_in(host->galaxy, a->galaxy);
    a->satellite = true;
    return;
  }
  ew_galaxy_dissolve(host->galaxy, a->galaxy);
  ew_ledger_add(&p->gone, ew_galaxy_ledger(a->galaxy));
  enter(p, a, 1e5);
}

static void merge(play *p, actor *a) {
  actor *host = &p->actor[0];
  set_environment(p, host);
  ew_merger merger = {p->s->environment.halo, a->halo, p->s->environment.redshift, a->mass_ratio};
  ew_error error = {0};
  bool dark = ew_draw_uniform(&p->stream) < 0.2;
  if (dark)
    assert_fine(ew_galaxy_merge(host->galaxy, NULL, &merger, &p->s->environment, &error), &error);
  assert_fine(ew_galaxy_merge(host->galaxy, a->galaxy, &merger, &p->s->environment, &error), &error);
  p->mergers++;
  enter(p, a, 1e6);
}

/* Once in that many Gyr. */
static bool happens(play *p, double interval) {
  return ew_draw_uniform(&p->stream) < p->s->calendar.step / interval;
}

static void live_one_slot(play *p, actor *a) {
  double grown = a->growth * p->s->calendar.step * 2.0 * ew_draw_uniform(&p->stream);
  if (!a->satellite)
    a->mass = fmin(a->mass * exp(grown), 1e11);
  if (happens(p, 1.0)) {
    ew_received dark = {.baryons = 1e3 * a->mass / 1e6, .gas = 500.0 * a->mass / 1e6, .metal_fraction = 1e-6};
    ew_galaxy_receive(a->galaxy, &dark, &p->s->world);
    p->taken_in += dark.gas;
  }
  set_environment(p, a);
  stage_advance(p->s, a->galaxy);
  p->taken_in += a->galaxy->supply;
}

static void play_slot(play *p, size_t slot) {
  stage_slot(p->s, slot);
  for (int i = 0; i < ACTORS; i++)
    live_one_slot(p, &p->actor[i]);
  for (int i = 1; i < ACTORS; i++)
    if (p->actor[i].satellite ? happens(p, 1.0) : happens(p, 2.0))
      (p->actor[i].satellite ? merge : fall_in)(p, &p->actor[i]);
}

static void assert_all_sound(const play *p) {
  for (int i = 0; i < ACTORS; i++)
    assert_sound(p->actor[i].galaxy);
}

/* From outside came, all in all, what was supplied: infall and mergers only hand over. */
static void assert_nothing_lost_in_between(const play *p) {
  ew_ledger all = p->gone;
  for (int i = 0; i < ACTORS; i++)
    ew_ledger_add(&all, &p->actor[i].galaxy->ledger);
  assert_true(ew_ledger_imbalance(&all) <= BALANCE);
  assert_close(-ew_ledger_mass(&all, EW_OUTSIDE), p->taken_in, BOOKS);
}

static void play_history(play *p) {
  stage *s = p->s;
  for (int i = 0; i < ACTORS; i++)
    enter(p, &p->actor[i], i == 0 ? 1e7 : 1e6);
  size_t first = ew_calendar_slot(&s->calendar, 0.1), count = 0;
  for (size_t slot = first; slot < s->calendar.slot_count; slot++) {
    play_slot(p, slot);
    if (++count % 40 == 0)
      assert_all_sound(p);
  }
  for (int i = 0; i < ACTORS; i++) {
    ew_observables seen;
    set_environment(p, &p->actor[i]);
    ew_galaxy_observe(p->actor[i].galaxy, &s->environment, &seen);
    assert_true(isfinite(seen.stellar_mass) && isfinite(seen.luminosity_v));
    bool shines = seen.luminosity_v > 0.0;
    assert_true(shines == isfinite(seen.half_light_radius) && shines == isfinite(seen.velocity_dispersion));
  }
  assert_all_sound(p);
  assert_nothing_lost_in_between(p);
}

typedef struct {
  int mergers, infalls;
  double formed, metal_free, lost, ejected;
} tally;

static void add_up(tally *sum, const play *p) {
  sum->mergers += p->mergers;
  sum->infalls += p->infalls;
  for (int i = 0; i < ACTORS; i++) {
    sum->formed += p->actor[i].galaxy->formed;
    sum->metal_free += p->actor[i].galaxy->formed_metal_free;
    sum->lost += mass_in(p->actor[i].galaxy, EW_LOST_GAS);
    sum->ejected += mass_in(p->actor[i].galaxy, EW_EJECTED_GAS);
  }
}

/* One history; the first model is the standard one. */
static void play_model(stage *s, uint64_t number, tally *sum) {
  const ew_draws draws = {.seed = 1, .tree = number};
  ew_stream stream = ew_stream_open(&draws, EW_PROCESS_SURVEY, 0, 0);
  static const double step[] = {0.01, 0.05, 0.01, 0.005, 0.02};
  ew_stars_parameters parameters = s->standard.stars;
  if (number > 0) {
    draw_model(&s->settings.model, &stream);
    draw_group(ew_stars_rows, &parameters, &stream);
  }
  stage_calendar(s, step[number % 5]);
  s->draws = draws;
  ew_stars *stars = NULL;
  ew_error error = {0};
  assert_fine(ew_stars_new(&stars, &parameters, &error), &error);
  s->world = ew_world_of(s->cosmology, s->concentration, stars);
  stage_patch(s);
  play p = {.s = s, .stream = stream, .keys = 1000 * number};
  play_history(&p);
  add_up(sum, &p);
  ew_stars_free(stars);
}

static void no_history_loses_or_makes_mass(void **state) {
  tally sum = {0};
  for (uint64_t number = 0; number < MODELS; number++)
    play_model(stage_fresh(state), number, &sum);
  assert_true(sum.mergers > 50 && sum.infalls > 100);
  assert_true(sum.formed > 1e8 && sum.metal_free > 1e4 && sum.lost > 1e7 && sum.ejected > 1e6);
}

int main(void) {
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(no_history_loses_or_makes_mass),
  };
  return cmocka_run_group_tests(tests, open_stage, close_stage);
}
