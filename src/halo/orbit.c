/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Satellite orbits at infall and the time that dynamical friction takes to bring the satellite to the centre. */
#include "elfinwood/halo.h"

#include <gsl/gsl_cdf.h>
#include <math.h>

/* Circularity e is distributed as [e(1-e)]^1.22: a beta distribution whose two shapes are 2.22. */
#define CIRCULARITY_SHAPE 2.22
#define SMALLEST_RADIUS   0.6
#define LARGEST_RADIUS    1.0

/* (M/m)^1.3 stays finite below it, so that a satellite without mass never sinks instead of sinking at NaN. */
#define LARGEST_RATIO 1e200

ew_orbit ew_orbit_draw(double u_circularity, double u_radius) {
  return (ew_orbit){
      .circularity = gsl_cdf_beta_Pinv(u_circularity, CIRCULARITY_SHAPE, CIRCULARITY_SHAPE),
      .circular_radius = SMALLEST_RADIUS + (LARGEST_RADIUS - SMALLEST_RADIUS) * u_radius,
  };
}

double ew_friction_time(double host_over_satellite, const ew_orbit *orbit, double host_crossing_time) {
  double ratio = host_over_satellite > 1.0 ? fmin(host_over_satellite, LARGEST_RATIO) : 1.0;
  return host_crossing_time * 0.216 * pow(ratio, 1.3) / log1p(ratio) * exp(1.9 * orbit->circularity) *
         orbit->circular_radius;
}
