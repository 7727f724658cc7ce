/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Rates of splits and smooth loss by Parkinson, Cole & Helly 2008, MNRAS 383, 557, eqs 2-4, and the tables along the
 * drift. Integrals use Gauss-Legendre rules over panels short against the scale on which the integrand bends. */
#include "tree/rates.h"

#include <gsl/gsl_integration.h>
#include <math.h>

enum { REDSHIFT_POINTS = 16384, INVERSE_POINTS = 8192, ENVELOPE_SAMPLES = 32, RULE = 8 };
#define MASS_STEP       0.004 /* in ln M: linear interpolation of ln S is good to 1e-7 */
#define PANEL           0.7   /* in ln M: the split density bends on the scale of ln 2 */
#define ENVELOPE_MARGIN 1e-3  /* covers interpolation between the samples */

typedef struct {
  const gsl_integration_glfixed_table *rule;
  size_t points;
} quadrature;

/* One panel of `integrand` over [from, to]. */
#define PANEL_SUM(sum, quad, from, to, x, expression)                                                                  \
  for (size_t i_ = 0; i_ < (quad)->points; i_++) {                                                                     \
    double x, weight_;                                                                                                 \
    gsl_integration_glfixed_point((from), (to), i_, &x, &weight_, (quad)->rule);                                       \
    (sum) += weight_ * (expression);                                                                                   \
  }

double ew_log_split_density(const ew_split_tables *t, double log_mass, double log_share) {
  double smaller = log_mass + log_share;
  double gap = ew_table_at(&t->variance, smaller) - ew_table_at(&t->variance, log_mass);
  return ew_table_at(&t->log_weight, smaller) - 2.0 * log_share - 1.5 * log(gap);
}

/* What multiplies the density: sqrt(2/pi) G0 sigma2^-(gamma1 + gamma2). */
static double rate_factor(const ew_split_tables *t, double log_mass) {
  const ew_tree_parameters *p = &t->parameters;
  double variance = ew_table_at(&t->variance, log_mass);
  return sqrt(2.0 / EW_PI) * p->split_amplitude * pow(variance, -0.5 * (p->split_mass_slope + p->split_peak_slope));
}

static double split_rate(const ew_split_tables *t, const quadrature *quad, double log_mass) {
  double low = t->log_resolution - log_mass, high = -log(2.0);
  if (!(low < high))
    return 0.0;
  size_t panels = (size_t)ceil((high - low) / PANEL);
  double width = (high - low) / (double)panels, sum = 0.0;
  for (size_t k = 0; k < panels; k++) {
    double from = low + width * (double)k;
    PANEL_SUM(sum, quad, from, from + width, y, exp(ew_log_split_density(t, log_mass, y) + y));
  }
  return rate_factor(t, log_mass) * sum;
}

/* J(u) = int_0^u (1 + 1/x^2)^(gamma/2) dx. Below 1 with v = x^(1 - gamma), which takes the singularity out; above 1
 * with w = 1/x and the leading term apart. */
static double smooth_integral(const quadrature *quad, double u, double gamma) {
  double power = 1.0 / (1.0 - gamma), top = pow(fmin(u, 1.0), 1.0 - gamma), sum = 0.0, tail = 0.0;
  PANEL_SUM(sum, quad, 0.0, top, v, pow(1.0 + pow(v, 2.0 * power), 0.5 * gamma));
  if (u <= 1.0)
    return power * sum;
  PANEL_SUM(tail, quad, 1.0 / u, 1.0, w, (pow(1.0 + w * w, 0.5 * gamma) - 1.0) / (w * w));
  return power * sum + (u - 1.0) + tail;
}

static double smooth_rate(const ew_split_tables *t, const quadrature *quad, double log_mass) {
  const ew_tree_parameters *p = &t->parameters;
  double variance = ew_table_at(&t->variance, log_mass);
  double gap = ew_table_at(&t->variance, t->log_resolution) - variance;
  double integral = smooth_integral(quad, sqrt(variance / gap), p->split_mass_slope);
  return sqrt(2.0 / EW_PI) * p->split_amplitude * pow(variance, -0.5 * (1.0 + p->split_peak_slope)) * integral;
}

