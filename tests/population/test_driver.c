/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The driver: the same rows in the same order for any number of threads and wherever a run starts, and runs that end
 * early end on a whole tree. */
#include "ensemble.h"

#include <signal.h>
#include <sys/resource.h>
#include <unistd.h>

enum { COUNT = 60, SLICE_FIRST = 7, SLICE_COUNT = 20, STOP_AFTER = 10 };

/* Small trees, so that threads overtake each other all the time; members make the number of rows vary. */
static const char *const assignments[] = {"roots.mass_range=[3e7, 3e9]",
                                          "roots.count=60",
                                          "trees.resolution_mass=1e6",
                                          "ensemble.realizations=2",
                                          "output.members=true",
                                          "satellites.friction_factor=5",
                                          NULL};

static int make_laboratory(void **state) {
  ew_laboratory *laboratory = laboratory_with(assignments);
  assert_int_equal(laboratory->settings.roots.count, COUNT);
  *state = laboratory;
  return 0;
}

static int free_laboratory(void **state) {
  ew_laboratory_free(*state);
  return 0;
}

static harvest run_with_threads(const ew_laboratory *laboratory, int threads) {
  ew_plan plan = plan_of(laboratory);
  plan.threads = threads;
  return harvest_of(&plan);
}

/* The number of threads sets the size of the window too. */
static void rows_do_not_depend_on_threads(void **state) {
  harvest one = run_with_threads(*state, 1);
  assert_true(one.row_count > 2 * COUNT);
  static const int threads[] = {2, 5, 0};
  for (size_t i = 0; i < sizeof threads / sizeof *threads; i++) {
    harvest many = run_with_threads(*state, threads[i]);
    assert_same_harvest(&one, &many);
    free_harvest(&many);
  }
  free_harvest(&one);
}

/* Trees ascend; within one model, realization, and the central before its members. */
static void rows_come_in_order(void **state) {
  const ew_laboratory *laboratory = *state;
  ew_model models[3] = {laboratory->settings.model, laboratory->settings.model, laboratory->settings.model};
  ew_plan plan = plan_of(laboratory);
  plan.models = models;
  plan.model_count = 3;
  harvest h = harvest_of(&plan);
  size_t i = 0;
  for (size_t t = 0; t < h.tree_count; t++) {
    assert_int_equal(h.trees[t].tree, t);
    for (int64_t model = 0; model < 3; model++)
      for (int64_t r = 0; r < 2; r++)
        for (int64_t central = 1; i < h.row_count && (central || !h.rows[i].central); i++, central = 0) {
          assert_int_equal(h.rows[i].tree, t);
          assert_int_equal(h.rows[i].model, model);
          assert_int_equal(h.rows[i].realization, r);
          assert_int_equal(h.rows[i].central, central);
        }
  }
  assert_int_equal(i, h.row_count);
  free_harvest(&h);
}

static void identical_models_give_identical_rows(void **state) {
  const ew_laboratory *laboratory = *state;
  ew_model models[2] = {laboratory->settings.model, laboratory->settings.model};
  ew_plan plan = plan_of(laboratory);
  plan.models = models;
  harvest one = harvest_of(&plan);
  plan.model_count = 2;
  harvest two = harvest_of(&plan);
  assert_int_equal(two.row_count, 2 * one.row_count);
  size_t seen[2] = {0, 0};
  for (size_t i = 0; i < two.row_count; i++) {
    ew_galaxy_row row = two.rows[i];
    size_t of_model = seen[row.model]++;
    row.model = 0;
    assert_memory_equal(&row, &one.rows[of_model], sizeof row);
  }
  free_harvest(&one);
  free_harvest(&two);
}

/* A model among others is not touched by them. */
static void models_do_not_know_of_each_other(void **state) {
  const ew_laboratory *laboratory = *state;
  ew_model models[2] = {laboratory->settings.model, laboratory->settings.model};
  models[0].star_formation.depletion_time *= 2.0;
  ew_plan plan = plan_of(laboratory);
  harvest alone = harvest_of(&plan);
  plan.models = models;
  plan.model_count = 2;
  harvest both = harvest_of(&plan);
  size_t same = 0, others = 0;
  double mass = 0.0, other_mass = 0.0;
  for (size_t i = 0; i < both.row_count; i++) {
    ew_galaxy_row row = both.rows[i];
    if (row.model == 0) {
      others++;
      other_mass += row.observed.stellar_mass;
      continue;
    }
    mass += row.observed.stellar_mass;
    row.model = 0;
    assert_memory_equal(&row, &alone.rows[same++], sizeof row);
  }
  assert_int_equal(same, alone.row_count);
  assert_true(others > 0 && mass != other_mass);
  free_harvest(&alone);
  free_harvest(&both);
}

