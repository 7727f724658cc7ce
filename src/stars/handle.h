/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The room's handle: the parameters, and every table that follows from them or from the compiled-in publications. */
#ifndef EW_STARS_HANDLE_H
#define EW_STARS_HANDLE_H

#include "elfinwood/stars.h"
#include "stars/deaths.h"
#include "stars/ia.h"
#include "stars/lifetimes.h"
#include "stars/light.h"
#include "stars/mass_return.h"
#include "stars/supernova_bins.h"

enum { EW_IA_MODELS = 7 };

/* Range of the IMF [Msun]. */
#define EW_IMF_LOW  0.1
#define EW_IMF_HIGH 100.0

struct ew_stars {
  ew_stars_parameters parameters;
  ew_lifetimes lifetimes;
  ew_core_collapse core_collapse;
  ew_supernova_bins supernova_bins;
  ew_ia ia;
  ew_mass_return mass_return;
  ew_light light;
};

#endif
