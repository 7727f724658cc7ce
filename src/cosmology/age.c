/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Age of the universe, redshift at an age, and distances. */
#include "cosmology/background.h"

#include <math.h>

static double age_rate(const ew_cosmology *cosmology, double s) {
  return EW_HUBBLE_TIME / cosmology->parameters.hubble / sqrt(ew_expansion_squared(cosmology, s));
}

ew_status ew_build_age(ew_cosmology *cosmology, ew_error *error) {
  ew_status status = ew_redshift_curve(&cosmology->age, error);
  if (status == EW_OK)
    status = ew_history_since_beginning(cosmology, age_rate, &cosmology->age, error);
  if (status == EW_OK)
    status = ew_curve_invert(&cosmology->redshift_at, &cosmology->age, EW_INVERSE_CELLS, error);
  return status;
}

double ew_age(const ew_cosmology *cosmology, double redshift) {
  return ew_curve_at(&cosmology->age, log(1.0 + ew_redshift_inside(redshift)));
}

double ew_redshift_at(const ew_cosmology *cosmology, double age) {
  return ew_curve_at(&cosmology->redshift_at, log(age));
}

static double distance_rate(const ew_cosmology *cosmology, double s) {
  double hubble_length = EW_LIGHT_SPEED / (100.0 * cosmology->parameters.hubble);
  return hubble_length * s / sqrt(ew_expansion_squared(cosmology, s));
}

ew_status ew_build_distance(ew_cosmology *cosmology, ew_error *error) {
  double cell[EW_REDSHIFT_CELLS], sum = 0.0;
  ew_curve *distance = &cosmology->distance;
  ew_status status = ew_redshift_curve(distance, error);
  if (status == EW_OK)
    status = ew_history_cells(cosmology, distance_rate, cell, error);
  for (int i = 0; status == EW_OK && i <= EW_REDSHIFT_CELLS; i++) {
    ew_curve_set(distance, i, sum, distance_rate(cosmology, exp(ew_curve_position(distance, i))));
    sum += i < EW_REDSHIFT_CELLS ? cell[i] : 0.0;
  }
  return status;
}

double ew_comoving_distance(const ew_cosmology *cosmology, double redshift) {
  return ew_curve_at(&cosmology->distance, log1p(ew_redshift_inside(redshift)));
}

double ew_luminosity_distance(const ew_cosmology *cosmology, double redshift) {
  return (1.0 + ew_redshift_inside(redshift)) * ew_comoving_distance(cosmology, redshift);
}
