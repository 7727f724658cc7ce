/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * What every row must be, whatever the model: numbers where they have a meaning, within what is possible at all. */
#ifndef EW_TESTS_POPULATION_SANE_ROWS_H
#define EW_TESTS_POPULATION_SANE_ROWS_H

#include "ensemble.h"

#define SANE_ROUNDING 1e-10 /* of a mass */

/* The values most often at fault are shown. */
#define CHECK_ROW(condition)                                                                                           \
  do {                                                                                                                 \
    if (!(condition))                                                                                                  \
      fail_msg("tree %lld, branch %llx (formed %g Msun, shines %g Lsun, [Fe/H] %g): not so: %s", (long long)row->tree, \
               (unsigned long long)row->branch, row->observed.stellar_mass_formed, row->observed.luminosity_v,         \
               row->observed.metallicity, #condition);                                                                 \
  } while (0)

static inline bool is_share(double x) {
  return x >= 0.0 && x <= 1.0;
}

static inline void check_halo_columns(const ew_galaxy_row *row) {
  CHECK_ROW(row->halo_mass > 0.0 && row->peak_halo_mass >= row->halo_mass && isfinite(row->peak_halo_mass));
  CHECK_ROW(row->formation_redshift >= 0.0 && row->formation_redshift <= EW_HIGHEST_REDSHIFT);
  CHECK_ROW(row->reionization_redshift >= 5.0 && row->reionization_redshift <= 20.0);
  CHECK_ROW(row->streaming_velocity >= 0.0 && isfinite(row->streaming_velocity));
  CHECK_ROW(row->central == 0 || row->central == 1);
  CHECK_ROW(row->weight == 1.0);
}

/* Columns that have a meaning only for stars, and NaN otherwise. */
static inline void check_history(const ew_galaxy_row *row, double end) {
  const ew_observables *o = &row->observed;
  bool formed = o->stellar_mass_formed > 0.0;
  CHECK_ROW(formed ? is_share(o->first_star_fraction) : isnan(o->first_star_fraction));
  CHECK_ROW(formed ? o->time_50 > 0.0 && o->time_50 <= o->time_90 : isnan(o->time_50));
  CHECK_ROW(formed ? o->time_90 <= end : isnan(o->time_90));
  CHECK_ROW(formed ? o->quenched == 0 || o->quenched == 1 : o->quenched == -1);
  CHECK_ROW(o->luminous_mergers >= 0 && o->dark_mergers >= 0);
  bool merged = o->luminous_mergers + o->dark_mergers > 0;
  CHECK_ROW(merged ? o->last_merger_redshift >= 0.0 && o->last_merger_redshift < EW_HIGHEST_REDSHIFT
                   : isnan(o->last_merger_redshift));
  CHECK_ROW(formed || !merged);
}

static inline void check_masses(const ew_galaxy_row *row) {
  const ew_observables *o = &row->observed;
  CHECK_ROW(o->stellar_mass >= 0.0 && o->stellar_mass <= o->stellar_mass_formed * (1.0 + SANE_ROUNDING));
  CHECK_ROW(isfinite(o->stellar_mass_formed));
  CHECK_ROW(o->gas_mass >= 0.0 && isfinite(o->gas_mass));
}

static inline void check_light(const ew_galaxy_row *row) {
  const ew_observables *o = &row->observed;
  bool shines = o->luminosity_v > 0.0;
  CHECK_ROW(o->luminosity_v >= 0.0 && isfinite(o->luminosity_v));
  CHECK_ROW(shines == (o->stellar_mass > 0.0));
  CHECK_ROW(shines ? isfinite(o->magnitude_v) : isnan(o->magnitude_v));
  CHECK_ROW(shines ? o->half_light_radius > 0.0 && o->half_light_radius < 1e6 : isnan(o->half_light_radius));
  CHECK_ROW(shines ? o->velocity_dispersion > 0.0 && o->velocity_dispersion < 1e3 : isnan(o->velocity_dispersion));
}

static inline void check_abundances(const ew_galaxy_row *row) {
  const ew_observables *o = &row->observed;
  bool known = !isnan(o->metallicity);
  CHECK_ROW(!known || (o->stellar_mass_formed > 0.0 && o->metallicity > -20.0 && o->metallicity < 2.0));
  CHECK_ROW(known ? o->metallicity_spread >= 0.0 && o->metallicity_spread < 5.0 : isnan(o->metallicity_spread));
  for (int i = 0; i < EW_ELEMENT_COUNT; i++) {
    bool given = known && i > EW_HELIUM;
    CHECK_ROW(given ? fabs(o->abundance[i]) < 10.0 : isnan(o->abundance[i]));
  }
}

/* All rows of one realization: the central, then members with stars. `end`: the last time of the run, Gyr. */
static inline void check_rows(const ew_galaxy_row *rows, size_t count, double end) {
  assert_true(count > 0);
  for (const ew_galaxy_row *row = rows; row < rows + count; row++) {
    CHECK_ROW(row->central == (row == rows));
    CHECK_ROW(row->central || row->observed.stellar_mass_formed > 0.0);
    check_halo_columns(row);
    check_masses(row);
    check_history(row, end);
    check_light(row);
    check_abundances(row);
  }
}

#endif
