/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Windows that smooth the linear density field, as functions of x = kR. */
#include "cosmology/choices.h"
#include "elfinwood/cosmology.h"

#include <math.h>

const ew_choice ew_filter_choices[] = {
    [EW_FILTER_TOP_HAT] = {"top_hat", "a sphere of mean density that holds the mass", "common practice"},
    {NULL, NULL, NULL},
};

/* Below this x the closed forms lose digits and the series, with the terms kept, is good to 3e-11 or better. */
static const double SERIES_LIMIT = 0.3;

/* W = 3 (sin x - x cos x)/x^3. */
static double top_hat(double x) {
  double y = x * x;
  if (x < SERIES_LIMIT)
    return 1.0 - y / 10.0 * (1.0 - y / 28.0 * (1.0 - y / 54.0 * (1.0 - y / 88.0)));
  return 3.0 * (sin(x) - x * cos(x)) / (x * y);
}

static double top_hat_derivative(double x) {
  double y = x * x;
  if (x < SERIES_LIMIT)
    return -x / 5.0 * (1.0 - y / 14.0 * (1.0 - y / 36.0 * (1.0 - y / 66.0)));
  return 3.0 * ((y - 3.0) * sin(x) + 3.0 * x * cos(x)) / (y * y);
}

static double top_hat_radius(double mass, double mean_density) {
  return cbrt(3.0 * mass / (4.0 * EW_PI * mean_density));
}

static const ew_filter filters[] = {
    [EW_FILTER_TOP_HAT] = {.label = &ew_filter_choices[EW_FILTER_TOP_HAT],
                           .window = top_hat,
                           .window_derivative = top_hat_derivative,
                           .reach = 400.0,
                           .radius = top_hat_radius},
};

const ew_filter *ew_filter_of(int choice) {
  int count = (int)(sizeof filters / sizeof *filters);
  return choice >= 0 && choice < count ? &filters[choice] : NULL;
}
