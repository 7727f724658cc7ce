/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The concentration-mass relation at one redshift, with what depends on redshift alone worked out beforehand. */
#ifndef EW_HALO_DIEMER_JOYCE_H
#define EW_HALO_DIEMER_JOYCE_H

#include "elfinwood/halo.h"

typedef struct {
  const ew_spectrum *spectrum;
  double barrier;       /* delta_c / D(z) */
  double growth_factor; /* C_a = 1 - c_a (1 - alpha_eff) */
} ew_diemer_joyce_epoch;

ew_diemer_joyce_epoch ew_diemer_joyce_at(const ew_spectrum *spectrum, double redshift);

/* c200c of M200c [Msun]. EW_FAILED if the equation has no solution on its upper branch, which does not happen for a
 * spectrum whose sigma falls with mass. */
EW_CHECKED ew_status ew_diemer_joyce_concentration(const ew_diemer_joyce_epoch *epoch, double mass_200c,
                                                   double *concentration, ew_error *error);

#endif
