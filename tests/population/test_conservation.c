/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * What no choice of parameters may break: elements are conserved along every tree, no reservoir is negative, all gas is
 * accounted for, the books of stars agree with each other, and rows hold only values that mean something. Parameters
 * are drawn anew for every tree from the whole range that their rows allow. */
#include "galaxy/state.h"
#include "population/evolution.h"
#include "sane_rows.h"

enum { LABORATORIES = 6, PER_LABORATORY = EW_TREES(52) };

#define ROUNDING 1e-10 /* of the turnover: what a long run of additions may lose */

/* ------------------------------------------------------------------------------------------------ random parameters */

static double between(ew_stream *stream, double low, double high) {
  double u = ew_draw_uniform(stream);
  return low > 0.0 && high / low > 100.0 ? low * pow(high / low, u) : low + u * (high - low);
}

static void draw_value(ew_stream *stream, const ew_parameter *row, void *field) {
  double *x = field;
  int choices = 0;
  while (row->type == EW_CHOICE && row->choices[choices].name)
    choices++;
  if (row->type == EW_REAL || row->type == EW_INTERVAL)
    *x = between(stream, row->low, row->high);
  if (row->type == EW_INTERVAL)
    x[1] = between(stream, x[0], row->high);
  if (row->type == EW_FLAG)
    *(bool *)field = ew_draw_uniform(stream) < 0.5;
  if (row->type == EW_CHOICE)
    *(int *)field = (int)(ew_draw_uniform(stream) * choices);
}

static void draw_rows(ew_stream *stream, const ew_parameter *rows, void *target) {
  for (; rows->name; rows++)
    draw_value(stream, rows, (char *)target + rows->offset);
}

static ew_stream stream_of(uint64_t number, uint64_t purpose) {
  return ew_stream_open(&(ew_draws){.seed = 2385, .tree = number}, EW_PROCESS_SURVEY, 0, purpose);
}

/* Every process's rows, in the table's own groups that fill the model. */
static ew_model random_model(uint64_t number) {
  ew_settings settings = SETTINGS(NULL);
  ew_stream stream = stream_of(number, 0);
  const ew_parameter_table *table = ew_settings_table();
  size_t begin = offsetof(ew_settings, model), end = begin + sizeof settings.model;
  for (size_t g = 0; g < table->count; g++)
    if (table->groups[g].offset >= begin && table->groups[g].offset < end)
      draw_rows(&stream, table->groups[g].rows, (char *)&settings + table->groups[g].offset);
  return settings.model;
}

/* The stars and the run's own numbers need new tables, so few of them are tried. */
static ew_laboratory *random_laboratory(uint64_t number) {
  static const double root_redshifts[LABORATORIES] = {0.0, 0.0, 0.0, 0.7, 3.0, 7.5};
  static const double time_steps[LABORATORIES] = {0.01, 0.01385, 0.01, 0.004, 0.01, 0.02};
  static const double resolutions[LABORATORIES] = {3e5, 1e6, 3e6, 1e6, 1e5, 1e7};
  ew_settings settings = SETTINGS("roots.mass_range=[3e7, 3e10]", "output.members=true");
  ew_stream stream = stream_of(number, 1);
  draw_rows(&stream, ew_stars_rows, &settings.stars);
  settings.roots.redshift = root_redshifts[number];
  settings.ensemble.time_step = time_steps[number];
  settings.trees.resolution_mass = resolutions[number];
  return laboratory_of(&settings);
}

/* ----------------------------------------------------------------------------------------------------------- ledger */

static double inflow(const ew_ledger *ledger) {
  return -ew_ledger_mass(ledger, EW_OUTSIDE);
}

static void check_ledger(const ew_ledger *ledger) {
  double imbalance = ew_ledger_imbalance(ledger);
  if (!(imbalance < ROUNDING))
    fail_msg("an element is lost or made of nothing: %g of the turnover", imbalance);
  for (int r = EW_HALO_GAS; r <= EW_REMNANTS; r++)
    for (int i = 0; i < EW_ELEMENT_COUNT; i++)
      if (!(ledger->in[r].mass[i] >= 0.0 && isfinite(ledger->in[r].mass[i])))
        fail_msg("reservoir %d holds %g Msun of %s", r, ledger->in[r].mass[i], ew_element_name((ew_element)i));
}

/* Nucleosynthesis turns elements into each other. */
static void check_made(const ew_ledger *ledger) {
  double sum = 0.0, turnover = 0.0;
  for (int i = 0; i < EW_ELEMENT_COUNT; i++) {
    sum += ledger->in[EW_MADE].mass[i];
    turnover += fabs(ledger->in[EW_MADE].mass[i]);
  }
  assert_true(fabs(sum) <= ROUNDING * turnover);
}

/* As grown haloes never lose mass, none ever took in more than the mean share of its final mass. What dark branches
 * lost to evaporation is in no ledger; without evaporation everything is. */
static void check_supply(const ew_evolution *evolution, const ew_ledger *ledger) {
  const ew_tree *tree = evolution->tree;
  const ew_arrival *root = &evolution->arrival[tree->branch_count - 1];
  double baryons = root->galaxy ? ew_galaxy_baryons(root->galaxy) : root->baryons;
  double most = ew_baryon_fraction(evolution->laboratory->cosmology) * tree->mass[tree->node_count - 1];
  assert_true(baryons >= 0.0 && baryons <= most * (1.0 + ROUNDING));
  assert_true(inflow(ledger) <= baryons * (1.0 + ROUNDING));
  if (!evolution->model->reionization.evaporation && root->galaxy)
    assert_true(fabs(inflow(ledger) - baryons) <= ROUNDING * baryons);
  if (evolution->model->reionization.suppression == EW_SUPPRESSION_NONE)
    assert_true(fabs(baryons - most) <= ROUNDING * most);
}

