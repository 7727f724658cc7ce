/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Power laws in closed form. With q = 1 - slope the integral is (to^q - from^q) / q; written with expm1 and log1p it
 * has no cancellation, neither for narrow ranges nor for slopes near 1, where it turns into the logarithm. */
#include "stars/power_law.h"

#include "elfinwood/stars.h"

#include <math.h>

double ew_power_integral(double slope, double from, double to) {
  double q = 1.0 - slope, width = log(to / from), x = q * width;
  double mean_height = x == 0.0 ? 1.0 : expm1(x) / x;
  return pow(from, q) * width * mean_height;
}

/* Solved from the end where x^q is smaller, so that 1 + (a product >= 0) is what the logarithm sees. */
double ew_power_draw(double slope, double low, double high, double u) {
  double q = 1.0 - slope, width = log(high / low), x = q * width;
  double result;
  if (x == 0.0)
    result = low * exp(u * width);
  else if (x > 0.0)
    result = low * exp(log1p(u * expm1(x)) / q);
  else
    result = high * exp(log1p((1.0 - u) * expm1(-x)) / q);
  return fmin(fmax(result, low), high);
}

double ew_power_law_draw(const ew_power_law *law, double u) {
  return ew_power_draw(law->slope, law->low, law->high, u);
}

double ew_power_law_mean(const ew_power_law *law) {
  if (!(law->high > law->low))
    return law->low;
  return ew_power_integral(law->slope - 1.0, law->low, law->high) / ew_power_integral(law->slope, law->low, law->high);
}

double ew_power_law_share(const ew_power_law *law, double from, double to) {
  if (!(law->high > law->low))
    return from <= law->low && law->low <= to ? 1.0 : 0.0;
  double low = fmin(fmax(from, law->low), law->high), high = fmin(fmax(to, law->low), law->high);
  if (!(high > low))
    return 0.0;
  return ew_power_integral(law->slope, low, high) / ew_power_integral(law->slope, law->low, law->high);
}
