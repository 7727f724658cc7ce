/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Smooth functions tabulated with their derivatives on uniform grids, read back by cubic Hermite interpolation: the
 * error falls with the fourth power of the step, a look-up needs no search, and at a knot the stored value returns
 * exactly. Everything that tree building asks of the cosmology comes from such a curve. */
#ifndef EW_COSMOLOGY_CURVE_H
#define EW_COSMOLOGY_CURVE_H

#include "elfinwood/core.h"

/* Knot i lies at first + i step; knot[2 i] is its value and knot[2 i + 1] its derivative times the step. */
typedef struct {
  double first;
  double step;
  double inverse_step;
  int cells; /* knots less one */
  double *knot;
} ew_curve;

/* Allocates cells + 1 knots (cells >= 1) from `first` to `last`; the caller sets them and frees with ew_curve_clear. */
EW_CHECKED ew_status ew_curve_make(ew_curve *curve, double first, double last, int cells, ew_error *error);
void ew_curve_clear(ew_curve *curve);

/* Makes `inverse` the redshift as a function of ln y from `curve`, y as a function of ln(1+z), which must be positive
 * and strictly monotonic. */
EW_CHECKED ew_status ew_curve_invert(ew_curve *inverse, const ew_curve *curve, int cells, ew_error *error);

static inline double ew_curve_position(const ew_curve *curve, int index) {
  return curve->first + index * curve->step;
}

static inline void ew_curve_set(ew_curve *curve, int index, double value, double derivative) {
  curve->knot[2 * index] = value;
  curve->knot[2 * index + 1] = derivative * curve->step;
}

static inline double ew_curve_knot(const ew_curve *curve, int index) {
  return curve->knot[2 * index];
}

/* The knots around x and how far x is from the first of them to the next; x is clamped to the grid, NaN to its start.
 */
typedef struct {
  const double *knot;
  double part;
} ew_curve_place;

static inline ew_curve_place ew_curve_find(const ew_curve *curve, double x) {
  double place = (x - curve->first) * curve->inverse_step;
  place = place > 0.0 ? place : 0.0;
  place = place < curve->cells ? place : curve->cells;
  int cell = (int)place;
  cell = cell < curve->cells ? cell : curve->cells - 1;
  return (ew_curve_place){.knot = curve->knot + 2 * (size_t)cell, .part = place - cell};
}

static inline double ew_curve_at(const ew_curve *curve, double x) {
  ew_curve_place place = ew_curve_find(curve, x);
  const double *y = place.knot;
  double t = place.part, s = 1.0 - t;
  return s * s * ((1.0 + 2.0 * t) * y[0] + t * y[1]) + t * t * ((1.0 + 2.0 * s) * y[2] - s * y[3]);
}

static inline double ew_curve_derivative(const ew_curve *curve, double x) {
  ew_curve_place place = ew_curve_find(curve, x);
  const double *y = place.knot;
  double t = place.part, s = 1.0 - t;
  double rise = 6.0 * t * s * (y[2] - y[0]) + s * (1.0 - 3.0 * t) * y[1] + t * (1.0 - 3.0 * s) * y[3];
  return rise * curve->inverse_step;
}

#endif
