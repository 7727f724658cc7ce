/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * How many galaxies a second: trees grown and five realizations evolved on each, rows thrown away. First the whole
 * ensemble of the demo with one thread and with all, then by half-decade of halo mass with one. */
#include "demo.h"

#include <omp.h>

#define LOG_LOW 8.0 /* log10 of Msun: bins of half a decade from here */
#define LOG_BIN 0.5

enum { BINS = 5, REALIZATIONS = 5, REPEATS = 3 };

typedef struct {
  ew_plan plan;
  uint64_t galaxies, luminous, branches;
} bench;

static ew_status count_rows(void *context, const ew_tree_row *tree, const ew_galaxy_row *rows, size_t count,
                            ew_error *error) {
  (void)error;
  bench *b = context;
  b->galaxies += count;
  b->branches += (uint64_t)tree->branches;
  for (size_t i = 0; i < count; i++)
    b->luminous += rows[i].observed.luminosity_v > 0.0;
  return EW_OK;
}

static void make_galaxies(void *context) {
  bench *b = context;
  ew_error error = {0};
  uint64_t done;
  b->galaxies = b->luminous = b->branches = 0;
  need(ew_run(&b->plan, &(ew_row_sink){count_rows, b}, &done, &error), &error);
}

static void report(const ew_laboratory *laboratory, uint64_t trees, int threads) {
  bench b = {.plan = {.laboratory = laboratory,
                      .models = &laboratory->settings.model,
                      .model_count = 1,
                      .tree_count = trees,
                      .threads = threads}};
  double time = shortest_time(make_galaxies, &b, REPEATS), galaxies = (double)b.galaxies;
  const double *range = laboratory->settings.roots.mass_range;
  printf("%7.1e-%7.1e %7d %9.0f %10.2f %14.0f %12.1f %11.2f\n", range[0], range[1], threads, galaxies,
         (double)b.luminous / galaxies, (double)b.branches / (double)trees, galaxies / time, 1e3 * time / galaxies);
}

int main(void) {
  ew_core_start();
  ew_laboratory *laboratory = demo_laboratory();
  laboratory->settings.ensemble.realizations = REALIZATIONS;
  printf("galaxies of the demo, %d on each tree, best of %d runs\n", REALIZATIONS, REPEATS);
  printf("%15s %7s %9s %10s %14s %12s %11s\n", "halo mass/Msun", "threads", "galaxies", "luminous", "branches/tree",
         "galaxies/s", "ms/galaxy");
  report(laboratory, 60, 1);
  report(laboratory, 60, omp_get_max_threads());
  static const uint64_t trees[BINS] = {1000, 500, 150, 40, 20}; /* some seconds each */
  for (int i = 0; i < BINS; i++) {
    double *range = laboratory->settings.roots.mass_range;
    range[0] = pow(10.0, LOG_LOW + i * LOG_BIN);
    range[1] = fmin(range[0] * pow(10.0, LOG_BIN), DEMO_HIGHEST_MASS);
    report(laboratory, trees[i], 1);
  }
  ew_laboratory_free(laboratory);
}
