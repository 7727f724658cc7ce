/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Infall, members and mergers on trees written down by hand, one for each way in which branches can meet. In all of
 * them gas is neither kept out nor boiled off, so that what the haloes took in follows from their masses alone. */
#include "ensemble.h"
#include "galaxy/state.h"
#include "population/evolution.h"

#define COMMON                                                                                                         \
  "reionization.suppression=none", "reionization.evaporation=false", "first_stars.threshold=atomic",                   \
      "output.members=true"
#define ROUNDING 1e-12

/* ------------------------------------------------------------------------------------------------------------ trees */

enum { MOST_BRANCHES = 8, MOST_NODES = 64 };

typedef struct {
  double redshift, mass; /* Msun */
} node;

/* A tree in the making. A branch joins its host at the host's two nodes of the branch's last redshift, or one that is
 * the same to rounding. */
typedef struct {
  ew_branch branch[MOST_BRANCHES];
  double mass[MOST_NODES], redshift[MOST_NODES];
  size_t branches, nodes;
} draft;

enum { NO_HOST = -1 };

static void add_branch(draft *d, int32_t host, const node *nodes, size_t count) {
  ew_branch *branch = &d->branch[d->branches];
  *branch = (ew_branch){.key = ew_branch_key_imported((int64_t)d->branches),
                        .first_node = (uint32_t)d->nodes,
                        .node_count = (uint32_t)count,
                        .joins_branch = host};
  for (size_t i = 0; i < count; i++, d->nodes++) {
    d->redshift[d->nodes] = nodes[i].redshift;
    d->mass[d->nodes] = nodes[i].mass;
  }
  d->branches++;
}

#define ADD_BRANCH(draft, host, ...)                                                                                   \
  add_branch(draft, host, (const node[]){__VA_ARGS__}, sizeof((const node[]){__VA_ARGS__}) / sizeof(node))

static uint32_t meeting_node(const draft *d, const ew_branch *branch) {
  const ew_branch *host = &d->branch[branch->joins_branch];
  double redshift = d->redshift[branch->first_node + branch->node_count - 1];
  for (uint32_t i = host->first_node + 1; i < host->first_node + host->node_count; i++)
    if (d->redshift[i] == d->redshift[i - 1] && fabs(d->redshift[i] - redshift) < 2e-9)
      return i;
  fail_msg("the host has no merger at redshift %g", redshift);
  return 0;
}

static ew_tree tree_of(draft *d, uint64_t number) {
  for (size_t b = 0; b < d->branches; b++)
    if (d->branch[b].joins_branch != NO_HOST)
      d->branch[b].joins_node = meeting_node(d, &d->branch[b]);
  ew_tree tree = {.number = number,
                  .halo_id = -1,
                  .weight = 1.0,
                  .branch_count = d->branches,
                  .node_count = d->nodes,
                  .branch = d->branch,
                  .mass = d->mass,
                  .redshift = d->redshift};
  ew_error error = {0};
  need_success(ew_tree_check(&tree, &error), &error);
  return tree;
}

/* --------------------------------------------------------------------------------------------------------- evolving */

typedef struct {
  ew_laboratory *laboratory;
  ew_evolution *evolution;
  draft draft;
  ew_tree tree;
  ew_draws draws;
  const ew_galaxy_row *rows;
  size_t count;
} stage;

/* What holds on every one of these trees: all gas of all branches is in the root's books, once. */
static void check_books(const stage *s) {
  const ew_arrival *root = &s->evolution->arrival[s->tree.branch_count - 1];
  double share = ew_baryon_fraction(s->laboratory->cosmology), highest = 0.0;
  for (size_t i = 0; i < s->tree.node_count; i++)
    highest = fmax(highest, s->tree.mass[i]);
  assert_non_null(root->galaxy);
  double baryons = ew_galaxy_baryons(root->galaxy);
  assert_true(fabs(baryons / (share * highest) - 1.0) < ROUNDING);
  ew_ledger ledger = {0};
  ew_evolution_ledger(s->evolution, &ledger);
  assert_true(ew_ledger_imbalance(&ledger) < ROUNDING);
  assert_true(fabs(ew_ledger_mass(&ledger, EW_OUTSIDE) / baryons + 1.0) < ROUNDING);
}

