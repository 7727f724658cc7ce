/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Quantiles of a stream of weighted values in fixed memory: weights and values are summed up in even cells, and a
 * quantile is the mean of its cell. So it is exact where a cell holds one value, and good to the width of a cell, (high
 * - low) / EW_DISTRIBUTION_CELLS, elsewhere. */
#ifndef EW_CATALOGUE_DISTRIBUTION_H
#define EW_CATALOGUE_DISTRIBUTION_H

enum { EW_DISTRIBUTION_CELLS = 4000 };

/* Values beyond the ends count in the outermost cells. */
typedef struct {
  double low, high;
} ew_distribution_range;

/* Starts out zeroed. */
typedef struct {
  double total;
  double weight[EW_DISTRIBUTION_CELLS];
  double sum[EW_DISTRIBUTION_CELLS]; /* of weight times value */
} ew_distribution;

/* A value that is not finite is left out. */
void ew_distribution_add(ew_distribution *distribution, ew_distribution_range range, double value, double weight);

/* The value up to which that share (0 to 1) of the weight lies; NaN when nothing was added. */
double ew_distribution_quantile(const ew_distribution *distribution, double share);

#endif