typedef double (*rate_function)(const ew_split_tables *, const quadrature *, double);

static double rate_alone(const ew_split_tables *tables, double log_mass, rate_function rate) {
  gsl_integration_glfixed_table *rule = gsl_integration_glfixed_table_alloc(RULE);
  if (!rule)
    return NAN;
  double value = rate(tables, &(quadrature){rule, RULE}, log_mass);
  gsl_integration_glfixed_table_free(rule);
  return value;
}

double ew_split_rate_on_clock(const ew_split_tables *tables, double log_mass) {
  return rate_alone(tables, log_mass, split_rate);
}

double ew_smooth_rate_on_clock(const ew_split_tables *tables, double log_mass) {
  return rate_alone(tables, log_mass, smooth_rate);
}

double ew_clock_of_barrier(const ew_split_tables *tables, double barrier) {
  double power = 1.0 + tables->parameters.split_peak_slope;
  return pow(barrier, power) / power;
}

double ew_barrier_of_clock(const ew_split_tables *tables, double clock) {
  double power = 1.0 + tables->parameters.split_peak_slope;
  return pow(power * clock, 1.0 / power);
}

static ew_status make_mass_tables(ew_split_tables *t, ew_error *error) {
  size_t count = (size_t)ceil((t->log_largest - t->log_resolution) / MASS_STEP) + 2;
  ew_table *tables[] = {&t->variance, &t->log_weight, &t->drift, &t->hazard, &t->envelope_slope, &t->log_envelope};
  for (size_t i = 0; i < sizeof tables / sizeof tables[0]; i++) {
    ew_status status = ew_table_make(tables[i], t->log_resolution, t->log_largest, count, error);
    if (status != EW_OK)
      return status;
  }
  return EW_OK;
}

static ew_status fill_variance(ew_split_tables *t, const ew_spectrum *spectrum, ew_error *error) {
  for (size_t i = 0; i < t->variance.count; i++) {
    double mass = exp(ew_table_position(&t->variance, i));
    double sigma = ew_sigma(spectrum, mass), slope = -ew_sigma_slope(spectrum, mass);
    if (!(sigma > 0.0 && slope > 0.0))
      return ew_fail(error, EW_FAILED, "sigma(M) does not fall with mass at %g Msun: no tree can be grown there", mass);
    t->variance.value[i] = sigma * sigma;
    t->log_weight.value[i] = log(slope) + (2.0 + t->parameters.split_mass_slope) * log(sigma);
  }
  return EW_OK;
}

static void fill_drift(ew_split_tables *t, const quadrature *quad, const quadrature *cell) {
  for (size_t i = 1; i < t->drift.count; i++) {
    double from = ew_table_position(&t->drift, i - 1), to = ew_table_position(&t->drift, i);
    double time = 0.0, splits = 0.0;
    PANEL_SUM(time, cell, from, to, y, 1.0 / smooth_rate(t, quad, y));
    PANEL_SUM(splits, cell, from, to, z, split_rate(t, quad, z) / smooth_rate(t, quad, z));
    t->drift.value[i] = t->drift.value[i - 1] + time;
    t->hazard.value[i] = t->hazard.value[i - 1] + splits;
  }
}

/* The envelope's slope joins the density at both ends of the range of q; its height is the highest ratio found between.
 */
static void fill_envelope(ew_split_tables *t) {
  double lowest = t->log_resolution + log(2.0) + 1e-4;
  for (size_t i = 0; i < t->log_envelope.count; i++) {
    double log_mass = fmax(ew_table_position(&t->log_envelope, i), fmin(lowest, t->log_largest));
    double low = t->log_resolution - log_mass, high = -log(2.0);
    double at_low = ew_log_split_density(t, log_mass, low), at_high = ew_log_split_density(t, log_mass, high);
    double slope = (at_high - at_low) / (high - low), highest = -INFINITY;
    for (int k = 0; k <= ENVELOPE_SAMPLES; k++) {
      double y = low + (high - low) * (double)k / ENVELOPE_SAMPLES;
      highest = fmax(highest, ew_log_split_density(t, log_mass, y) - slope * y);
    }
    t->envelope_slope.value[i] = slope;
    t->log_envelope.value[i] = highest + ENVELOPE_MARGIN;
  }
}

