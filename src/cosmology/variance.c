/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * sigma(M): the rms of the linear field in windows that hold the mass M,
 *   sigma^2(R) = int d ln k [k^3 P(k)/(2 pi^2)] W^2(kR).
 *
 * The reference integrates this adaptively for one mass. The table takes the sum over a uniform grid in ln k, which
 * converges exponentially for such integrands until the window swings faster than the grid, where it no longer
 * matters. Since R follows M^(1/3), a grid in ln M of a whole number of such nodes needs each power and each window
 * only once: the sum is a correlation of the two. Against the reference the table is good to 1e-8 or better. */
#include "cosmology/spectrum.h"

#include <gsl/gsl_errno.h>
#include <gsl/gsl_integration.h>
#include <math.h>
#include <stdlib.h>

/* 0.06 in ln M for the Hermite curve, a twelfth of that in ln k: 0.005. */
enum { MASS_CELLS = 500, NODES_PER_CELL = 4, WORKSPACE = 1000 };
/* Of the reference integrals. */
static const double PIECE = 0.5;       /* in ln k */
static const double TOLERANCE = 1e-12; /* wanted of a piece, relative to the whole */
static const double DOUBT = 1e-8;      /* the sum of GSL's upper limits that is accepted, relative to the whole */

/* ------------------------------------------------------------------------------------------------------- reference */

typedef struct {
  const ew_spectrum *spectrum;
  const ew_filter *filter;
  double radius;
} smoothing;

static double square_window(const ew_filter *filter, double kr) {
  double window = filter->window(kr);
  return window * window;
}

/* d W^2/d ln(kR). */
static double square_window_derivative(const ew_filter *filter, double kr) {
  return 2.0 * kr * filter->window(kr) * filter->window_derivative(kr);
}

static double variance_rate(double log_wavenumber, void *context) {
  const smoothing *of = context;
  double k = exp(log_wavenumber);
  return ew_power_per_log(of->spectrum, k) * square_window(of->filter, k * of->radius);
}

static double derivative_rate(double log_wavenumber, void *context) {
  const smoothing *of = context;
  double k = exp(log_wavenumber);
  return ew_power_per_log(of->spectrum, k) * square_window_derivative(of->filter, k * of->radius);
}

/* Piece by piece, so that the acoustic oscillations and the swing of the window are met a few at a time, each to the
 * same share of `size`. Where waves too small to matter swing too fast to follow, GSL gives up on a piece with
 * GSL_EROUND and an honest uncertainty: what decides is their sum. */
static int integrate(gsl_function function, double reach, double size, gsl_integration_workspace *space,
                     double *integral) {
  double from = log(EW_LOWEST_WAVENUMBER), doubt = 0.0;
  int count = (int)ceil((log(reach) - from) / PIECE), status = GSL_SUCCESS;
  double width = (log(reach) - from) / count;
  *integral = 0.0;
  for (int i = 0; i < count && (status == GSL_SUCCESS || status == GSL_EROUND); i++) {
    double start = from + i * width, piece, uncertainty;
    status = gsl_integration_qag(&function, start, start + width, TOLERANCE * size, 0.0, WORKSPACE, GSL_INTEG_GAUSS61,
                                 space, &piece, &uncertainty);
    *integral += piece;
    doubt += uncertainty;
  }
  if (status != GSL_SUCCESS && status != GSL_EROUND)
    return status;
  return doubt <= DOUBT * size ? GSL_SUCCESS : GSL_ETOL;
}

ew_status ew_variance_integrate(const ew_spectrum *spectrum, const ew_filter *filter, double radius, double *variance,
                                double *derivative, ew_error *error) {
  smoothing of = {spectrum, filter, radius};
  gsl_integration_workspace *space = gsl_integration_workspace_alloc(WORKSPACE);
  if (!space)
    return ew_fail_memory(error, "the integral of sigma(M)");
  /* The table, where it stands in for the size of the answer, need only be right to a factor of a few. */
  double volume = 4.0 * EW_PI / 3.0 * radius * radius * radius;
  double size = pow(ew_sigma(spectrum, volume * ew_matter_density(spectrum->cosmology)), 2);
  double reach = filter->reach / radius;
  int status = integrate((gsl_function){variance_rate, &of}, reach, size, space, variance);
  if (status == GSL_SUCCESS)
    status = integrate((gsl_function){derivative_rate, &of}, reach, size, space, derivative);
  gsl_integration_workspace_free(space);
  return status ? ew_fail_gsl(error, status, "the integral of sigma(M)") : EW_OK;
}

