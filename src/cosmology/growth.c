/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Linear growth of matter. Without radiation D = (5/2) Omega_m E int da/(a E)^3 (Heath 1977, MNRAS 179, 351), which
 * tends to a at early times. With radiation, itself unperturbed, the growth equation
 *   D'' + (2 + d ln H/d ln a) D' = (3/2) Omega_m(a) D,   ' = d/d ln a,
 * is integrated from the radiation era, starting on the growing mode D = a + (2/3) a_eq (Meszaros 1974, A&A 37, 225),
 * exact while Lambda is negligible. */
#include "cosmology/background.h"

#include <gsl/gsl_errno.h>
#include <gsl/gsl_odeiv2.h>
#include <math.h>

static const double START_SCALE = 1e-6;       /* a; Lambda is 1e-16 of the density there */
static const double FIRST_STEP = 1e-3;        /* in ln a */
static const double GROWTH_TOLERANCE = 1e-12; /* relative, per step */

/* d f/d ln a by the growth equation. */
static double rate_slope(const ew_cosmology *cosmology, double s, double f) {
  double friction = 2.0 - 0.5 * ew_expansion_slope(cosmology, s);
  return 1.5 * ew_matter_share(cosmology, s) - f * f - friction * f;
}

/* Knot `index` of both curves; D may have any normalisation. */
static void set_knot(ew_cosmology *cosmology, int index, double s, double growth, double f) {
  ew_curve_set(&cosmology->growth, index, growth, -f * growth);
  ew_curve_set(&cosmology->growth_rate, index, f, -rate_slope(cosmology, s, f));
}

static double heath_rate(const ew_cosmology *cosmology, double s) {
  double square = ew_expansion_squared(cosmology, s);
  return s * s / (square * sqrt(square));
}

static ew_status integrate_heath(ew_cosmology *cosmology, ew_error *error) {
  ew_curve *growth = &cosmology->growth;
  ew_status status = ew_history_since_beginning(cosmology, heath_rate, growth, error);
  for (int i = 0; status == EW_OK && i <= EW_REDSHIFT_CELLS; i++) {
    double s = exp(ew_curve_position(growth, i));
    double expansion = sqrt(ew_expansion_squared(cosmology, s));
    double d = 2.5 * cosmology->parameters.omega_matter * expansion * ew_curve_knot(growth, i);
    set_knot(cosmology, i, s, d, ew_matter_share(cosmology, s) * (2.5 / (s * d) - 1.5));
  }
  return status;
}

/* y = (D, dD/d ln a). */
static int growth_equation(double log_scale, const double y[], double derivative[], void *context) {
  const ew_cosmology *cosmology = context;
  double s = exp(-log_scale);
  derivative[0] = y[1];
  derivative[1] = 1.5 * ew_matter_share(cosmology, s) * y[0] - (2.0 - 0.5 * ew_expansion_slope(cosmology, s)) * y[1];
  return GSL_SUCCESS;
}

static ew_status integrate_growth_equation(ew_cosmology *cosmology, ew_error *error) {
  gsl_odeiv2_system system = {growth_equation, NULL, 2, cosmology};
  gsl_odeiv2_driver *driver =
      gsl_odeiv2_driver_alloc_y_new(&system, gsl_odeiv2_step_rk8pd, FIRST_STEP, 0.0, GROWTH_TOLERANCE);
  if (!driver)
    return ew_fail_memory(error, "the growth equation");
  double equality = cosmology->omega_radiation / cosmology->parameters.omega_matter;
  double y[2] = {START_SCALE + 2.0 / 3.0 * equality, START_SCALE};
  double log_scale = log(START_SCALE);
  int status = GSL_SUCCESS;
  for (int i = EW_REDSHIFT_CELLS; status == GSL_SUCCESS && i >= 0; i--) {
    double x = ew_curve_position(&cosmology->growth, i);
    status = gsl_odeiv2_driver_apply(driver, &log_scale, -x, y);
    set_knot(cosmology, i, exp(x), y[0], y[1] / y[0]);
  }
  gsl_odeiv2_driver_free(driver);
  return status ? ew_fail_gsl(error, status, "the growth equation") : EW_OK;
}

static void normalise(ew_curve *growth) {
  double today = ew_curve_knot(growth, 0);
  for (int i = 0; i < 2 * (growth->cells + 1); i++)
    growth->knot[i] /= today;
}

ew_status ew_build_growth(ew_cosmology *cosmology, ew_error *error) {
  ew_status status = ew_redshift_curve(&cosmology->growth, error);
  if (status == EW_OK)
    status = ew_redshift_curve(&cosmology->growth_rate, error);
  if (status == EW_OK && cosmology->parameters.radiation)
    status = integrate_growth_equation(cosmology, error);
  else if (status == EW_OK)
    status = integrate_heath(cosmology, error);
  if (status == EW_OK)
    normalise(&cosmology->growth);
  return status;
}

double ew_growth(const ew_cosmology *cosmology, double redshift) {
  return ew_curve_at(&cosmology->growth, log(1.0 + ew_redshift_inside(redshift)));
}

double ew_growth_rate(const ew_cosmology *cosmology, double redshift) {
  return ew_curve_at(&cosmology->growth_rate, log(1.0 + ew_redshift_inside(redshift)));
}
