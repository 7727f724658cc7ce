/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Construction of the handle: parameters are checked against their rows, then each table is filled in the order in
 * which they need one another. */
#include "elfinwood/stars.h"

#include "stars/handle.h"

#include <stdlib.h>

static ew_status fill(ew_stars *stars, ew_error *error) {
  ew_lifetimes_fill(&stars->lifetimes);
  ew_core_collapse_fill(&stars->core_collapse);
  ew_supernova_bins_fill(stars);
  ew_ia_fill(&stars->ia, &stars->parameters);
  ew_status status = ew_mass_return_fill(stars, error);
  if (status == EW_OK)
    status = ew_light_fill(&stars->light, error);
  return status;
}

ew_status ew_stars_new(ew_stars **stars, const ew_stars_parameters *parameters, ew_error *error) {
  *stars = NULL;
  ew_status status = ew_rows_check(ew_stars_rows, parameters, error);
  if (status != EW_OK)
    return status;
  ew_stars *made = calloc(1, sizeof *made);
  if (!made)
    return ew_fail_memory(error, "the stellar tables");
  made->parameters = *parameters;
  status = fill(made, error);
  if (status != EW_OK) {
    ew_stars_free(made);
    return status;
  }
  *stars = made;
  return EW_OK;
}

void ew_stars_free(ew_stars *stars) {
  if (!stars)
    return;
  ew_mass_return_clear(&stars->mass_return);
  ew_light_clear(&stars->light);
  free(stars);
}

const ew_stars_parameters *ew_stars_get(const ew_stars *stars) {
  return &stars->parameters;
}
