/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The driver: threads take trees in order of number, evolve them under every model and realization, and leave the rows
 * in a window from which they go to the sink in order of tree number. No thread takes a tree that lies beyond the
 * window, so memory is bounded whatever the ensemble's size. */
#include "elfinwood/population.h"

#include <math.h>
#include <omp.h>
#include <pthread.h>
#include <stdlib.h>
#include <string.h>

enum { WINDOW_PER_THREAD = 16, WINDOW_ROWS = 1 << 18 }; /* whichever is less, but a tree for each thread */

/* Rows of a finished tree that wait for their turn. */
typedef struct {
  ew_tree_row tree;
  ew_galaxy_row *rows;
  size_t count, capacity;
  bool ready;
} result;

typedef struct {
  const ew_plan *plan;
  const ew_row_sink *sink;
  pthread_mutex_t lock;
  pthread_cond_t moved;
  result *window;
  size_t window_size;
  uint64_t next_taken, next_written; /* counted from 0 */
  bool writing;
  ew_error error; /* the first */
  ew_progress progress;
} crew;

/* One thread's own. */
typedef struct {
  ew_tree_memory *memory;
  ew_evolution *evolution;
} worker;

static bool stopped(const crew *c) {
  return c->error.status != EW_OK || (c->plan->stop && *c->plan->stop);
}

/* The next tree, or false when there is none to be had. */
static bool take_tree(crew *c, uint64_t *index) {
  pthread_mutex_lock(&c->lock);
  while (c->next_taken < c->plan->tree_count && c->next_taken >= c->next_written + c->window_size && !stopped(c))
    pthread_cond_wait(&c->moved, &c->lock);
  bool taken = c->next_taken < c->plan->tree_count && !stopped(c);
  if (taken)
    *index = c->next_taken++;
  pthread_mutex_unlock(&c->lock);
  return taken;
}

static void fail(crew *c, const ew_error *error) {
  pthread_mutex_lock(&c->lock);
  if (c->error.status == EW_OK)
    c->error = *error;
  pthread_cond_broadcast(&c->moved);
  pthread_mutex_unlock(&c->lock);
}

static ew_status append(result *to, const ew_galaxy_row *rows, size_t count, size_t model, size_t realization,
                        ew_error *error) {
  if (to->count + count > to->capacity) {
    size_t capacity = to->capacity + to->capacity / 2 + count;
    ew_galaxy_row *moved = realloc(to->rows, capacity * sizeof *moved);
    if (!moved)
      return ew_fail_memory(error, "rows");
    to->rows = moved;
    to->capacity = capacity;
  }
  memcpy(to->rows + to->count, rows, count * sizeof *rows);
  for (size_t i = 0; i < count; i++) {
    to->rows[to->count + i].model = (int64_t)model;
    to->rows[to->count + i].realization = (int64_t)realization;
  }
  to->count += count;
  return EW_OK;
}

static ew_draws draws_of(const ew_plan *plan, uint64_t tree, uint64_t realization) {
  ew_draws draws = {.seed = (uint64_t)plan->laboratory->settings.random.seed, .tree = tree};
  for (int p = 0; p < EW_PROCESS_COUNT; p++) {
    bool of_tree = p == EW_PROCESS_ROOTS || p == EW_PROCESS_ASSEMBLY;
    draws.realization[p] = plan->realization_offset[p] + (of_tree ? 0 : realization);
  }
  return draws;
}

static ew_status run_realizations(const ew_plan *plan, worker *w, uint64_t tree, result *to, ew_error *error) {
  ew_status status = EW_OK;
  for (size_t model = 0; model < plan->model_count && status == EW_OK; model++)
    for (int64_t r = 0; r < plan->laboratory->settings.ensemble.realizations && status == EW_OK; r++) {
      ew_draws draws = draws_of(plan, tree, (uint64_t)r);
      status = ew_evolution_run(w->evolution, &plan->models[model], &draws, error);
      size_t count;
      const ew_galaxy_row *rows = ew_evolution_rows(w->evolution, &count);
      if (status == EW_OK)
        status = append(to, rows, count, model, (size_t)r, error);
    }
  return status;
}