static size_t rows_before(const harvest *h, size_t tree) {
  size_t count = 0;
  while (count < h->row_count && h->rows[count].tree < (int64_t)tree)
    count++;
  return count;
}

static void a_run_may_start_at_any_tree(void **state) {
  ew_plan plan = plan_of(*state);
  harvest all = harvest_of(&plan);
  plan.first_tree = SLICE_FIRST;
  plan.tree_count = SLICE_COUNT;
  harvest slice = harvest_of(&plan);
  size_t begin = rows_before(&all, SLICE_FIRST), end = rows_before(&all, SLICE_FIRST + SLICE_COUNT);
  assert_int_equal(slice.row_count, end - begin);
  assert_memory_equal(slice.rows, all.rows + begin, slice.row_count * sizeof *slice.rows);
  assert_memory_equal(slice.trees, all.trees + SLICE_FIRST, SLICE_COUNT * sizeof *slice.trees);
  free_harvest(&all);
  free_harvest(&slice);
}

static void no_trees_is_a_run_too(void **state) {
  ew_plan plan = plan_of(*state);
  plan.tree_count = 0;
  harvest h = harvest_of(&plan);
  assert_int_equal(h.row_count, 0);
  free_harvest(&h);
}

/* ----------------------------------------------------------------------------------------------------------- replay */

/* One thread's memory, and the tree that it holds. */
typedef struct {
  ew_tree_memory *memory;
  ew_evolution *evolution;
  ew_tree tree;
} workplace;

static workplace make_workplace(void) {
  workplace w = {.memory = ew_tree_memory_new(), .evolution = ew_evolution_new()};
  assert_true(w.memory && w.evolution);
  return w;
}

static void clear_workplace(workplace *w) {
  ew_evolution_free(w->evolution);
  ew_tree_memory_free(w->memory);
}

static void load_tree(workplace *w, const ew_laboratory *laboratory, uint64_t number) {
  ew_draws draws = {.seed = (uint64_t)laboratory->settings.random.seed, .tree = number};
  ew_root root = ew_root_draw(&laboratory->settings, &draws);
  ew_error error = {0};
  need_success(ew_tree_grow(laboratory->builder, &root, &draws, w->memory, &w->tree, &error), &error);
  need_success(ew_evolution_load(w->evolution, laboratory, &w->tree, &error), &error);
}

static const ew_galaxy_row *realize(workplace *w, const ew_laboratory *laboratory, uint64_t realization,
                                    size_t *count) {
  ew_draws draws = {.seed = (uint64_t)laboratory->settings.random.seed, .tree = w->tree.number};
  for (int p = EW_PROCESS_ASSEMBLY + 1; p < EW_PROCESS_COUNT; p++)
    draws.realization[p] = realization;
  ew_error error = {0};
  need_success(ew_evolution_run(w->evolution, &laboratory->settings.model, &draws, &error), &error);
  return ew_evolution_rows(w->evolution, count);
}

/* Any galaxy can be had alone: its tree, its realization, nothing before. */
static void a_tree_replayed_alone_gives_its_rows(void **state) {
  ew_plan plan = plan_of(*state);
  harvest all = harvest_of(&plan);
  for (uint64_t number = 0; number < COUNT; number += 11) {
    workplace w = make_workplace();
    load_tree(&w, *state, number);
    size_t count, i = rows_before(&all, number);
    const ew_galaxy_row *rows = realize(&w, *state, 1, &count);
    assert_memory_equal(ew_evolution_tree_row(w.evolution), &all.trees[number], sizeof *all.trees);
    while (all.rows[i].realization == 0)
      i++;
    assert_memory_equal(rows, all.rows + i, count * sizeof *rows);
    clear_workplace(&w);
  }
  free_harvest(&all);
}

/* Memory that has held other trees, larger and smaller, leaves no trace. */
static void used_memory_gives_the_same_rows_as_fresh(void **state) {
  workplace used = make_workplace();
  for (uint64_t number = 0; number < COUNT; number += 3) {
    workplace fresh = make_workplace();
    load_tree(&used, *state, number);
    load_tree(&fresh, *state, number);
    size_t count, fresh_count;
    const ew_galaxy_row *rows = realize(&used, *state, 0, &count);
    const ew_galaxy_row *fresh_rows = realize(&fresh, *state, 0, &fresh_count);
    assert_int_equal(count, fresh_count);
    assert_memory_equal(rows, fresh_rows, count * sizeof *rows);
    assert_memory_equal(ew_evolution_tree_row(used.evolution), ew_evolution_tree_row(fresh.evolution),
                        sizeof(ew_tree_row));
    clear_workplace(&fresh);
  }
  clear_workplace(&used);
  ew_evolution_free(NULL);
}

