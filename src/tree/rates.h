/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Tables of the split process, internal to the tree room.
 *
 * With the clock s, ds = omega^gamma2 domega, both the split rate N(M) and the smooth loss rate F(M) depend on mass
 * alone: a halo drifts along dlnM/ds = -F(M) and splits with hazard N(M) ds. Along the drift, from mass M down to the
 * resolution, T(M) = int dlnM/F is the clock time and H(M) = int N/F dlnM the expected number of splits. */
#ifndef EW_TREE_RATES_H
#define EW_TREE_RATES_H

#include "elfinwood/tree.h"

#include <gsl/gsl_integration.h>

typedef struct {
  ew_tree_parameters parameters;
  double log_resolution;               /* ln Msun, where the tables by ln M begin */
  double highest_clock;                /* at highest_redshift */
  ew_table variance;                   /* S = sigma^2, by ln M */
  ew_table log_weight;                 /* ln[alpha sigma^(2 + gamma1)], by ln M */
  ew_table drift;                      /* T, by ln M */
  ew_table hazard;                     /* H, by ln M */
  ew_table envelope_slope;             /* e, by ln M: the density of q stays below envelope q^e */
  ew_table log_envelope;               /* ln envelope, by ln M */
  ew_table redshift;                   /* by clock, from 0 to EW_HIGHEST_REDSHIFT */
  gsl_integration_glfixed_table *rule; /* of the integrals over shares */
} ew_split_tables;

EW_CHECKED ew_status ew_split_tables_make(ew_split_tables *tables, const ew_spectrum *spectrum,
                                          const ew_tree_parameters *parameters, double largest_mass, ew_error *error);
void ew_split_tables_clear(ew_split_tables *tables);

/* Unnormalised log density of the smaller part's share q = exp(log_share) of a halo of mass exp(log_mass). */
double ew_log_split_density(const ew_split_tables *tables, double log_mass, double log_share);

/* N and F per unit of clock. */
double ew_split_rate_on_clock(const ew_split_tables *tables, double log_mass);
double ew_smooth_rate_on_clock(const ew_split_tables *tables, double log_mass);

/* Where a table that rises has the value `wanted`, sought from `from` down and never above it. It is the exact inverse
 * of ew_table_at: a table of the inverse would be wrong by several waiting times in massive haloes. */
double ew_table_inverse(const ew_table *rising, double from, double wanted);

/* The inverse of the table of redshifts. */
double ew_clock_of_redshift(const ew_split_tables *tables, double redshift);

double ew_clock_of_barrier(const ew_split_tables *tables, double barrier);
double ew_barrier_of_clock(const ew_split_tables *tables, double clock);

#endif
