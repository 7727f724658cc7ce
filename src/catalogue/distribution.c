/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Quantiles from weights in cells. */
#include "catalogue/distribution.h"

#include <math.h>
#include <stddef.h>

static size_t cell_of(ew_distribution_range range, double value) {
  double place = (value - range.low) / (range.high - range.low) * EW_DISTRIBUTION_CELLS;
  double last = EW_DISTRIBUTION_CELLS - 1;
  return place > 0.0 ? (size_t)(place < last ? place : last) : 0;
}

void ew_distribution_add(ew_distribution *distribution, ew_distribution_range range, double value, double weight) {
  if (!isfinite(value))
    return;
  size_t cell = cell_of(range, value);
  distribution->weight[cell] += weight;
  distribution->sum[cell] += weight * value;
  distribution->total += weight;
}

double ew_distribution_quantile(const ew_distribution *distribution, double share) {
  double wanted = share * distribution->total, reached = 0.0, value = (double)NAN;
  for (size_t i = 0; i < EW_DISTRIBUTION_CELLS && (isnan(value) || reached < wanted); i++) {
    if (!(distribution->weight[i] > 0.0))
      continue;
    reached += distribution->weight[i];
    value = distribution->sum[i] / distribution->weight[i];
  }
  return value;
}
