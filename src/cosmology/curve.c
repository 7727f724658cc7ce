/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Curves: allocation and inversion; look-ups are inline in the header. */
#include "cosmology/curve.h"

#include <math.h>
#include <stdlib.h>

/* Newton's method starts from the neighbouring knot's solution, a few parts in a thousand away, so that the error is
 * below the rounding after three steps; one more costs nothing. */
enum { NEWTON_STEPS = 4 };

ew_status ew_curve_make(ew_curve *curve, double first, double last, int cells, ew_error *error) {
  *curve = (ew_curve){0};
  if (cells < 1 || !(last > first))
    return ew_fail(error, EW_FAILED, "a curve needs one cell and a range, got %d from %g to %g", cells, first, last);
  curve->knot = calloc(2 * ((size_t)cells + 1), sizeof *curve->knot);
  if (!curve->knot)
    return ew_fail_memory(error, "a curve");
  curve->first = first;
  curve->step = (last - first) / cells;
  curve->inverse_step = cells / (last - first);
  curve->cells = cells;
  return EW_OK;
}

void ew_curve_clear(ew_curve *curve) {
  free(curve->knot);
  *curve = (ew_curve){0};
}

/* The x where the curve has the value y, found from a guess close by. */
static double solve(const ew_curve *curve, double y, double guess) {
  double first = curve->first, last = ew_curve_position(curve, curve->cells);
  double x = guess;
  for (int i = 0; i < NEWTON_STEPS; i++) {
    x += (y - ew_curve_at(curve, x)) / ew_curve_derivative(curve, x);
    x = fmin(fmax(x, first), last);
  }
  return x;
}

ew_status ew_curve_invert(ew_curve *inverse, const ew_curve *curve, int cells, ew_error *error) {
  double today = ew_curve_knot(curve, 0), early = ew_curve_knot(curve, curve->cells);
  double from = today < early ? curve->first : ew_curve_position(curve, curve->cells);
  double to = today < early ? ew_curve_position(curve, curve->cells) : curve->first;
  ew_status status = ew_curve_make(inverse, log(fmin(today, early)), log(fmax(today, early)), cells, error);
  double x = from;
  for (int i = 0; status == EW_OK && i <= cells; i++) {
    double y = exp(ew_curve_position(inverse, i));
    if (i == cells)
      x = to; /* the ends are known exactly */
    else if (i > 0)
      x = solve(curve, y, x);
    ew_curve_set(inverse, i, expm1(x), exp(x) * y / ew_curve_derivative(curve, x));
  }
  return status;
}