static ew_status run_tree(const ew_plan *plan, worker *w, uint64_t number, result *to, ew_error *error) {
  ew_draws draws = draws_of(plan, number, 0);
  ew_root root = ew_root_draw(&plan->laboratory->settings, &draws);
  ew_tree tree;
  ew_status status = ew_tree_grow(plan->laboratory->builder, &root, &draws, w->memory, &tree, error);
  if (status == EW_OK)
    status = ew_evolution_load(w->evolution, plan->laboratory, &tree, error);
  to->count = 0;
  if (status == EW_OK)
    status = run_realizations(plan, w, number, to, error);
  if (status == EW_OK)
    to->tree = *ew_evolution_tree_row(w->evolution);
  return status;
}

/* Hands ready trees to the sink, unless another thread is at it. Called and returns with the lock held. */
static void write_ready(crew *c) {
  while (!c->writing && c->error.status == EW_OK) {
    result *next = &c->window[c->next_written % c->window_size];
    if (!next->ready)
      return;
    ew_error error = {0};
    c->writing = true;
    pthread_mutex_unlock(&c->lock);
    ew_status status = c->sink->take(c->sink->context, &next->tree, next->rows, next->count, &error);
    ew_progress_show(&c->progress, (size_t)c->next_written + 1);
    pthread_mutex_lock(&c->lock);
    c->writing = false;
    if (status != EW_OK) {
      (void)ew_fail(&error, status, "the rows of tree %lld could not be handed on", (long long)next->tree.tree);
      c->error = c->error.status == EW_OK ? error : c->error;
    } else {
      next->ready = false;
      c->next_written++;
    }
    pthread_cond_broadcast(&c->moved);
  }
}

static void work(crew *c, worker *w) {
  uint64_t index;
  while (take_tree(c, &index)) {
    result *to = &c->window[index % c->window_size];
    ew_error error = {0};
    if (run_tree(c->plan, w, c->plan->first_tree + index, to, &error) != EW_OK) {
      fail(c, &error);
      return;
    }
    pthread_mutex_lock(&c->lock);
    to->ready = true;
    write_ready(c);
    pthread_mutex_unlock(&c->lock);
  }
}

static void work_in_thread(crew *c) {
  worker w = {ew_tree_memory_new(), ew_evolution_new()};
  if (w.memory && w.evolution) {
    ew_evolution_heed(w.evolution, c->plan->stop);
    work(c, &w);
  } else {
    ew_error error = {0};
    (void)ew_fail_memory(&error, "a thread");
    fail(c, &error);
  }
  ew_tree_memory_free(w.memory);
  ew_evolution_free(w.evolution);
}

static ew_status outcome(const crew *c, ew_error *error) {
  if (c->error.status != EW_OK) {
    if (error && error->status == EW_OK)
      *error = c->error;
    return c->error.status;
  }
  if (c->next_written < c->plan->tree_count)
    return ew_fail(error, EW_FAILED, EW_INTERRUPTED);
  return EW_OK;
}

static size_t window_size(const ew_plan *plan, int threads) {
  double rows_per_tree = (double)plan->model_count * (double)plan->laboratory->settings.ensemble.realizations;
  double size = fmin((double)threads * WINDOW_PER_THREAD, WINDOW_ROWS / rows_per_tree);
  return (size_t)fmax(size, (double)threads);
}

ew_status ew_run(const ew_plan *plan, const ew_row_sink *sink, uint64_t *done, ew_error *error) {
  int threads = plan->threads > 0 ? plan->threads : omp_get_max_threads();
  crew c = {.plan = plan, .sink = sink, .window_size = window_size(plan, threads)};
  *done = 0;
  c.window = calloc(c.window_size, sizeof *c.window);
  if (!c.window)
    return ew_fail_memory(error, "the window of trees");
  pthread_mutex_init(&c.lock, NULL);
  pthread_cond_init(&c.moved, NULL);
  c.progress = ew_progress_start("trees", (size_t)plan->tree_count, plan->progress);
#pragma omp parallel num_threads(threads) default(none) shared(c)
  work_in_thread(&c);
  ew_progress_end(&c.progress);
  *done = c.next_written;
  ew_status status = outcome(&c, error);
  for (size_t i = 0; i < c.window_size; i++)
    free(c.window[i].rows);
  free(c.window);
  pthread_cond_destroy(&c.moved);
  pthread_mutex_destroy(&c.lock);
  return status;
}
