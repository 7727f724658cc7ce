/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The merger trees of a parameter file as a tree file. Trees are grown a batch at a time by all threads and appended in
 * order of their numbers; they are the same trees that `run` grows. */
#include "cli/cli.h"

#include "catalogue/distribution.h"

#include <omp.h>
#include <stdlib.h>

enum { BATCH_PER_THREAD = 8 };

/* The place of one tree in a batch. */
typedef struct {
  ew_tree_memory *memory;
  ew_tree tree;
  ew_status status;
  ew_error error;
} seat;

typedef struct {
  const ew_laboratory *laboratory;
  ew_tree_file *file;
  ew_progress progress;
  int threads;
  size_t seat_count;
  seat *seats;
  uint64_t branches, nodes;
  ew_distribution formation; /* redshift */
} nursery;

static const ew_distribution_range formation_range = {0.0, EW_HIGHEST_REDSHIFT};

/* ------------------------------------------------------------------------------------------------------------- grow */

static void grow(const ew_laboratory *laboratory, uint64_t number, seat *at) {
  const ew_draws draws = {.seed = (uint64_t)laboratory->settings.random.seed, .tree = number};
  const ew_root root = ew_root_draw(&laboratory->settings, &draws);
  at->error = (ew_error){0};
  at->status = ew_tree_grow(laboratory->builder, &root, &draws, at->memory, &at->tree, &at->error);
}

static ew_status append(nursery *trees, const seat *from, ew_error *error) {
  if (from->status != EW_OK)
    return ew_fail(error, from->status, "%s", from->error.message);
  const ew_tree *tree = &from->tree;
  trees->branches += tree->branch_count;
  trees->nodes += tree->node_count;
  double formation = ew_formation_redshift(tree, &tree->branch[tree->branch_count - 1], 0.5);
  ew_distribution_add(&trees->formation, formation_range, formation, tree->weight);
  return ew_tree_file_append(trees->file, tree, error);
}

static ew_status grow_batch(nursery *trees, uint64_t first, size_t count, ew_error *error) {
  const ew_laboratory *laboratory = trees->laboratory;
  seat *seats = trees->seats;
#pragma omp parallel for schedule(dynamic, 1) num_threads(trees->threads)
  for (size_t i = 0; i < count; i++)
    grow(laboratory, first + i, &seats[i]);
  ew_status status = EW_OK;
  for (size_t i = 0; i < count && status == EW_OK; i++) {
    status = append(trees, &seats[i], error);
    ew_progress_show(&trees->progress, (size_t)first + i + 1);
  }
  return status;
}

static ew_status grow_all(nursery *trees, ew_error *error) {
  uint64_t total = (uint64_t)trees->laboratory->settings.roots.count;
  ew_status status = EW_OK;
  for (uint64_t first = 0; first < total && status == EW_OK; first += trees->seat_count) {
    uint64_t left = total - first;
    if (*ew_stop_flag())
      return ew_fail(error, EW_FAILED, EW_INTERRUPTED);
    status = grow_batch(trees, first, left < trees->seat_count ? (size_t)left : trees->seat_count, error);
  }
  return status;
}

/* ---------------------------------------------------------------------------------------------------------- nursery */

static void close_nursery(nursery *trees) {
  if (!trees)
    return;
  for (size_t i = 0; trees->seats && i < trees->seat_count; i++)
    ew_tree_memory_free(trees->seats[i].memory);
  free(trees->seats);
  free(trees);
}

static nursery *open_nursery(const ew_laboratory *laboratory, int threads) {
  nursery *trees = calloc(1, sizeof *trees);
  if (!trees)
    return NULL;
  trees->laboratory = laboratory;
  trees->threads = threads > 0 ? threads : omp_get_max_threads();
  trees->seat_count = (size_t)trees->threads * BATCH_PER_THREAD;
  trees->seats = calloc(trees->seat_count, sizeof *trees->seats);
  bool whole = trees->seats != NULL;
  for (size_t i = 0; whole && i < trees->seat_count; i++)
    whole = (trees->seats[i].memory = ew_tree_memory_new()) != NULL;
  if (whole)
    return trees;
  close_nursery(trees);
  return NULL;
}

/* -------------------------------------------------------------------------------------------------------------- act */

static ew_status write_trees(nursery *trees, const ew_request *request, bool progress, ew_error *error) {
  const ew_settings *settings = &request->settings;
  uint64_t total = (uint64_t)settings->roots.count;
  const ew_tree_file_header header = {request->parameter_text, &settings->cosmology, settings->trees.resolution_mass,
                                      (uint64_t)settings->random.seed};
  ew_status status = ew_tree_file_create(&trees->file, request->output, &header, error);
  if (status != EW_OK)
    return status;
  ew_error failure = {0};
  trees->progress = ew_progress_start("trees", (size_t)total, progress);
  status = grow_all(trees, &failure);
  ew_progress_end(&trees->progress);
  if (status == EW_OK)
    status = ew_tree_file_finish(trees->file, &failure);
  if (status != EW_OK)
    status = ew_fail_unfinished(&failure, request->output, ew_tree_file_kept(trees->file), total, error);
  ew_tree_file_close(trees->file);
  return status;
}

static void print_summary(const nursery *trees, const ew_request *request, double seconds) {
  double quantile[3];
  static const double shares[3] = {0.5, 0.16, 0.84};
  for (size_t i = 0; i < 3; i++)
    quantile[i] = ew_distribution_quantile(&trees->formation, shares[i]);
  long long count = request->settings.roots.count;
  printf("trees               %lld\n", count);
  printf("branches            %llu\n", (unsigned long long)trees->branches);
  printf("nodes               %llu\n", (unsigned long long)trees->nodes);
  printf("formation redshift  %.2f (16 to 84 per cent: %.2f to %.2f)\n", quantile[0], quantile[1], quantile[2]);
  printf("wrote %s (%lld trees, %.1f s)\n", request->output, count, seconds);
}

static ew_status grow_and_tell(const ew_request *request, const ew_options *options, ew_error *error) {
  double started = ew_clock();
  ew_laboratory *laboratory;
  ew_status status = ew_laboratory_new(&laboratory, &request->settings, error);
  if (status != EW_OK)
    return status;
  nursery *trees = open_nursery(laboratory, options->threads);
  status = trees ? write_trees(trees, request, !options->quiet, error) : ew_fail_memory(error, "trees");
  if (status == EW_OK && !options->quiet)
    print_summary(trees, request, ew_clock() - started);
  close_nursery(trees);
  ew_laboratory_free(laboratory);
  return status;
}

static ew_status act(const ew_options *options, ew_error *error) {
  ew_request request;
  ew_stop_on_signals();
  ew_status status = ew_request_open(&request, options, ".trees.h5", error);
  if (status == EW_OK)
    status = grow_and_tell(&request, options, error);
  ew_request_close(&request);
  return status;
}

const ew_command ew_command_trees = {
    .name = "trees",
    .meaning = "grows the merger trees of a parameter file and writes them",
    .help = "Grows the merger trees that PARAMS asks for, writes the tree file (HDF5: /trees, /branches, /nodes)\n"
            "and prints their numbers. Without -o the tree file of NAME.cfg is NAME.trees.h5 in the current\n"
            "folder.",
    .options = EW_OPTIONS_OF_A_JOB,
    .takes_file = true,
    .act = act,
};