static void run_draft(stage *s, uint64_t number, const ew_model *model) {
  s->tree = tree_of(&s->draft, number);
  s->draws = (ew_draws){.seed = 2385, .tree = number};
  ew_error error = {0};
  need_success(ew_evolution_load(s->evolution, s->laboratory, &s->tree, &error), &error);
  need_success(ew_evolution_run(s->evolution, model, &s->draws, &error), &error);
  s->rows = ew_evolution_rows(s->evolution, &s->count);
}

/* Evolves the draft; `friction` is the factor on the time that friction takes. */
static void evolve(stage *s, uint64_t number, double friction) {
  ew_model model = s->laboratory->settings.model;
  model.satellites.friction_factor = friction;
  run_draft(s, number, &model);
  check_books(s);
}

static const ew_member *member_of_branch(const stage *s, size_t branch) {
  const ew_member *m = s->evolution->arrival[s->tree.branch_count - 1].members;
  while (m && m->branch != &s->tree.branch[branch])
    m = m->next;
  return m;
}

static const ew_observables *row_of_branch(const stage *s, size_t branch) {
  for (size_t i = 0; i < s->count; i++)
    if (s->rows[i].branch == s->tree.branch[branch].key)
      return &s->rows[i].observed;
  return NULL;
}

static int set_stage_at(void **state, const char *root_redshift) {
  stage *s = calloc(1, sizeof *s);
  assert_non_null(s);
  s->laboratory = LABORATORY(COMMON, root_redshift);
  s->evolution = ew_evolution_new();
  *state = s;
  return !s->evolution;
}

static int set_stage(void **state) {
  return set_stage_at(state, "roots.redshift=0");
}

static int set_early_stage(void **state) {
  return set_stage_at(state, "roots.redshift=2");
}

static int clear_stage(void **state) {
  stage *s = *state;
  ew_evolution_free(s->evolution);
  ew_laboratory_free(s->laboratory);
  free(s);
  return 0;
}

/* Redshift of that share of a slot. */
static double within_slot(const stage *s, size_t slot, double share) {
  return ew_redshift_at(s->laboratory->cosmology, ((double)slot + share) * s->laboratory->calendar.step);
}

static size_t slot_at(const stage *s, double redshift) {
  return ew_calendar_slot(&s->laboratory->calendar, ew_age(s->laboratory->cosmology, redshift));
}

/* ----------------------------------------------------------------------------------------------- a satellite's life */

enum { SATELLITE, HOST };

static void draft_pair(stage *s) {
  ADD_BRANCH(&s->draft, HOST, {15, 1e7}, {8, 3e8}, {1, 8e8});
  ADD_BRANCH(&s->draft, NO_HOST, {20, 1e7}, {8, 1e9}, {1, 7.2e9}, {1, 8e9}, {0, 1e10});
}

static void infall_is_not_a_merger(void **state) {
  stage *s = *state;
  draft_pair(s);
  evolve(s, 1, 10.0);
  assert_int_equal(s->count, 2);
  assert_int_equal(s->rows[0].central, 1);
  assert_int_equal(s->rows[1].central, 0);
  assert_int_equal(s->rows[1].branch, s->tree.branch[SATELLITE].key);
  assert_true(s->rows[1].halo_mass == 8e8 && s->rows[0].halo_mass == 1e10);
  const ew_observables *central = &s->rows[0].observed, *satellite = &s->rows[1].observed;
  assert_true(central->stellar_mass > 0.0 && satellite->stellar_mass > 0.0);
  assert_int_equal(central->luminous_mergers, 0);
  assert_int_equal(central->dark_mergers, 0);
  assert_true(isnan(central->last_merger_redshift));
}

static void without_friction_time_it_merges_at_infall(void **state) {
  stage *s = *state;
  draft_pair(s);
  evolve(s, 1, 0.0);
  assert_int_equal(s->count, 1);
  const ew_observables *central = &s->rows[0].observed;
  assert_int_equal(central->luminous_mergers, 1);
  size_t slot = slot_at(s, 1.0);
  assert_true(central->last_merger_redshift == s->laboratory->calendar.redshift[slot]);
}

/* The sinking time follows from a run in which it was ten times as long. Half a Gyr less or more than until the end
 * decides. */
