/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The profile of Navarro, Frenk & White (1997): mass, density, potential and velocities, the radius of a given mean
 * density, and from that the change between mass definitions.
 *
 * With x = r/r_s and m(x) = ln(1+x) - x/(1+x), M(r) = M_vir m(x)/m(c). The mean density inside r is proportional to
 * m(x)/x^3, which falls monotonically from infinity (as 1/2x) to zero, so every positive mean density has one radius.
 */
#include "elfinwood/halo.h"

#include <math.h>

/* The series is used below this: its first dropped term is then 2e-14 of the sum, and the closed form above it loses
 * at most some epsilon / x = 6e-14 by cancellation. */
#define SERIES_BELOW 0.01

/* Radii are sought up to this many scale radii; nothing asks for the mean density so far out. */
#define LARGEST_X 1e6

/* Below this the first guess is the root to all digits, and powers of x would underflow. */
#define SMALLEST_X      1e-100

#define NEWTON_STEP     1e-9 /* the step after this one is smaller than rounding: convergence is quadratic */
#define NEWTON_LIMIT    100

#define FARTHEST_RADIUS 100.0 /* in virial radii */

/* Sum over k of (-1)^k (k-1)/k x^k from k = 2. */
double ew_nfw_shape(double x) {
  if (x >= SERIES_BELOW)
    return log1p(x) - x / (1.0 + x);
  return x * x *
         (1.0 / 2.0 +
          x * (-2.0 / 3.0 + x * (3.0 / 4.0 + x * (-4.0 / 5.0 + x * (5.0 / 6.0 + x * (-6.0 / 7.0 + x * 7.0 / 8.0))))));
}

static double scale_radius(const ew_nfw *halo) {
  return halo->radius / halo->concentration;
}

/* M_vir / m(c): the mass that M(r) counts m(x) of. */
static double scale_mass(const ew_nfw *halo) {
  return halo->mass / ew_nfw_shape(halo->concentration);
}

double ew_nfw_mass(const ew_nfw *halo, double radius) {
  return scale_mass(halo) * ew_nfw_shape(radius / scale_radius(halo));
}

double ew_nfw_density(const ew_nfw *halo, double radius) {
  double r_s = scale_radius(halo);
  double x = radius / r_s;
  return scale_mass(halo) / (4.0 * EW_PI * r_s * r_s * r_s * x * (1.0 + x) * (1.0 + x));
}

double ew_nfw_potential(const ew_nfw *halo, double radius) {
  double r_s = scale_radius(halo);
  double x = radius / r_s;
  double fall = x > 0.0 ? log1p(x) / x : 1.0;
  return -EW_GRAVITY * scale_mass(halo) / r_s * fall;
}

double ew_nfw_escape_velocity(const ew_nfw *halo) {
  return sqrt(-2.0 * ew_nfw_potential(halo, 0.0));
}

double ew_nfw_circular_velocity(const ew_nfw *halo, double radius) {
  return radius > 0.0 ? sqrt(EW_GRAVITY * ew_nfw_mass(halo, radius) / radius) : 0.0;
}

/* The x at which m(x)/x^3 is `value`, at most LARGEST_X. Newton in ln x on ln(m/x^3), a concave falling function:
 * from the second step on the iterates come down to the root without crossing it, whatever the start. */
static double x_of_mean_density(double value) {
  if (!(value > ew_nfw_shape(LARGEST_X) / (LARGEST_X * LARGEST_X * LARGEST_X)))
    return LARGEST_X;
  double cusp = 0.5 / value; /* the root where it is small; a fitted bend leads to the steep outside */
  double x = cusp / (1.0 + cbrt(cusp * cusp) / 1.3);
  for (int i = 0; i < NEWTON_LIMIT && x > SMALLEST_X; i++) {
    double shape = ew_nfw_shape(x);
    double slope = x * x / ((1.0 + x) * (1.0 + x) * shape) - 3.0;
    double step = log(shape / (x * x * x * value)) / slope;
    x *= exp(-step);
    if (fabs(step) < NEWTON_STEP)
      break;
  }
  return x;
}

double ew_nfw_radius_of_density(const ew_nfw *halo, double mean_density) {
  double r_s = scale_radius(halo);
  double value = mean_density * 4.0 * EW_PI / 3.0 * r_s * r_s * r_s / scale_mass(halo);
  return fmin(r_s * x_of_mean_density(value), FARTHEST_RADIUS * halo->radius);
}

double ew_convert_mass(const ew_mass_conversion *conversion, double *new_concentration) {
  double c = conversion->concentration;
  double shape = ew_nfw_shape(c);
  double new_c = x_of_mean_density(conversion->wanted / conversion->overdensity * shape / (c * c * c));
  if (new_concentration)
    *new_concentration = new_c;
  return conversion->mass * ew_nfw_shape(new_c) / shape;
}
