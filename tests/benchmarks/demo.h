/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The demo ensemble of the benchmarks of galaxies: the defaults over the masses of params/dwarfs.cfg. */
#ifndef EW_TESTS_BENCHMARKS_DEMO_H
#define EW_TESTS_BENCHMARKS_DEMO_H

#include "bench.h"
#include "elfinwood/population.h"

#define DEMO_LOWEST_MASS  1e8 /* Msun */
#define DEMO_HIGHEST_MASS 3e10

static inline ew_laboratory *demo_laboratory(void) {
  ew_settings settings;
  ew_parameter_values values;
  ew_laboratory *laboratory;
  ew_error error = {0};
  need(ew_parameters_open(&values, ew_settings_table(), &settings, &error), &error);
  settings.roots.kind = EW_ROOTS_RANGE;
  settings.roots.mass_range[0] = DEMO_LOWEST_MASS;
  settings.roots.mass_range[1] = DEMO_HIGHEST_MASS;
  settings.trees.resolution_mass = 3e5;
  need(ew_settings_check(&values, &error), &error);
  need(ew_laboratory_new(&laboratory, &settings, &error), &error);
  ew_parameters_close(&values);
  return laboratory;
}

#endif