static void a_satellite_keeps_its_stars_until_it_has_sunk(void **state) {
  stage *s = *state;
  draft_pair(s);
  evolve(s, 1, 10.0);
  double infall = (double)slot_at(s, 1.0) * s->laboratory->calendar.step, end = s->laboratory->calendar.end;
  double time = (member_of_branch(s, SATELLITE)->sinks_at - infall) / 10.0;
  assert_true(time > 0.0);
  evolve(s, 1, (end - infall + 0.5) / time);
  assert_int_equal(s->count, 2);
  double apart = s->rows[0].observed.stellar_mass_formed;
  double together = apart + s->rows[1].observed.stellar_mass_formed;
  evolve(s, 1, (end - infall - 0.5) / time);
  assert_int_equal(s->count, 1);
  assert_int_equal(s->rows[0].observed.luminous_mergers, 1);
  /* In the last half Gyr the central forms few stars, other ones than it would have. */
  assert_true(s->rows[0].observed.stellar_mass_formed > apart);
  assert_true(fabs(s->rows[0].observed.stellar_mass_formed / together - 1.0) < 0.05);
}

/* A satellite gets nothing from outside, and its halo's gas is its host's from infall on. */
static void a_satellite_has_no_halo_gas(void **state) {
  stage *s = *state;
  draft_pair(s);
  evolve(s, 1, 10.0);
  const ew_ledger *ledger = ew_galaxy_ledger(member_of_branch(s, SATELLITE)->galaxy);
  assert_true(ew_ledger_mass(ledger, EW_HALO_GAS) < 1e-6 * ew_ledger_mass(ledger, EW_LIVING_STARS));
}

static void a_more_massive_satellite_counts_as_an_equal(void **state) {
  stage *s = *state;
  ADD_BRANCH(&s->draft, HOST, {20, 1e7}, {8, 2e9}, {0.3, 6e9});
  ADD_BRANCH(&s->draft, NO_HOST, {15, 1e7}, {8, 8e8}, {0.3, 2e9}, {0.3, 8e9}, {0, 1e10});
  evolve(s, 1, 10.0);
  assert_int_equal(s->count, 2);
  assert_true(member_of_branch(s, SATELLITE)->mass_ratio < 1.0);
  evolve(s, 1, 0.0);
  assert_int_equal(s->count, 1);
  assert_int_equal(s->rows[0].observed.luminous_mergers, 1);
}

/* ------------------------------------------------------------------------------------------------------ dark haloes */

/* Too small to cool gas by atoms, yet more than a twentieth of its host. */
static void draft_dark_pair(stage *s, double dark_mass) {
  ADD_BRANCH(&s->draft, HOST, {6, 1e7}, {1, dark_mass});
  ADD_BRANCH(&s->draft, NO_HOST, {20, 1e7}, {8, 5e8}, {1, 1e9}, {1, 1e9 + dark_mass}, {0, 2e9});
}

static void a_dark_halo_merges_and_is_counted(void **state) {
  stage *s = *state;
  draft_dark_pair(s, 1e8);
  evolve(s, 1, 10.0);
  assert_int_equal(s->count, 1);
  assert_non_null(member_of_branch(s, SATELLITE));
  assert_null(member_of_branch(s, SATELLITE)->galaxy);
  assert_int_equal(s->rows[0].observed.dark_mergers, 0);
  evolve(s, 1, 0.0);
  assert_null(member_of_branch(s, SATELLITE));
  assert_int_equal(s->rows[0].observed.dark_mergers, 1);
  assert_int_equal(s->rows[0].observed.luminous_mergers, 0);
  assert_true(s->rows[0].observed.last_merger_redshift == s->laboratory->calendar.redshift[slot_at(s, 1.0)]);
}

static void a_small_dark_halo_merges_and_is_not_counted(void **state) {
  stage *s = *state;
  draft_dark_pair(s, 4e7);
  evolve(s, 1, 10.0);
  assert_non_null(member_of_branch(s, SATELLITE));
  evolve(s, 1, 0.0);
  assert_int_equal(s->rows[0].observed.dark_mergers, 0);
  assert_true(isnan(s->rows[0].observed.last_merger_redshift));
}

static void a_tiny_dark_halo_only_brings_its_gas(void **state) {
  stage *s = *state;
  draft_dark_pair(s, 1.2e7);
  evolve(s, 1, 10.0);
  assert_null(member_of_branch(s, SATELLITE));
}

