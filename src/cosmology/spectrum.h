/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The body of ew_spectrum and the steps that build it. */
#ifndef EW_COSMOLOGY_SPECTRUM_H
#define EW_COSMOLOGY_SPECTRUM_H

#include "cosmology/curve.h"
#include "elfinwood/cosmology.h"

/* 1/Mpc. Larger waves add less than 1e-12 to any sigma(M) of the table in any universe that the rows allow. */
#define EW_LOWEST_WAVENUMBER 1e-6

struct ew_spectrum {
  const ew_cosmology *cosmology;
  ew_spectrum_parameters parameters;
  const ew_transfer *transfer;
  const ew_filter *filter;
  double amplitude; /* P = amplitude k^n_s T^2, Mpc^(3 + n_s) */
  ew_curve sigma;   /* over ln(M/Msun) */
};

static inline double ew_mass_inside(double mass) {
  double m = mass > EW_LOWEST_MASS ? mass : EW_LOWEST_MASS;
  return m < EW_HIGHEST_MASS ? m : EW_HIGHEST_MASS;
}

/* k^3 P/(2 pi^2): the variance that a unit of ln k adds. */
double ew_power_per_log(const ew_spectrum *spectrum, double wavenumber);

/* The variance in windows of `radius` [Mpc] and its derivative by ln(radius), by adaptive integration. */
EW_CHECKED ew_status ew_variance_integrate(const ew_spectrum *spectrum, const ew_filter *filter, double radius,
                                           double *variance, double *derivative, ew_error *error);

/* Makes the sigma(M) curve for the present amplitude. Refuses a spectrum that is not finite. */
EW_CHECKED ew_status ew_variance_tabulate(ew_spectrum *spectrum, ew_error *error);

#endif
