/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The haloes that trees grow from. */
#include "elfinwood/population.h"

#include <math.h>

static double draw_mass(const ew_root_parameters *roots, const ew_draws *draws) {
  if (roots->kind == EW_ROOTS_SINGLE)
    return roots->mass;
  ew_stream stream = ew_stream_open(draws, EW_PROCESS_ROOTS, ew_branch_key_root(), 0);
  double low = log(roots->mass_range[0]), high = log(roots->mass_range[1]);
  double mass = exp(low + ew_draw_uniform(&stream) * (high - low));
  return fmin(fmax(mass, roots->mass_range[0]), roots->mass_range[1]);
}

ew_root ew_root_draw(const ew_settings *settings, const ew_draws *draws) {
  return (ew_root){.number = draws->tree,
                   .halo_id = -1,
                   .weight = 1.0,
                   .mass = draw_mass(&settings->roots, draws),
                   .redshift = settings->roots.redshift};
}

double ew_roots_largest_mass(const ew_settings *settings) {
  return settings->roots.kind == EW_ROOTS_SINGLE ? settings->roots.mass : settings->roots.mass_range[1];
}
