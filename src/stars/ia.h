/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Type Ia supernovae, as far as they can be worked out once. */
#ifndef EW_STARS_IA_H
#define EW_STARS_IA_H

#include "elfinwood/stars.h"

typedef struct {
  double normalisation;  /* number per Msun formed over the integral of t^-slope [Gyr^(1 - slope)] */
  ew_composition ejecta; /* Msun, of one */
} ew_ia;

void ew_ia_fill(ew_ia *ia, const ew_stars_parameters *parameters);

#endif
