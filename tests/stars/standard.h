/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * What the tests of this room share: the standard parameters, a handle built from them, a comparison that prints all
 * digits, and a quadrature that knows nothing of the closed forms under test. */
#ifndef TESTS_STARS_STANDARD_H
#define TESTS_STARS_STANDARD_H

#include "elfinwood/stars.h"

#include <gsl/gsl_errno.h>
#include <gsl/gsl_integration.h>
#include <math.h>
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>

#include <cmocka.h>

#define ROUNDING 1e-13

static const ew_stars_parameters standard = {.supernova_mass = 8.0,
                                             .collapse_mass = 40.0,
                                             .hypernova_fraction = 0.5,
                                             .ia_per_mass = 1.3e-3,
                                             .ia_slope = 1.1,
                                             .ia_delay = 0.04,
                                             .ia_model = 0};

/* `tolerance` is relative. */
static inline void assert_close(double value, double expected, double tolerance) {
  if (!(fabs(value - expected) <= tolerance * fabs(expected)))
    fail_msg("%.17g is not %.17g to %g", value, expected, tolerance);
}

/* `tolerance` is absolute. */
static inline void assert_near(double value, double expected, double tolerance) {
  if (!(fabs(value - expected) <= tolerance))
    fail_msg("%.17g is not %.17g within %g", value, expected, tolerance);
}

static inline ew_stars *stars_with(ew_stars_parameters parameters) {
  ew_stars *stars = NULL;
  ew_error error = {0};
  if (ew_stars_new(&stars, &parameters, &error) != EW_OK)
    fail_msg("%s", error.message);
  return stars;
}

static inline int open_standard(void **state) {
  *state = stars_with(standard);
  return 0;
}

static inline int close_standard(void **state) {
  ew_stars_free(*state);
  return 0;
}

/* Kroupa 2001, eq. 2, not normalised. */
static inline double kroupa_shape(double mass) {
  return mass < 0.5 ? pow(mass, -1.3) : 0.5 * pow(mass, -2.3);
}

/* Integral between two points across which the integrand is smooth. */
static inline double quadrature(double (*function)(double, void *), void *context, double from, double to) {
  gsl_integration_workspace *workspace = gsl_integration_workspace_alloc(200);
  gsl_function integrand = {function, context};
  double result = 0.0, uncertainty = 0.0;
  int status =
      gsl_integration_qag(&integrand, from, to, 0.0, 1e-11, 200, GSL_INTEG_GAUSS31, workspace, &result, &uncertainty);
  gsl_integration_workspace_free(workspace);
  if (status != GSL_SUCCESS)
    fail_msg("%s", gsl_strerror(status));
  return result;
}

static inline double kroupa_mass_density(double mass, void *context) {
  (void)context;
  return mass * kroupa_shape(mass);
}

/* Makes the mass formed 1 Msun. */
static inline double kroupa_normalisation(void) {
  return 1.0 / (quadrature(kroupa_mass_density, NULL, 0.1, 0.5) + quadrature(kroupa_mass_density, NULL, 0.5, 100.0));
}

#endif
