/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * What the tests of the population room share: laboratories from assignments, rows kept in memory, hand-made trees, and
 * fewer trees when a sanitizer makes everything slow. */
#ifndef EW_TESTS_POPULATION_ENSEMBLE_H
#define EW_TESTS_POPULATION_ENSEMBLE_H

#include "elfinwood/population.h"

#include <math.h>
#include <setjmp.h>
#include <stdarg.h>
#include <stdlib.h>
#include <string.h>

#include <cmocka.h>

#if defined(__SANITIZE_ADDRESS__) || defined(__SANITIZE_THREAD__)
#define EW_SLOWNESS 4
#elif defined(__has_feature)
#if __has_feature(address_sanitizer) || __has_feature(thread_sanitizer)
#define EW_SLOWNESS 4
#endif
#endif
#ifndef EW_SLOWNESS
#define EW_SLOWNESS 1
#endif

/* So many trees, or a quarter of them under a sanitizer, where only faults and not numbers are looked for. */
#define EW_TREES(count) ((count) / EW_SLOWNESS)

static inline void need_success(ew_status status, const ew_error *error) {
  if (status != EW_OK)
    fail_msg("%s", error->message);
}

/* The defaults, changed by assignments "group.key=value" up to a NULL. */
static inline ew_settings settings_with(const char *const *assignments) {
  ew_settings settings;
  ew_parameter_values values;
  ew_error error = {0};
  need_success(ew_parameters_open(&values, ew_settings_table(), &settings, &error), &error);
  for (; *assignments; assignments++)
    need_success(ew_parameters_assign(&values, *assignments, "test", &error), &error);
  need_success(ew_settings_check(&values, &error), &error);
  ew_parameters_close(&values);
  return settings;
}

#define SETTINGS(...) settings_with((const char *const[]){__VA_ARGS__, NULL})

static inline ew_laboratory *laboratory_of(const ew_settings *settings) {
  ew_laboratory *laboratory;
  ew_error error = {0};
  need_success(ew_laboratory_new(&laboratory, settings, &error), &error);
  return laboratory;
}

static inline ew_laboratory *laboratory_with(const char *const *assignments) {
  ew_settings settings = settings_with(assignments);
  return laboratory_of(&settings);
}

#define LABORATORY(...) laboratory_with((const char *const[]){__VA_ARGS__, NULL})

/* ------------------------------------------------------------------------------------------------------------- rows */

/* Everything that a run handed over. */
typedef struct {
  ew_tree_row *trees;
  ew_galaxy_row *rows;
  size_t tree_count, row_count;
} harvest;

static inline ew_status keep_rows(void *context, const ew_tree_row *tree, const ew_galaxy_row *rows, size_t count,
                                  ew_error *error) {
  harvest *h = context;
  ew_tree_row *trees = realloc(h->trees, (h->tree_count + 1) * sizeof *trees);
  h->trees = trees ? trees : h->trees;
  ew_galaxy_row *all = realloc(h->rows, (h->row_count + count + 1) * sizeof *all);
  h->rows = all ? all : h->rows;
  if (!trees || !all)
    return ew_fail_memory(error, "rows of a test");
  h->trees[h->tree_count++] = *tree;
  memcpy(h->rows + h->row_count, rows, count * sizeof *rows);
  h->row_count += count;
  return EW_OK;
}

static inline void free_harvest(harvest *h) {
  free(h->trees);
  free(h->rows);
  *h = (harvest){0};
}

/* A plan for all trees of the settings under their own model. */
static inline ew_plan plan_of(const ew_laboratory *laboratory) {
  return (ew_plan){.laboratory = laboratory,
                   .models = &laboratory->settings.model,
                   .model_count = 1,
                   .tree_count = (uint64_t)laboratory->settings.roots.count};
}

static inline harvest harvest_of(const ew_plan *plan) {
  harvest h = {0};
  uint64_t done;
  ew_error error = {0};
  need_success(ew_run(plan, &(ew_row_sink){keep_rows, &h}, &done, &error), &error);
  assert_int_equal(done, plan->tree_count);
  assert_int_equal(h.tree_count, plan->tree_count);
  return h;
}

/* Rows hold nothing but numbers of eight bytes, so bytes can be compared; NaN equals itself. */
static inline void assert_same_harvest(const harvest *a, const harvest *b) {
  assert_int_equal(a->tree_count, b->tree_count);
  assert_int_equal(a->row_count, b->row_count);
  assert_memory_equal(a->trees, b->trees, a->tree_count * sizeof *a->trees);
  assert_memory_equal(a->rows, b->rows, a->row_count * sizeof *a->rows);
}

static inline int ascending(const void *a, const void *b) {
  double x = *(const double *)a, y = *(const double *)b;
  return (x > y) - (x < y);
}

/* Sorts the values; NaN without any. */
static inline double median(double *values, size_t count) {
  if (count == 0)
    return NAN;
  qsort(values, count, sizeof *values, ascending);
  return 0.5 * (values[(count - 1) / 2] + values[count / 2]);
}

#endif
