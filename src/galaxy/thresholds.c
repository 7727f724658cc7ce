/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The mass above which gas in a halo cools: by molecules, against dissociation and streaming, or by atoms. */
#include "elfinwood/galaxy.h"

#include <math.h>

#define HIGHEST_BACKGROUND 30.0 /* the range in which the fit was made */
#define HIGHEST_STREAMING  60.0
#define LOWEST_REDSHIFT    10.0
#define HIGHEST_REDSHIFT   30.0

double ew_lyman_werner_background(double redshift) {
  double x = 1.0 + redshift;
  return pow(10.0, 2.119 - 0.1117 * x - 2.782e-3 * x * x);
}

double ew_molecular_threshold(double redshift, double lyman_werner, double streaming_velocity) {
  double j = fmin(fmax(lyman_werner, 0.0), HIGHEST_BACKGROUND);
  double v = fmin(fmax(streaming_velocity, 0.0), HIGHEST_STREAMING);
  double z = fmin(fmax(redshift, LOWEST_REDSHIFT), HIGHEST_REDSHIFT);
  double background = 1.0 + j, streaming = 1.0 + v / 30.0, both = 1.0 + j * v / 3.0;
  double at_twenty = 1.96e5 * pow(background, 0.80) * pow(streaming, 1.83) * pow(both, -0.06);
  double slope = 1.64 * pow(background, 0.36) * pow(streaming, -0.62) * pow(both, 0.13);
  return at_twenty * pow((1.0 + z) / 21.0, -slope);
}
