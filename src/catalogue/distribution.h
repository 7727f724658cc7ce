/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Quantiles of a stream of weighted values in fixed memory: the weights are collected in even cells, so a quantile is
 * good to the width of one, (high - low) / EW_DISTRIBUTION_CELLS. */
#ifndef EW_CATALOGUE_DISTRIBUTION_H
#define EW_CATALOGUE_DISTRIBUTION_H

enum { EW_DISTRIBUTION_CELLS = 8000 };

/* Values beyond the ends count in the outermost cells. */
typedef struct {
  double low, high;
} ew_distribution_range;

/* Starts out zeroed. */
typedef struct {
  double total;
  double weight[EW_DISTRIBUTION_CELLS];
} ew_distribution;

/* A value that is not finite is left out. */
void ew_distribution_add(ew_distribution *distribution, ew_distribution_range range, double value, double weight);

/* The value below which that share of the weight lies; NaN when nothing was added. */
double ew_distribution_quantile(const ew_distribution *distribution, ew_distribution_range range, double share);

#endif
