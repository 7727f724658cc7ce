/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * What a single-age population is like, as a function of age and metal mass fraction: one table on a uniform grid in
 * log age for each metallicity, so that a look-up costs two logarithms and no search in age. */
#ifndef EW_STARS_AGE_GRID_H
#define EW_STARS_AGE_GRID_H

#include "elfinwood/core.h"
#include "stars/locate.h"

#include <math.h>

enum { EW_AGE_GRID_METALLICITIES = 17 }; /* at most */

typedef struct {
  size_t count;                                 /* metallicities in use */
  double metal_fraction;                        /* the lowest: below it no logarithm is needed */
  double log_metals[EW_AGE_GRID_METALLICITIES]; /* natural logarithm, ascending */
  ew_table by_age[EW_AGE_GRID_METALLICITIES];   /* over the natural logarithm of the age [Gyr] */
} ew_age_grid;

/* Makes `count` tables of `ages` points from `first` to `last` [Gyr] for the metal mass fractions given, ascending. On
 * failure too the grid is to be released with ew_age_grid_clear. */
EW_CHECKED ew_status ew_age_grid_make(ew_age_grid *grid, const double *metal_fraction, size_t count, double first,
                                      double last, size_t ages, ew_error *error);
void ew_age_grid_clear(ew_age_grid *grid);

/* The value at that age [Gyr] and metal mass fraction, linear in both logarithms, clamped to the grid. */
static inline double ew_age_grid_at(const ew_age_grid *grid, double age, double metal_fraction) {
  double log_age = log(age);
  if (!(metal_fraction > grid->metal_fraction))
    return ew_table_at(&grid->by_age[0], log_age);
  ew_place place = ew_locate(grid->log_metals, grid->count, log(metal_fraction));
  return ew_between(ew_table_at(&grid->by_age[place.index], log_age),
                    ew_table_at(&grid->by_age[place.index + 1], log_age), place.weight);
}

#endif
