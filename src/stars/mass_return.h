/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Mass lost by stars that end as white dwarfs, tabulated over age and metallicity. */
#ifndef EW_STARS_MASS_RETURN_H
#define EW_STARS_MASS_RETURN_H

#include "elfinwood/stars.h"
#include "stars/age_grid.h"

typedef struct {
  ew_age_grid returned, white_dwarfs; /* Msun per Msun formed */
} ew_mass_return;

/* Needs the handle's parameters and lifetimes. */
EW_CHECKED ew_status ew_mass_return_fill(ew_stars *stars, ew_error *error);
void ew_mass_return_clear(ew_mass_return *tables);

#endif