/* It falls in with the very growth that lets the host cool its first gas, and arrives when the host has stars. */
static void a_dark_halo_older_than_the_stars_is_counted(void **state) {
  stage *s = *state;
  ADD_BRANCH(&s->draft, HOST, {21, 1e6}, {20, 5e6});
  ADD_BRANCH(&s->draft, NO_HOST, {20.3, 2e5}, {20, 2.5e7}, {20, 3e7}, {8, 5e8}, {0, 2e9});
  ew_model model = s->laboratory->settings.model;
  model.first_stars.threshold = EW_FIRST_STARS_ATOMIC;
  model.satellites.friction_factor = 0.3;
  run_draft(s, 1, &model);
  check_books(s);
  assert_true(s->rows[0].observed.stellar_mass_formed > 0.0);
  assert_int_equal(s->rows[0].observed.dark_mergers, 1);
}

/* ----------------------------------------------------------------------------------------------- members of members */

enum { INNER, OUTER, ROOT };

static void draft_nest(stage *s, double inner_redshift, double outer_redshift) {
  ADD_BRANCH(&s->draft, OUTER, {15, 1e7}, {8, 2e8}, {inner_redshift, 3e8});
  ADD_BRANCH(&s->draft, ROOT, {20, 1e7}, {8, 8e8}, {inner_redshift, 2.4e9}, {inner_redshift, 2.7e9},
             {outer_redshift, 4e9});
  ADD_BRANCH(&s->draft, NO_HOST, {20, 1e7}, {8, 2e9}, {outer_redshift, 5e9}, {outer_redshift, 9e9}, {0, 1e10});
}

static void members_come_along(void **state) {
  stage *s = *state;
  draft_nest(s, 2.0, 0.8);
  evolve(s, 1, 10.0);
  assert_int_equal(s->count, 3);
  const ew_member *inner = member_of_branch(s, INNER), *outer = member_of_branch(s, OUTER);
  assert_ptr_equal(inner->bound_to, outer);
  assert_null(outer->bound_to);
  evolve(s, 1, 0.0);
  assert_int_equal(s->count, 1);
  assert_int_equal(s->rows[0].observed.luminous_mergers, 1);
}

/* The outer one, nearly as massive as its host, sinks soon; the inner one then orbits the central on a new orbit. */
static void members_are_handed_on_when_theirs_merges(void **state) {
  stage *s = *state;
  draft_nest(s, 2.0, 0.8);
  uint64_t handed_on = 0;
  for (uint64_t number = 0; number < 20; number++) {
    evolve(s, number, 2.0);
    const ew_member *inner = member_of_branch(s, INNER);
    if (member_of_branch(s, OUTER) || !inner)
      continue;
    handed_on++;
    assert_null(inner->bound_to);
    assert_int_equal(inner->infalls, 2);
    assert_true(inner->mass_ratio < 0.05); /* 3e8 to the central's 9e9, not to the 2.7e9 of what it came with */
    assert_int_equal(s->count, 2);
    assert_non_null(row_of_branch(s, INNER));
  }
  assert_true(handed_on > 0);
}

/* The inner one merges with the outer one while that is a member itself. */
static void a_member_merges_with_a_member(void **state) {
  stage *s = *state;
  draft_nest(s, 1.0, 0.95);
  s->draft.mass[s->draft.branch[INNER].first_node + 2] = 2.3e9; /* sinks soon */
  s->draft.mass[s->draft.branch[OUTER].first_node + 3] = 2.4e9 + 2.3e9;
  s->draft.mass[s->draft.branch[OUTER].first_node + 4] = 4.8e9;
  s->draft.mass[s->draft.branch[ROOT].first_node + 2] = 5e10;
  s->draft.mass[s->draft.branch[ROOT].first_node + 3] = 5.48e10;
  s->draft.mass[s->draft.branch[ROOT].first_node + 4] = 6e10;
  uint64_t merged = 0;
  for (uint64_t number = 0; number < 20; number++) {
    evolve(s, number, 1.0);
    const ew_observables *outer = row_of_branch(s, OUTER);
    if (!outer || row_of_branch(s, INNER))
      continue;
    merged++;
    assert_int_equal(outer->luminous_mergers, 1);
    assert_int_equal(s->rows[0].observed.luminous_mergers, 0);
  }
  assert_true(merged > 0);
}