/* Inverts a table that rises along its grid: wanted[i] is the place at which transform(table) reaches grid point i. */
static ew_status invert(const ew_table *table, double (*transform)(double), ew_table *inverse, ew_error *error) {
  double top = transform(table->value[table->count - 1]);
  ew_status status = ew_table_make(inverse, 0.0, fmax(top, 1e-12), INVERSE_POINTS, error);
  if (status != EW_OK)
    return status;
  size_t cell = 0;
  for (size_t i = 0; i < inverse->count; i++) {
    double wanted = ew_table_position(inverse, i);
    while (cell + 2 < table->count && transform(table->value[cell + 1]) <= wanted)
      cell++;
    double low = transform(table->value[cell]), high = transform(table->value[cell + 1]);
    double part = high > low ? fmin(fmax((wanted - low) / (high - low), 0.0), 1.0) : 1.0;
    inverse->value[i] = ew_table_position(table, cell) + part * table->step;
  }
  return EW_OK;
}

static double identity(double x) {
  return x;
}

static ew_status fill_redshift(ew_split_tables *t, const ew_cosmology *cosmology, ew_error *error) {
  t->latest_clock = ew_clock_of_barrier(t, ew_barrier(cosmology, 0.0));
  t->highest_clock = ew_clock_of_barrier(t, ew_barrier(cosmology, t->parameters.highest_redshift));
  ew_status status = ew_table_make(&t->redshift, t->latest_clock, t->highest_clock, REDSHIFT_POINTS, error);
  if (status != EW_OK)
    return status;
  for (size_t i = 0; i < t->redshift.count; i++)
    t->redshift.value[i] =
        ew_redshift_of_barrier(cosmology, ew_barrier_of_clock(t, ew_table_position(&t->redshift, i)));
  return EW_OK;
}

static ew_status fill_tables(ew_split_tables *t, const ew_spectrum *spectrum, const quadrature *quad,
                             const quadrature *cell, ew_error *error) {
  ew_status status = make_mass_tables(t, error);
  if (status == EW_OK)
    status = fill_variance(t, spectrum, error);
  if (status != EW_OK)
    return status;
  fill_envelope(t);
  fill_drift(t, quad, cell);
  status = invert(&t->drift, identity, &t->mass_of_drift, error);
  if (status == EW_OK)
    status = invert(&t->hazard, log1p, &t->mass_of_hazard, error);
  if (status == EW_OK)
    status = fill_redshift(t, ew_spectrum_cosmology(spectrum), error);
  return status;
}

ew_status ew_split_tables_make(ew_split_tables *tables, const ew_spectrum *spectrum,
                               const ew_tree_parameters *parameters, double largest_mass, ew_error *error) {
  *tables = (ew_split_tables){.parameters = *parameters,
                              .log_resolution = log(parameters->resolution_mass),
                              .log_largest = log(largest_mass) + MASS_STEP};
  gsl_integration_glfixed_table *rule = gsl_integration_glfixed_table_alloc(RULE);
  gsl_integration_glfixed_table *short_rule = gsl_integration_glfixed_table_alloc(2);
  ew_status status = EW_FAILED;
  if (rule && short_rule)
    status = fill_tables(tables, spectrum, &(quadrature){rule, RULE}, &(quadrature){short_rule, 2}, error);
  else
    ew_fail_memory(error, "the split tables");
  if (rule)
    gsl_integration_glfixed_table_free(rule);
  if (short_rule)
    gsl_integration_glfixed_table_free(short_rule);
  if (status != EW_OK)
    ew_split_tables_clear(tables);
  return status;
}

void ew_split_tables_clear(ew_split_tables *t) {
  ew_table *tables[] = {&t->variance,       &t->log_weight,     &t->drift,        &t->hazard,  &t->mass_of_drift,
                        &t->mass_of_hazard, &t->envelope_slope, &t->log_envelope, &t->redshift};
  for (size_t i = 0; i < sizeof tables / sizeof tables[0]; i++)
    ew_table_clear(tables[i]);
}