/* Kilobytes that the process has held at most. */
static long most_memory(void) {
  struct rusage usage;
  assert_int_equal(getrusage(RUSAGE_SELF, &usage), 0);
  return usage.ru_maxrss;
}

/* Once trees have been evolved, many more realizations on them take no more memory. */
static void memory_does_not_grow_with_realizations(void **state) {
  const long little = 2048;
  workplace w = make_workplace();
  long before = 0;
  for (uint64_t realizations = 2; realizations <= 64 / EW_SLOWNESS; realizations *= 32) {
    before = most_memory();
    for (uint64_t number = 0; number < 10; number++) {
      load_tree(&w, *state, number);
      size_t count;
      for (uint64_t r = 0; r < realizations; r++)
        realize(&w, *state, r, &count);
    }
  }
  if (EW_SLOWNESS == 1)
    assert_true(most_memory() - before < little);
  clear_workplace(&w);
}

/* ------------------------------------------------------------------------------------------------------- early ends */

/* A sink that raises the flag, or fails, once it has taken so many trees. */
typedef struct {
  harvest kept;
  size_t limit;
  volatile sig_atomic_t stop;
  bool fails, silently;
  int calls_after_failure;
} reluctant;

static ew_status take_reluctantly(void *context, const ew_tree_row *tree, const ew_galaxy_row *rows, size_t count,
                                  ew_error *error) {
  reluctant *r = context;
  if (r->fails && r->kept.tree_count == r->limit) {
    r->calls_after_failure++;
    return r->silently ? EW_FAILED : ew_fail(error, EW_REFUSED, "the sink is full");
  }
  ew_status status = keep_rows(&r->kept, tree, rows, count, error);
  if (!r->fails && r->kept.tree_count == r->limit)
    r->stop = 1;
  return status;
}

static void assert_prefix(const harvest *part, const harvest *all) {
  assert_int_equal(part->row_count, rows_before(all, part->tree_count));
  assert_memory_equal(part->rows, all->rows, part->row_count * sizeof *part->rows);
  assert_memory_equal(part->trees, all->trees, part->tree_count * sizeof *part->trees);
}

static void a_stopped_run_leaves_a_whole_prefix(void **state) {
  harvest all = run_with_threads(*state, 1);
  for (int threads = 1; threads <= 3; threads++) {
    reluctant r = {.limit = STOP_AFTER};
    ew_plan plan = plan_of(*state);
    plan.threads = threads;
    plan.stop = &r.stop;
    ew_error error = {0};
    uint64_t done = 0;
    assert_int_equal(ew_run(&plan, &(ew_row_sink){take_reluctantly, &r}, &done, &error), EW_FAILED);
    assert_string_equal(error.message, "interrupted");
    assert_int_equal(done, r.kept.tree_count);
    assert_true(done >= STOP_AFTER && done < COUNT);
    assert_prefix(&r.kept, &all);
    free_harvest(&r.kept);
  }
  free_harvest(&all);
}

static void a_run_stopped_before_it_starts_does_nothing(void **state) {
  reluctant r = {.stop = 1};
  ew_plan plan = plan_of(*state);
  plan.stop = &r.stop;
  ew_error error = {0};
  uint64_t done = 1;
  assert_int_equal(ew_run(&plan, &(ew_row_sink){take_reluctantly, &r}, &done, &error), EW_FAILED);
  assert_int_equal(done, 0);
  assert_int_equal(r.kept.tree_count, 0);
}

static volatile sig_atomic_t alarm_rang;

static void ring(int signal_number) {
  (void)signal_number;
  alarm_rang = 1;
}

/* One tree with realizations for hours: the flag is heeded within the tree, which is dropped. */
static void a_stop_does_not_wait_for_the_tree(void **state) {
  (void)state;
  ew_laboratory *laboratory = LABORATORY("roots.count=1", "roots.mass_range=[1e9, 2e9]", "trees.resolution_mass=1e6",
                                         "ensemble.realizations=1000000");
  ew_plan plan = plan_of(laboratory);
  plan.stop = &alarm_rang;
  ew_error error = {0};
  harvest kept = {0};
  uint64_t done = 1;
  signal(SIGALRM, ring);
  alarm(1);
  assert_int_equal(ew_run(&plan, &(ew_row_sink){keep_rows, &kept}, &done, &error), EW_FAILED);
  assert_string_equal(error.message, EW_INTERRUPTED);
  assert_int_equal(done, 0);
  assert_int_equal(kept.tree_count, 0);
  ew_laboratory_free(laboratory);
}