/* ----------------------------------------------------------------------------------------------------- late joiners */

/* A branch joins its host in the very slot in which the host falls in. */
static void a_late_joiner_comes_along(void **state) {
  stage *s = *state;
  size_t slot = slot_at(s, 1.0);
  draft_nest(s, within_slot(s, slot, 0.3), within_slot(s, slot, 0.7));
  evolve(s, 1, 10.0);
  assert_int_equal(s->count, 3);
  assert_ptr_equal(member_of_branch(s, INNER)->bound_to, member_of_branch(s, OUTER));
  evolve(s, 1, 0.0);
  assert_int_equal(s->count, 1);
}

/* The same into a host that never held gas cool enough for stars: it falls in for its member's sake. */
static void a_late_joiner_of_a_dark_host_comes_along(void **state) {
  stage *s = *state;
  size_t slot = slot_at(s, 1.0);
  double joins = within_slot(s, slot, 0.3), falls = within_slot(s, slot, 0.7);
  ADD_BRANCH(&s->draft, OUTER, {20, 1e7}, {10, 1e8}, {joins, 1.1e8});
  ADD_BRANCH(&s->draft, ROOT, {4, 1e7}, {joins, 1.2e8}, {joins, 2.3e8}, {falls, 2.3e8});
  ADD_BRANCH(&s->draft, NO_HOST, {20, 1e7}, {8, 2e9}, {falls, 5e9}, {falls, 5.23e9}, {0, 1e10});
  evolve(s, 1, 10.0);
  assert_int_equal(s->count, 2);
  assert_non_null(row_of_branch(s, INNER));
  assert_ptr_equal(member_of_branch(s, INNER)->bound_to, member_of_branch(s, OUTER));
  assert_false(ew_galaxy_has_stars(member_of_branch(s, OUTER)->galaxy));
  evolve(s, 1, 0.0);
  assert_int_equal(s->count, 1);
}

/* Three levels meet in one slot. */
static void a_chain_within_one_slot_comes_along(void **state) {
  stage *s = *state;
  size_t slot = slot_at(s, 1.0);
  double first = within_slot(s, slot, 0.2), second = within_slot(s, slot, 0.5), third = within_slot(s, slot, 0.8);
  ADD_BRANCH(&s->draft, 1, {15, 1e7}, {8, 3e8}, {first, 4e8});
  ADD_BRANCH(&s->draft, 2, {15, 1e7}, {8, 5e8}, {first, 8e8}, {first, 1.2e9}, {second, 1.2e9});
  ADD_BRANCH(&s->draft, 3, {15, 1e7}, {8, 8e8}, {second, 1.8e9}, {second, 3e9}, {third, 3e9});
  ADD_BRANCH(&s->draft, NO_HOST, {20, 1e7}, {8, 2e9}, {third, 5e9}, {third, 8e9}, {0, 1e10});
  evolve(s, 1, 10.0);
  assert_int_equal(s->count, 4);
  assert_ptr_equal(member_of_branch(s, 0)->bound_to, member_of_branch(s, 1));
  assert_ptr_equal(member_of_branch(s, 1)->bound_to, member_of_branch(s, 2));
  assert_null(member_of_branch(s, 2)->bound_to);
  evolve(s, 1, 0.0);
  assert_int_equal(s->count, 1);
}

/* --------------------------------------------------------------------------------------------------- short branches */

static void a_branch_of_one_node_brings_its_gas(void **state) {
  stage *s = *state;
  ADD_BRANCH(&s->draft, HOST, {2, 3e8});
  ADD_BRANCH(&s->draft, NO_HOST, {20, 1e7}, {8, 1e9}, {2, 2e9}, {2, 2.3e9}, {0, 3e9});
  evolve(s, 1, 10.0);
  assert_int_equal(s->count, 1);
  assert_non_null(member_of_branch(s, SATELLITE));
}

/* It comes and goes within one slot, so it never forms stars of its own. */
static void a_branch_within_one_slot_brings_its_gas(void **state) {
  stage *s = *state;
  size_t slot = slot_at(s, 2.0);
  double joins = within_slot(s, slot, 0.9);
  ADD_BRANCH(&s->draft, HOST, {within_slot(s, slot, 0.2), 1e9}, {joins, 1.1e9});
  ADD_BRANCH(&s->draft, NO_HOST, {20, 1e7}, {8, 1e9}, {joins, 2e9}, {joins, 3.1e9}, {0, 4e9});
  evolve(s, 1, 10.0);
  assert_int_equal(s->count, 1);
}