ew_status ew_sigma_integrate(const ew_spectrum *spectrum, double mass, double *sigma, double *slope, ew_error *error) {
  double radius = spectrum->filter->radius(ew_mass_inside(mass), ew_matter_density(spectrum->cosmology));
  double variance, derivative;
  ew_status status = ew_variance_integrate(spectrum, spectrum->filter, radius, &variance, &derivative, error);
  if (status != EW_OK)
    return status;
  *sigma = sqrt(variance);
  *slope = derivative / variance / 6.0;
  return EW_OK;
}

/* ----------------------------------------------------------------------------------------------------------- table */

/* Node j stands at k = EW_LOWEST_WAVENUMBER exp(j step), and at kR with R the radius of the lowest mass. */
typedef struct {
  size_t count;
  double step;        /* in ln k */
  double *power;      /* k^3 P/(2 pi^2) times the step */
  double *window;     /* W^2(kR) */
  double *derivative; /* d W^2/d ln(kR) */
} nodes;

static void nodes_clear(nodes *at) {
  free(at->power);
  free(at->window);
  free(at->derivative);
}

static ew_status nodes_make(nodes *at, double radius, double reach, double step, ew_error *error) {
  size_t count = (size_t)(log(reach / (radius * EW_LOWEST_WAVENUMBER)) / step) + 1;
  *at = (nodes){.count = count,
                .step = step,
                .power = calloc(count, sizeof(double)),
                .window = calloc(count, sizeof(double)),
                .derivative = calloc(count, sizeof(double))};
  return at->power && at->window && at->derivative ? EW_OK : ew_fail_memory(error, "the table of sigma(M)");
}

static ew_status refuse(const ew_spectrum *spectrum, double wavenumber, ew_error *error) {
  const ew_cosmology_parameters *p = ew_cosmology_get(spectrum->cosmology);
  return ew_fail(error, EW_REFUSED,
                 "spectrum.transfer = %s has no value at k = %g/Mpc with cosmology.omega_baryon = %g of "
                 "cosmology.omega_matter = %g",
                 spectrum->transfer->label->name, wavenumber, p->omega_baryon, p->omega_matter);
}

static ew_status nodes_fill(nodes *at, const ew_spectrum *spectrum, double radius, ew_error *error) {
  for (size_t j = 0; j < at->count; j++) {
    double k = EW_LOWEST_WAVENUMBER * exp((double)j * at->step);
    at->power[j] = ew_power_per_log(spectrum, k) * at->step;
    at->window[j] = square_window(spectrum->filter, k * radius);
    at->derivative[j] = square_window_derivative(spectrum->filter, k * radius);
    if (!isfinite(at->power[j]))
      return refuse(spectrum, k, error);
  }
  return EW_OK;
}

/* The sum of power times a window that is `shift` nodes wider. */
static double correlate(const nodes *at, const double *window, size_t shift) {
  double sum = 0.0;
  for (size_t j = 0; j + shift < at->count; j++)
    sum += at->power[j] * window[j + shift];
  return sum;
}

static void fill_curve(ew_curve *curve, const nodes *at) {
  for (int i = 0; i <= MASS_CELLS; i++) {
    size_t shift = (size_t)i * NODES_PER_CELL;
    double sigma = sqrt(correlate(at, at->window, shift));
    /* d sigma/d ln M = (d sigma^2/d ln R)/(6 sigma) */
    ew_curve_set(curve, i, sigma, correlate(at, at->derivative, shift) / (6.0 * sigma));
  }
}

ew_status ew_variance_tabulate(ew_spectrum *spectrum, ew_error *error) {
  ew_curve *curve = &spectrum->sigma;
  ew_status status = ew_curve_make(curve, log(EW_LOWEST_MASS), log(EW_HIGHEST_MASS), MASS_CELLS, error);
  if (status != EW_OK)
    return status;
  double radius = spectrum->filter->radius(EW_LOWEST_MASS, ew_matter_density(spectrum->cosmology));
  nodes at;
  status = nodes_make(&at, radius, spectrum->filter->reach, curve->step / (3 * NODES_PER_CELL), error);
  if (status == EW_OK)
    status = nodes_fill(&at, spectrum, radius, error);
  if (status == EW_OK)
    fill_curve(curve, &at);
  nodes_clear(&at);
  return status;
}

double ew_sigma(const ew_spectrum *spectrum, double mass) {
  return ew_curve_at(&spectrum->sigma, log(mass));
}

double ew_sigma_slope(const ew_spectrum *spectrum, double mass) {
  double log_mass = log(mass);
  return ew_curve_derivative(&spectrum->sigma, log_mass) / ew_curve_at(&spectrum->sigma, log_mass);
}
