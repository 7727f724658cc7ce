/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * How fast trees grow. A segment is one halo between two splits: a tree has as many as branches and splits together. */
#include "bench.h"
#include "elfinwood/tree.h"

typedef struct {
  double mass, resolution; /* Msun */
  uint64_t trees;          /* in one run: about a third of a second */
} benchmark;

static const benchmark benchmarks[] = {
    {1e10, 1e7, 2000},
    {1e10, 1e6, 300},
    {1e10, 3e5, 100},
    {1e12, 1e6, 4},
};
enum { BENCHMARKS = sizeof benchmarks / sizeof *benchmarks, REPEATS = 7 };

typedef struct {
  const benchmark *of;
  const ew_spectrum *spectrum;
  ew_tree_builder *builder;
  ew_tree_memory *memory;
  size_t branches, nodes;
} bench;

static void make_builder(void *context) {
  bench *b = context;
  ew_error error = {0};
  ew_tree_parameters parameters = {.resolution_mass = b->of->resolution,
                                   .highest_redshift = 40.0,
                                   .split_amplitude = 0.57,
                                   .split_mass_slope = 0.38,
                                   .split_peak_slope = -0.01};
  ew_tree_builder_free(b->builder);
  need(ew_tree_builder_new(&b->builder, b->spectrum, &parameters, b->of->mass, &error), &error);
}

static void grow_trees(void *context) {
  bench *b = context;
  ew_error error = {0};
  b->branches = b->nodes = 0;
  for (uint64_t i = 0; i < b->of->trees; i++) {
    ew_root root = {.number = i, .halo_id = -1, .weight = 1.0, .mass = b->of->mass};
    ew_draws draws = {.seed = 1, .tree = i};
    ew_tree tree;
    need(ew_tree_grow(b->builder, &root, &draws, b->memory, &tree, &error), &error);
    b->branches += tree.branch_count;
    b->nodes += tree.node_count;
  }
}

static void report(const benchmark *of, const ew_spectrum *spectrum) {
  bench b = {.of = of, .spectrum = spectrum, .memory = ew_tree_memory_new()};
  if (!b.memory)
    exit(EW_FAILED);
  double tables = shortest_time(make_builder, &b, 2), time = shortest_time(grow_trees, &b, REPEATS);
  double trees = (double)of->trees, branches = (double)b.branches, nodes = (double)b.nodes;
  printf("%7.0e %10.0e %9.2f %13.1f %10.1f %10.1f %11.3f %11.2f %8.1f\n", of->mass, of->resolution, tables,
         branches / trees, nodes / trees, trees / time, 1e3 * time / trees, (2.0 * branches - trees) / time * 1e-6,
         1e9 * time / nodes);
  ew_tree_memory_free(b.memory);
  ew_tree_builder_free(b.builder);
}

int main(void) {
  ew_core_start();
  ew_error error = {0};
  ew_cosmology *cosmology;
  ew_spectrum *spectrum;
  need(ew_cosmology_new(&cosmology, &planck18, &error), &error);
  need(ew_spectrum_new(&spectrum, cosmology, &(ew_spectrum_parameters){0}, &error), &error);
  printf("growing trees, best of %d runs on one core\n", REPEATS);
  printf("%7s %10s %9s %13s %10s %10s %11s %11s %8s\n", "root", "resolution", "tables/s", "branches/tree", "nodes/tree",
         "trees/s", "ms/tree", "Msegments/s", "ns/node");
  for (size_t i = 0; i < BENCHMARKS; i++)
    report(&benchmarks[i], spectrum);
  ew_spectrum_free(spectrum);
  ew_cosmology_free(cosmology);
}