/* The host begins in the slot in which it is joined. */
static void a_host_joined_in_its_first_slot_takes_it_in(void **state) {
  stage *s = *state;
  size_t slot = slot_at(s, 0.3);
  double joins = within_slot(s, slot, 0.6);
  ADD_BRANCH(&s->draft, HOST, {15, 1e7}, {8, 3e8}, {joins, 4e8});
  ADD_BRANCH(&s->draft, NO_HOST, {within_slot(s, slot, 0.3), 1e9}, {joins, 1e9}, {joins, 1.4e9}, {0, 4e9});
  evolve(s, 1, 10.0);
  assert_int_equal(s->count, 2);
}

static void a_root_of_one_node_is_a_galaxy_of_its_last_slot(void **state) {
  stage *s = *state;
  ADD_BRANCH(&s->draft, NO_HOST, {0, 1e10});
  evolve(s, 1, 1.0);
  assert_int_equal(s->count, 1);
  assert_true(s->rows[0].formation_redshift == 0.0);
}

/* -------------------------------------------------------------------------------------------------------- last slot */

static void check_last_slot(stage *s, double redshift) {
  s->draft = (draft){.branches = 0};
  ADD_BRANCH(&s->draft, HOST, {15, 1e7}, {8, 8e8}, {redshift, 2e9});
  ADD_BRANCH(&s->draft, NO_HOST, {20, 1e7}, {8, 2e9}, {redshift, 7e9}, {redshift, 9e9}, {0, 9e9});
  evolve(s, 1, 10.0);
  assert_int_equal(s->count, 2);
  assert_true(s->rows[1].observed.stellar_mass > 0.0);
  evolve(s, 1, 0.0);
  assert_int_equal(s->count, 1);
  assert_int_equal(s->rows[0].observed.luminous_mergers, 1);
}

static void a_merger_may_come_at_the_very_end(void **state) {
  stage *s = *state;
  check_last_slot(s, within_slot(s, s->laboratory->calendar.slot_count - 1, 0.1));
  check_last_slot(s, 0.0);
}

static void a_root_may_stand_at_any_redshift(void **state) {
  stage *s = *state;
  ADD_BRANCH(&s->draft, HOST, {15, 1e7}, {8, 8e8}, {4, 2e9});
  ADD_BRANCH(&s->draft, NO_HOST, {20, 1e7}, {8, 2e9}, {4, 5e9}, {4, 7e9}, {2, 1e10});
  evolve(s, 1, 10.0);
  assert_int_equal(s->count, 2);
  assert_true(ew_evolution_tree_row(s->evolution)->root_redshift == 2.0);
  assert_true(s->rows[0].observed.time_90 < ew_age(s->laboratory->cosmology, 2.0));
  assert_true(s->rows[0].observed.luminosity_v > 0.0);
  evolve(s, 1, 0.0);
  assert_int_equal(s->count, 1);
}

/* ----------------------------------------------------------------------------------------------- what imports bring */

/* Haloes that lose mass keep what they took in; the peak is kept beside the last mass. */
static void a_halo_may_lose_mass(void **state) {
  stage *s = *state;
  ADD_BRANCH(&s->draft, NO_HOST, {20, 1e7}, {8, 2e9}, {2, 6e9}, {1.9, 6e9}, {0, 4e9});
  evolve(s, 1, 1.0);
  assert_true(s->rows[0].halo_mass == 4e9);
  assert_true(s->rows[0].peak_halo_mass == 6e9);
}

