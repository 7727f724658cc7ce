/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The body of ew_cosmology and the steps that build it. Curves run over x = ln(1+z) from 0 to
 * ln(1 + EW_HIGHEST_REDSHIFT) unless said otherwise. */
#ifndef EW_COSMOLOGY_BACKGROUND_H
#define EW_COSMOLOGY_BACKGROUND_H

#include "cosmology/curve.h"
#include "elfinwood/cosmology.h"

/* 0.004 in ln(1+z): cubic interpolation is then good to some 1e-12 for powers of 1+z, and a curve (16 KiB) fits the
 * first cache. */
enum { EW_REDSHIFT_CELLS = 1024 };

/* The inverse curves bend more than the ones that they undo, by the powers of 1/f in the case of growth. */
enum { EW_INVERSE_CELLS = 2048 };

struct ew_cosmology {
  ew_cosmology_parameters parameters;
  double omega_radiation;
  double omega_lambda;
  ew_curve age;                 /* Gyr */
  ew_curve redshift_at;         /* z over ln(age/Gyr) */
  ew_curve distance;            /* comoving, Mpc */
  ew_curve growth;              /* D */
  ew_curve growth_rate;         /* d ln D / d ln a */
  ew_curve barrier;             /* delta_c/D */
  ew_curve redshift_of_barrier; /* z over ln(barrier) */
};

static inline double ew_redshift_inside(double redshift) {
  double z = redshift > 0.0 ? redshift : 0.0;
  return z < EW_HIGHEST_REDSHIFT ? z : EW_HIGHEST_REDSHIFT;
}

/* E^2 = (H/H0)^2 at the stretch s = 1 + z. */
static inline double ew_expansion_squared(const ew_cosmology *cosmology, double s) {
  return s * s * s * (cosmology->parameters.omega_matter + s * cosmology->omega_radiation) + cosmology->omega_lambda;
}

/* d ln E^2 / d ln s at the stretch s. */
static inline double ew_expansion_slope(const ew_cosmology *cosmology, double s) {
  double weighted = 3.0 * cosmology->parameters.omega_matter + 4.0 * s * cosmology->omega_radiation;
  return s * s * s * weighted / ew_expansion_squared(cosmology, s);
}

/* Omega_m at the stretch s. */
static inline double ew_matter_share(const ew_cosmology *cosmology, double s) {
  return cosmology->parameters.omega_matter * s * s * s / ew_expansion_squared(cosmology, s);
}

/* A function of the stretch s that is integrated over the history of the universe. */
typedef double ew_history(const ew_cosmology *cosmology, double s);

/* Fills cell[0 .. EW_REDSHIFT_CELLS-1] with the integrals of `rate` over ln(1+z) across each cell of the grid. */
EW_CHECKED ew_status ew_history_cells(const ew_cosmology *cosmology, ew_history *rate, double *cell, ew_error *error);

/* Sets the knots of `integral` to the integral of `rate` over ln(1+z) from the beginning to each, and its slopes. */
EW_CHECKED ew_status ew_history_since_beginning(const ew_cosmology *cosmology, ew_history *rate, ew_curve *integral,
                                                ew_error *error);

/* The steps of ew_cosmology_new, in order: each fills its curves, which the caller frees, and may use earlier ones. */
EW_CHECKED ew_status ew_build_age(ew_cosmology *cosmology, ew_error *error);
EW_CHECKED ew_status ew_build_distance(ew_cosmology *cosmology, ew_error *error);
EW_CHECKED ew_status ew_build_growth(ew_cosmology *cosmology, ew_error *error);
EW_CHECKED ew_status ew_build_barrier(ew_cosmology *cosmology, ew_error *error);

/* A curve over the redshift grid, to be filled. */
EW_CHECKED ew_status ew_redshift_curve(ew_curve *curve, ew_error *error);

#endif
