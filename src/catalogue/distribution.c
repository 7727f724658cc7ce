/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Quantiles from weights in cells. */
#include "catalogue/distribution.h"

#include <math.h>
#include <stddef.h>

static double cell_width(ew_distribution_range range) {
  return (range.high - range.low) / EW_DISTRIBUTION_CELLS;
}

void ew_distribution_add(ew_distribution *distribution, ew_distribution_range range, double value, double weight) {
  if (!isfinite(value))
    return;
  double place = (value - range.low) / cell_width(range);
  double last = EW_DISTRIBUTION_CELLS - 1;
  size_t cell = place > 0.0 ? (size_t)(place < last ? place : last) : 0;
  distribution->weight[cell] += weight;
  distribution->total += weight;
}

double ew_distribution_quantile(const ew_distribution *distribution, ew_distribution_range range, double share) {
  double wanted = share * distribution->total, below = 0.0;
  for (size_t i = 0; i < EW_DISTRIBUTION_CELLS; i++) {
    double weight = distribution->weight[i];
    if (weight > 0.0 && below + weight >= wanted)
      return range.low + ((double)i + (wanted - below) / weight) * cell_width(range);
    below += weight;
  }
  return distribution->total > 0.0 ? range.high : (double)NAN;
}