/* ------------------------------------------------------------------------------------------------------------ stars */

static void check_books(const ew_galaxy *galaxy) {
  double events = 0.0, components = 0.0, cohorts = 0.0;
  for (const ew_star_event *e = galaxy->event; e; e = e->next)
    events += e->mass;
  for (const ew_component *c = galaxy->component; c; c = c->next)
    components += c->mass;
  for (size_t i = 0; i < galaxy->cohort_count; i++)
    cohorts += galaxy->cohort[i].mass;
  double within = ROUNDING * galaxy->formed;
  assert_true(fabs(events - galaxy->formed) <= within);
  assert_true(fabs(components - galaxy->formed) <= within);
  assert_true(fabs(cohorts + galaxy->formed_metal_free - galaxy->formed) <= within);
}

static bool is_in(const ew_member *list, const ew_member *wanted) {
  while (list && list != wanted)
    list = list->next;
  return list != NULL;
}

/* Members orbit a member with a galaxy, or the central, and none is overdue; their stars and the central's are all. */
static void check_galaxies(const ew_evolution *evolution) {
  const ew_arrival *root = &evolution->arrival[evolution->tree->branch_count - 1];
  double end = evolution->laboratory->calendar.end;
  if (root->galaxy)
    check_books(root->galaxy);
  else
    assert_null(root->members);
  for (const ew_member *m = root->members; m; m = m->next) {
    assert_true(m->sinks_at > end);
    assert_true(!m->bound_to || (is_in(root->members, m->bound_to) && m->bound_to->galaxy));
    if (m->galaxy)
      check_books(m->galaxy);
  }
}

/* ------------------------------------------------------------------------------------------------------------- rows */

static void check_row_of(const ew_galaxy_row *row, const ew_galaxy *galaxy) {
  double stars = ew_ledger_mass(&galaxy->ledger, EW_LIVING_STARS) + ew_ledger_mass(&galaxy->ledger, EW_REMNANTS);
  assert_int_equal(row->branch, galaxy->branch);
  assert_true(row->observed.stellar_mass_formed == galaxy->formed);
  if (row->observed.luminosity_v > 0.0)
    assert_true(row->observed.stellar_mass == stars);
}

/* The central has a row, and so has every member with stars. */
static void check_all_rows(const ew_evolution *evolution) {
  size_t count, next = 1;
  const ew_galaxy_row *rows = ew_evolution_rows(evolution, &count);
  check_rows(rows, count, evolution->laboratory->calendar.end);
  const ew_arrival *root = &evolution->arrival[evolution->tree->branch_count - 1];
  if (root->galaxy)
    check_row_of(&rows[0], root->galaxy);
  for (const ew_member *m = root->members; m; m = m->next)
    if (m->galaxy && m->galaxy->formed > 0.0) {
      assert_true(next < count);
      check_row_of(&rows[next++], m->galaxy);
    }
  assert_int_equal(next, count);
}

static void check_tree_row(const ew_tree_row *tree, const ew_laboratory *laboratory) {
  assert_true(tree->root_redshift == laboratory->settings.roots.redshift);
  assert_true(tree->formation_redshift >= tree->root_redshift);
  assert_true(tree->smooth_fraction >= 0.0 && tree->smooth_fraction <= 1.0);
  assert_true(tree->branches >= 1 && tree->nodes >= tree->branches);
}

/* ------------------------------------------------------------------------------------------------------------ tests */

typedef struct {
  ew_laboratory *laboratory;
  ew_tree_memory *memory;
  ew_evolution *evolution;
  ew_tree tree;
  ew_draws draws;
} bench;

static void evolve(bench *b, uint64_t number, const ew_model *model) {
  b->draws = (ew_draws){.seed = 2385, .tree = number};
  ew_root root = ew_root_draw(&b->laboratory->settings, &b->draws);
  ew_error error = {0};
  need_success(ew_tree_grow(b->laboratory->builder, &root, &b->draws, b->memory, &b->tree, &error), &error);
  need_success(ew_evolution_load(b->evolution, b->laboratory, &b->tree, &error), &error);
  need_success(ew_evolution_run(b->evolution, model, &b->draws, &error), &error);
}

static void check_everything(const bench *b) {
  ew_ledger ledger = {0};
  ew_evolution_ledger(b->evolution, &ledger);
  check_ledger(&ledger);
  check_made(&ledger);
  check_supply(b->evolution, &ledger);
  check_galaxies(b->evolution);
  check_all_rows(b->evolution);
  check_tree_row(ew_evolution_tree_row(b->evolution), b->laboratory);
}

static void random_models_on_random_trees(void **state) {
  (void)state;
  size_t with_stars = 0;
  for (uint64_t l = 0; l < LABORATORIES; l++) {
    bench b = {.laboratory = random_laboratory(l), .memory = ew_tree_memory_new(), .evolution = ew_evolution_new()};
    assert_true(b.memory && b.evolution);
    for (uint64_t number = l * PER_LABORATORY; number < (l + 1) * PER_LABORATORY; number++) {
      ew_model model = random_model(number);
      evolve(&b, number, &model);
      check_everything(&b);
      size_t count;
      with_stars += ew_evolution_rows(b.evolution, &count)->observed.stellar_mass_formed > 0.0;
    }
    ew_evolution_free(b.evolution);
    ew_tree_memory_free(b.memory);
    ew_laboratory_free(b.laboratory);
  }
  assert_true(with_stars > LABORATORIES * PER_LABORATORY / 3);
}

int main(void) {
  ew_core_start();
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(random_models_on_random_trees),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