/* The order of branches is the file's own, whatever the times at which they join. */
static void the_order_of_branches_does_not_matter(void **state) {
  stage *s = *state;
  static const node early[] = {{15, 1e7}, {8, 3e8}, {3, 5e8}}, late[] = {{15, 1e7}, {8, 3e8}, {1, 8e8}};
  static const node host[] = {{20, 1e7}, {8, 1e9}, {3, 2e9}, {3, 2.5e9}, {1, 4e9}, {1, 4.8e9}, {0, 6e9}};
  ew_galaxy_row kept = {0};
  for (int swapped = 0; swapped < 2; swapped++) {
    s->draft = (draft){.branches = 0};
    add_branch(&s->draft, 2, swapped ? late : early, 3);
    add_branch(&s->draft, 2, swapped ? early : late, 3);
    add_branch(&s->draft, NO_HOST, host, 7);
    s->draft.branch[swapped].key = 11;
    s->draft.branch[1 - swapped].key = 22;
    evolve(s, 1, 1.0);
    if (swapped)
      assert_memory_equal(&kept, &s->rows[0], sizeof kept);
    kept = s->rows[0];
  }
}

/* What the root took in when the satellite falls in that much later in redshift than the merger of its host, about the
 * edge of a slot. The host, dark so far, wakes with the merger; as supply is suppressed, it cannot make up for gas that
 * went missing. */
static double baryons_of_merger_at_an_edge(stage *s, double satellite_later_by) {
  size_t slot = slot_at(s, 1.0);
  double edge = within_slot(s, slot, 0.0), mass = s->laboratory->calendar.atomic_mass[slot];
  s->draft = (draft){.branches = 0};
  ADD_BRANCH(&s->draft, HOST, {12, 2e7}, {1.1, 2e7}, {edge - 0.5 * satellite_later_by, 0.6 * mass});
  ADD_BRANCH(&s->draft, NO_HOST, {12, 2e7}, {1.1, 2e7}, {edge + 0.5 * satellite_later_by, 0.7 * mass},
             {edge + 0.5 * satellite_later_by, 1.3 * mass}, {0, 1.3 * mass});
  ew_model model = s->laboratory->settings.model;
  model.reionization.suppression = EW_SUPPRESSION_CHARACTERISTIC_MASS;
  run_draft(s, 1, &model);
  return ew_galaxy_baryons(s->evolution->arrival[HOST].galaxy);
}

/* Files may give the two sides of a merger redshifts that differ by rounding. */
static void rounding_at_a_slots_edge_loses_nothing(void **state) {
  double same = baryons_of_merger_at_an_edge(*state, 0.0), rounding = 1.5e-9;
  assert_true(fabs(baryons_of_merger_at_an_edge(*state, rounding) / same - 1.0) < 1e-6);
  assert_true(fabs(baryons_of_merger_at_an_edge(*state, -rounding) / same - 1.0) < 1e-6);
}

#define ON_STAGE(test) cmocka_unit_test_setup_teardown(test, set_stage, clear_stage)

int main(void) {
  ew_core_start();
  const struct CMUnitTest tests[] = {
      ON_STAGE(infall_is_not_a_merger),
      ON_STAGE(without_friction_time_it_merges_at_infall),
      ON_STAGE(a_satellite_keeps_its_stars_until_it_has_sunk),
      ON_STAGE(a_satellite_has_no_halo_gas),
      ON_STAGE(a_more_massive_satellite_counts_as_an_equal),
      ON_STAGE(a_dark_halo_merges_and_is_counted),
      ON_STAGE(a_small_dark_halo_merges_and_is_not_counted),
      ON_STAGE(a_tiny_dark_halo_only_brings_its_gas),
      ON_STAGE(a_dark_halo_older_than_the_stars_is_counted),
      ON_STAGE(members_come_along),
      ON_STAGE(members_are_handed_on_when_theirs_merges),
      ON_STAGE(a_member_merges_with_a_member),
      ON_STAGE(a_late_joiner_comes_along),
      ON_STAGE(a_late_joiner_of_a_dark_host_comes_along),
      ON_STAGE(a_chain_within_one_slot_comes_along),
      ON_STAGE(a_branch_of_one_node_brings_its_gas),
      ON_STAGE(a_branch_within_one_slot_brings_its_gas),
      ON_STAGE(a_host_joined_in_its_first_slot_takes_it_in),
      ON_STAGE(a_root_of_one_node_is_a_galaxy_of_its_last_slot),
      ON_STAGE(a_merger_may_come_at_the_very_end),
      cmocka_unit_test_setup_teardown(a_root_may_stand_at_any_redshift, set_early_stage, clear_stage),
      ON_STAGE(a_halo_may_lose_mass),
      ON_STAGE(the_order_of_branches_does_not_matter),
      ON_STAGE(rounding_at_a_slots_edge_loses_nothing),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
