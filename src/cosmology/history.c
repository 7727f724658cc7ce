/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Integrals over the history of the universe: Gauss-Legendre within the cells of the redshift grid, whose integrands
 * are smooth over so short a step that six points reach the rounding, and adaptive quadrature for the time before. */
#include "cosmology/background.h"

#include <gsl/gsl_errno.h>
#include <gsl/gsl_integration.h>
#include <math.h>

enum { LEGENDRE_POINTS = 6, WORKSPACE = 200 };
static const double DAWN_TOLERANCE = 1e-12; /* relative; the integrands are smooth in sqrt(a) */

typedef struct {
  const ew_cosmology *cosmology;
  ew_history *rate;
} integrand;

ew_status ew_redshift_curve(ew_curve *curve, ew_error *error) {
  return ew_curve_make(curve, 0.0, log1p(EW_HIGHEST_REDSHIFT), EW_REDSHIFT_CELLS, error);
}

static double over_log_stretch(double x, void *context) {
  const integrand *of = context;
  return of->rate(of->cosmology, exp(x));
}

ew_status ew_history_cells(const ew_cosmology *cosmology, ew_history *rate, double *cell, ew_error *error) {
  integrand of = {cosmology, rate};
  gsl_function function = {over_log_stretch, &of};
  gsl_integration_glfixed_table *points = gsl_integration_glfixed_table_alloc(LEGENDRE_POINTS);
  if (!points)
    return ew_fail_memory(error, "an integral over redshift");
  double step = log1p(EW_HIGHEST_REDSHIFT) / EW_REDSHIFT_CELLS;
  for (int i = 0; i < EW_REDSHIFT_CELLS; i++)
    cell[i] = gsl_integration_glfixed(&function, i * step, (i + 1) * step, points);
  gsl_integration_glfixed_table_free(points);
  return EW_OK;
}

/* With u = sqrt(a): s = 1/u^2 and |d ln s| = 2 du/u. */
static double over_root_of_scale(double u, void *context) {
  const integrand *of = context;
  return of->rate(of->cosmology, 1.0 / (u * u)) * 2.0 / u;
}

/* The integral from the beginning to the highest redshift of the grid. */
static ew_status integrate_dawn(const ew_cosmology *cosmology, ew_history *rate, double *integral, ew_error *error) {
  integrand of = {cosmology, rate};
  gsl_function function = {over_root_of_scale, &of};
  gsl_integration_workspace *space = gsl_integration_workspace_alloc(WORKSPACE);
  if (!space)
    return ew_fail_memory(error, "an integral over the early universe");
  double end = 1.0 / sqrt(1.0 + EW_HIGHEST_REDSHIFT), uncertainty;
  int status = gsl_integration_qag(&function, 0.0, end, 0.0, DAWN_TOLERANCE, WORKSPACE, GSL_INTEG_GAUSS31, space,
                                   integral, &uncertainty);
  gsl_integration_workspace_free(space);
  return status ? ew_fail_gsl(error, status, "an integral over the early universe") : EW_OK;
}

ew_status ew_history_since_beginning(const ew_cosmology *cosmology, ew_history *rate, ew_curve *integral,
                                     ew_error *error) {
  double cell[EW_REDSHIFT_CELLS], sum;
  ew_status status = integrate_dawn(cosmology, rate, &sum, error);
  if (status == EW_OK)
    status = ew_history_cells(cosmology, rate, cell, error);
  for (int i = EW_REDSHIFT_CELLS; status == EW_OK && i >= 0; i--) {
    sum += i < EW_REDSHIFT_CELLS ? cell[i] : 0.0;
    ew_curve_set(integral, i, sum, -rate(cosmology, exp(ew_curve_position(integral, i))));
  }
  return status;
}