/* Raised too late to matter: everything was taken. */
static void a_flag_raised_with_the_last_tree_is_no_failure(void **state) {
  reluctant r = {.limit = COUNT};
  ew_plan plan = plan_of(*state);
  plan.stop = &r.stop;
  ew_error error = {0};
  uint64_t done = 0;
  need_success(ew_run(&plan, &(ew_row_sink){take_reluctantly, &r}, &done, &error), &error);
  assert_int_equal(done, COUNT);
  free_harvest(&r.kept);
}

static void a_failing_sink_ends_the_run_with_its_error(void **state) {
  harvest all = run_with_threads(*state, 1);
  for (int threads = 1; threads <= 3; threads++) {
    reluctant r = {.limit = STOP_AFTER, .fails = true};
    ew_plan plan = plan_of(*state);
    plan.threads = threads;
    ew_error error = {0};
    uint64_t done = 0;
    assert_int_equal(ew_run(&plan, &(ew_row_sink){take_reluctantly, &r}, &done, &error), EW_REFUSED);
    assert_string_equal(error.message, "the sink is full");
    assert_int_equal(error.status, EW_REFUSED);
    assert_int_equal(done, STOP_AFTER);
    assert_int_equal(r.calls_after_failure, 1);
    assert_prefix(&r.kept, &all);
    free_harvest(&r.kept);
  }
  free_harvest(&all);
}

static void a_sink_that_fails_without_a_word_ends_the_run_too(void **state) {
  reluctant r = {.limit = STOP_AFTER, .fails = true, .silently = true};
  ew_plan plan = plan_of(*state);
  ew_error error = {0};
  uint64_t done = 0;
  assert_int_equal(ew_run(&plan, &(ew_row_sink){take_reluctantly, &r}, &done, &error), EW_FAILED);
  assert_int_equal(error.status, EW_FAILED);
  assert_true(strlen(error.message) > 0);
  assert_int_equal(r.calls_after_failure, 1);
  free_harvest(&r.kept);
}

/* The builder refuses a root above its tables while other threads wait at the window. */
static void a_tree_that_cannot_be_grown_ends_the_run(void **state) {
  (void)state;
  ew_laboratory *laboratory = LABORATORY("roots.kind=single", "roots.mass=1e8", "roots.count=200");
  laboratory->settings.roots.mass = 1e9;
  for (int threads = 1; threads <= 3; threads++) {
    reluctant r = {.limit = SIZE_MAX};
    ew_plan plan = plan_of(laboratory);
    plan.threads = threads;
    ew_error error = {0};
    uint64_t done = 1;
    assert_int_equal(ew_run(&plan, &(ew_row_sink){take_reluctantly, &r}, &done, &error), EW_REFUSED);
    assert_int_equal(done, 0);
    assert_non_null(strstr(error.message, "1e+09"));
  }
  ew_laboratory_free(laboratory);
}

/* A caller that wants no message gets the status all the same. */
static void an_error_is_not_needed(void **state) {
  reluctant r = {.stop = 1};
  ew_plan plan = plan_of(*state);
  plan.stop = &r.stop;
  uint64_t done;
  assert_int_equal(ew_run(&plan, &(ew_row_sink){take_reluctantly, &r}, &done, NULL), EW_FAILED);
  r = (reluctant){.limit = 0, .fails = true};
  plan.stop = NULL;
  assert_int_equal(ew_run(&plan, &(ew_row_sink){take_reluctantly, &r}, &done, NULL), EW_REFUSED);
}

int main(void) {
  ew_core_start();
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(rows_do_not_depend_on_threads),
      cmocka_unit_test(rows_come_in_order),
      cmocka_unit_test(identical_models_give_identical_rows),
      cmocka_unit_test(models_do_not_know_of_each_other),
      cmocka_unit_test(a_run_may_start_at_any_tree),
      cmocka_unit_test(no_trees_is_a_run_too),
      cmocka_unit_test(a_tree_replayed_alone_gives_its_rows),
      cmocka_unit_test(used_memory_gives_the_same_rows_as_fresh),
      cmocka_unit_test(memory_does_not_grow_with_realizations),
      cmocka_unit_test(a_stopped_run_leaves_a_whole_prefix),
      cmocka_unit_test(a_run_stopped_before_it_starts_does_nothing),
      cmocka_unit_test(a_stop_does_not_wait_for_the_tree),
      cmocka_unit_test(a_flag_raised_with_the_last_tree_is_no_failure),
      cmocka_unit_test(a_failing_sink_ends_the_run_with_its_error),
      cmocka_unit_test(a_sink_that_fails_without_a_word_ends_the_run_too),
      cmocka_unit_test(a_tree_that_cannot_be_grown_ends_the_run),
      cmocka_unit_test(an_error_is_not_needed),
  };
  return cmocka_run_group_tests(tests, make_laboratory, free_laboratory);
}
