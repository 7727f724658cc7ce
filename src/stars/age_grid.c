/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Grids over age and metallicity: allocation; the look-up is inline in the header. */
#include "stars/age_grid.h"

ew_status ew_age_grid_make(ew_age_grid *grid, const double *metal_fraction, size_t count, double first, double last,
                           size_t ages, ew_error *error) {
  *grid = (ew_age_grid){.count = count, .metal_fraction = metal_fraction[0]};
  for (size_t z = 0; z < count; z++) {
    grid->log_metals[z] = log(metal_fraction[z]);
    ew_status status = ew_table_make(&grid->by_age[z], log(first), log(last), ages, error);
    if (status != EW_OK)
      return status;
  }
  return EW_OK;
}

void ew_age_grid_clear(ew_age_grid *grid) {
  for (size_t z = 0; z < grid->count; z++)
    ew_table_clear(&grid->by_age[z]);
}
