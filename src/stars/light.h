/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * V-band light of single-age populations, tabulated over age and metallicity. */
#ifndef EW_STARS_LIGHT_H
#define EW_STARS_LIGHT_H

#include "stars/age_grid.h"

typedef struct {
  ew_age_grid luminosity;  /* natural logarithm of Lsun,V per Msun formed */
  ew_age_grid fluctuation; /* natural logarithm of Lsun,V */
} ew_light;

EW_CHECKED ew_status ew_light_fill(ew_light *light, ew_error *error);
void ew_light_clear(ew_light *light);

#endif
