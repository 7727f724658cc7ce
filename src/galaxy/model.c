/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Checks that need more than one parameter of the model. */
#include "elfinwood/galaxy.h"

enum { MOST_BURST_STARS = 3000 }; /* in the mean; a burst stops at 4096 (first_stars.c) */

ew_status ew_model_check(const ew_model *model, const char **name, ew_error *error) {
  const double *clusters = model->star_formation.cluster_range;
  if (!(clusters[0] < clusters[1])) {
    *name = "star_formation.cluster_range";
    return ew_fail(error, EW_REFUSED, "clusters need a range of masses");
  }
  const double *first = model->first_stars.imf_range;
  if (!(first[0] < first[1])) {
    *name = "first_stars.imf_range";
    return ew_fail(error, EW_REFUSED, "first stars need a range of masses");
  }
  ew_power_law law = {model->first_stars.imf_slope, first[0], first[1]};
  if (!(model->first_stars.burst_mass <= MOST_BURST_STARS * ew_power_law_mean(&law))) {
    *name = "first_stars.burst_mass";
    return ew_fail(error, EW_REFUSED, "a burst has room for about %d stars, of %.3g Msun in the mean", MOST_BURST_STARS,
                   ew_power_law_mean(&law));
  }
  return EW_OK;
}
