/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * What evolution reads off a tree, against plain searches: who joins whom and when, masses at the ends of slots, and
 * the slot in which a branch wakes. */
#include "ensemble.h"
#include "population/evolution.h"

enum { TREES = EW_TREES(24) };

typedef struct {
  ew_laboratory *laboratory;
  ew_tree_memory *memory;
  ew_evolution *evolution;
  ew_tree tree;
} bench;

static int set_up(void **state) {
  bench *b = calloc(1, sizeof *b);
  assert_non_null(b);
  b->laboratory = LABORATORY("roots.mass_range=[1e8, 1e10]", "trees.resolution_mass=1e6");
  b->memory = ew_tree_memory_new();
  b->evolution = ew_evolution_new();
  *state = b;
  return !b->memory || !b->evolution;
}

static int tear_down(void **state) {
  bench *b = *state;
  ew_evolution_free(b->evolution);
  ew_tree_memory_free(b->memory);
  ew_laboratory_free(b->laboratory);
  free(b);
  return 0;
}

/* Evolves tree `number`: a different patch each, so that thresholds differ. */
static void load(bench *b, uint64_t number) {
  ew_draws draws = {.seed = 2385, .tree = number};
  ew_root root = ew_root_draw(&b->laboratory->settings, &draws);
  ew_error error = {0};
  need_success(ew_tree_grow(b->laboratory->builder, &root, &draws, b->memory, &b->tree, &error), &error);
  need_success(ew_evolution_load(b->evolution, b->laboratory, &b->tree, &error), &error);
  need_success(ew_evolution_run(b->evolution, &b->laboratory->settings.model, &draws, &error), &error);
}

static void joiners_are_all_there_in_order_of_time(void **state) {
  bench *b = *state;
  for (uint64_t number = 0; number < TREES; number++) {
    load(b, number);
    const ew_skeleton *s = &b->evolution->skeleton;
    assert_int_equal(s->first_joiner[0], 0);
    assert_int_equal(s->first_joiner[b->tree.branch_count], b->tree.branch_count - 1);
    for (size_t host = 0; host < b->tree.branch_count; host++)
      for (size_t k = s->first_joiner[host]; k < s->first_joiner[host + 1]; k++) {
        const ew_branch *joiner = &b->tree.branch[s->joiner[k]];
        assert_int_equal(joiner->joins_branch, host);
        if (k > s->first_joiner[host])
          assert_true(b->tree.branch[s->joiner[k - 1]].joins_node < joiner->joins_node);
      }
  }
}

static void slots_hold_their_nodes(void **state) {
  bench *b = *state;
  for (uint64_t number = 0; number < TREES; number++) {
    load(b, number);
    for (size_t i = 0; i < b->tree.node_count; i++) {
      double age = ew_age(b->laboratory->cosmology, b->tree.redshift[i]), step = b->laboratory->calendar.step;
      size_t slot = b->evolution->skeleton.node_slot[i];
      assert_true(slot < b->laboratory->calendar.slot_count);
      assert_true(age >= (double)slot * step * (1.0 - 1e-12));
      assert_true(age <= ew_calendar_end_of(&b->laboratory->calendar, slot) * (1.0 + 1e-12));
    }
    for (size_t i = 0; i < b->tree.branch_count; i++)
      assert_true(b->evolution->skeleton.peak_mass[i] ==
                  b->tree.mass[b->tree.branch[i].first_node + b->tree.branch[i].node_count - 1]);
  }
}

static void the_mass_reader_agrees_with_a_search(void **state) {
  bench *b = *state;
  const ew_calendar *calendar = &b->laboratory->calendar;
  for (uint64_t number = 0; number < TREES; number++) {
    load(b, number);
    for (size_t i = 0; i < b->tree.branch_count; i += 1 + b->tree.branch_count / 50) {
      const ew_branch *branch = &b->tree.branch[i];
      ew_mass_reader reader = ew_mass_reader_at(&b->tree, branch);
      size_t first = b->evolution->skeleton.node_slot[branch->first_node];
      for (size_t slot = first; slot < calendar->slot_count; slot += 1 + slot % 7) {
        double z = calendar->redshift[slot], searched = ew_branch_mass(&b->tree, branch, z);
        assert_true(fabs(ew_mass_read(&reader, z) / searched - 1.0) < 1e-12);
      }
    }
  }
}

/* The first slot at whose end the halo is above the threshold, slot by slot. */
static size_t searched_waking_slot(const bench *b, const ew_branch *branch) {
  const ew_evolution *e = b->evolution;
  size_t end = ew_branch_end_slot(e, branch);
  for (size_t slot = e->skeleton.node_slot[branch->first_node]; slot < end; slot++)
    if (ew_branch_mass(&b->tree, branch, b->laboratory->calendar.redshift[slot]) >= e->patch.threshold_mass[slot])
      return slot;
  return EW_NEVER;
}

static void branches_wake_when_they_exceed_the_threshold(void **state) {
  bench *b = *state;
  size_t awake = 0, dark = 0;
  for (uint64_t number = 0; number < TREES; number++) {
    load(b, number);
    memset(b->evolution->arrival, 0, b->tree.branch_count * sizeof *b->evolution->arrival); /* no galaxies arrive */
    for (size_t i = 0; i < b->tree.branch_count; i++) {
      size_t slot = searched_waking_slot(b, &b->tree.branch[i]);
      assert_int_equal(ew_waking_slot(b->evolution, i), slot);
      awake += slot != EW_NEVER;
      dark += slot == EW_NEVER;
    }
  }
  assert_true(awake > TREES && dark > TREES);
}

int main(void) {
  ew_core_start();
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(joiners_are_all_there_in_order_of_time),
      cmocka_unit_test(slots_hold_their_nodes),
      cmocka_unit_test(the_mass_reader_agrees_with_a_search),
      cmocka_unit_test(branches_wake_when_they_exceed_the_threshold),
  };
  return cmocka_run_group_tests(tests, set_up, tear_down);
}
