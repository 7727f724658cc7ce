/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * What the benchmarks share: the standard universe, giving up with a message, and the shortest of several runs. */
#ifndef EW_TESTS_BENCHMARKS_BENCH_H
#define EW_TESTS_BENCHMARKS_BENCH_H

#include "planck18.h"

#include <math.h>
#include <stdlib.h>

static inline void need(ew_status status, const ew_error *error) {
  if (status == EW_OK)
    return;
  fprintf(stderr, "%s\n", error->message);
  exit(status);
}

/* Seconds that the fastest of `repeats` runs took: other work on the machine can only add to it. */
static inline double shortest_time(void (*run)(void *context), void *context, int repeats) {
  double shortest = INFINITY;
  for (int i = 0; i < repeats; i++) {
    double start = ew_clock();
    run(context);
    shortest = fmin(shortest, ew_clock() - start);
  }
  return shortest;
}

#endif
