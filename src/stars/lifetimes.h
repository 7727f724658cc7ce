/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The table of lifetimes as it is interpolated: natural logarithms throughout. */
#ifndef EW_STARS_LIFETIMES_H
#define EW_STARS_LIFETIMES_H

enum { EW_LIFETIME_MASSES = 30, EW_LIFETIME_METALLICITIES = 5 };

/* Metal mass fractions of the table, ascending. */
extern const double ew_lifetime_metals[EW_LIFETIME_METALLICITIES];

typedef struct {
  double log_mass[EW_LIFETIME_MASSES];                           /* ascending */
  double log_metals[EW_LIFETIME_METALLICITIES];                  /* ascending */
  double log_age[EW_LIFETIME_METALLICITIES][EW_LIFETIME_MASSES]; /* of age in Gyr, descending with mass */
} ew_lifetimes;

void ew_lifetimes_fill(ew_lifetimes *lifetimes);

#endif
