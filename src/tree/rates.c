/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Rates of splits and smooth loss by Parkinson, Cole & Helly 2008, MNRAS 383, 557, and the tables along the drift.
 * Integrals use Gauss-Legendre rules over panels short against the scale on which the integrand bends. */
#include "tree/rates.h"

#include <math.h>

enum { REDSHIFT_POINTS = 16384, ENVELOPE_SAMPLES = 32, RULE = 8, CELL_RULE = 2 };
#define MASS_STEP       0.004 /* in ln M: linear interpolation of ln S is good to 1e-7 */
#define PANEL           0.7   /* in ln M: the split density bends on the scale of ln 2 */
#define ENVELOPE_MARGIN 1e-3  /* covers interpolation in mass and between the samples */

/* Adds to `sum` the integral of `expression` in x over one panel [from, to]. */
#define PANEL_SUM(sum, rule, points, from, to, x, expression)                                                          \
  for (size_t i_ = 0; i_ < (points); i_++) {                                                                           \
    double x, weight_;                                                                                                 \
    gsl_integration_glfixed_point((from), (to), i_, &x, &weight_, (rule));                                             \
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

double ew_split_rate_on_clock(const ew_split_tables *t, double log_mass) {
  double low = t->log_resolution - log_mass, high = -log(2.0);
  if (!(low < high))
    return 0.0;
  size_t panels = (size_t)ceil((high - low) / PANEL);
  double width = (high - low) / (double)panels, sum = 0.0;
  for (size_t k = 0; k < panels; k++) {
    double from = low + width * (double)k;
    PANEL_SUM(sum, t->rule, RULE, from, from + width, y, exp(ew_log_split_density(t, log_mass, y) + y));
  }
  return rate_factor(t, log_mass) * sum;
}

/* J(u) = int_0^u (1 + 1/x^2)^(gamma/2) dx. Below 1 with v = x^(1 - gamma), which takes the singularity out; above 1
 * with w = 1/x and the leading term apart. */
static double smooth_integral(const gsl_integration_glfixed_table *rule, double u, double gamma) {
  double power = 1.0 / (1.0 - gamma), top = pow(fmin(u, 1.0), 1.0 - gamma), sum = 0.0, tail = 0.0;
  PANEL_SUM(sum, rule, RULE, 0.0, top, v, pow(1.0 + pow(v, 2.0 * power), 0.5 * gamma));
  if (u <= 1.0)
    return power * sum;
  PANEL_SUM(tail, rule, RULE, 1.0 / u, 1.0, w, (pow(1.0 + w * w, 0.5 * gamma) - 1.0) / (w * w));
  return power * sum + (u - 1.0) + tail;
}

double ew_smooth_rate_on_clock(const ew_split_tables *t, double log_mass) {
  const ew_tree_parameters *p = &t->parameters;
  double variance = ew_table_at(&t->variance, log_mass);
  double gap = ew_table_at(&t->variance, t->log_resolution) - variance;
  double integral = smooth_integral(t->rule, sqrt(variance / gap), p->split_mass_slope);
  return sqrt(2.0 / EW_PI) * p->split_amplitude * pow(variance, -0.5 * (1.0 + p->split_peak_slope)) * integral;
}

double ew_clock_of_barrier(const ew_split_tables *tables, double barrier) {
  double power = 1.0 + tables->parameters.split_peak_slope;
  return pow(barrier, power) / power;
}

double ew_barrier_of_clock(const ew_split_tables *tables, double clock) {
  double power = 1.0 + tables->parameters.split_peak_slope;
  return pow(power * clock, 1.0 / power);
}

double ew_table_inverse(const ew_table *rising, double from, double wanted) {
  const double *value = rising->value;
  double place = ceil((from - rising->first) * rising->inverse_step), last = (double)(rising->count - 1);
  size_t high = (size_t)fmin(fmax(place, 1.0), last), low = high - 1;
  for (size_t stride = 2; low > 0 && value[low] > wanted; stride *= 2) {
    high = low;
    low = low > stride ? low - stride : 0;
  }
  while (high - low > 1) {
    size_t middle = low + (high - low) / 2;
    if (value[middle] > wanted)
      high = middle;
    else
      low = middle;
  }
  double part = value[high] > value[low] ? (wanted - value[low]) / (value[high] - value[low]) : 0.0;
  return fmin(ew_table_position(rising, low) + fmax(part, 0.0) * rising->step, from);
}

double ew_clock_of_redshift(const ew_split_tables *t, double redshift) {
  return ew_table_inverse(&t->redshift, ew_table_position(&t->redshift, t->redshift.count - 1), redshift);
}

/* The step does not depend on the largest mass, and the redshifts below not on the highest followed: so neither does
 * any tree. */
static ew_status make_mass_tables(ew_split_tables *t, double largest_mass, ew_error *error) {
  size_t count = (size_t)ceil((log(largest_mass) - t->log_resolution) / MASS_STEP) + 2;
  ew_table *tables[] = {&t->variance, &t->log_weight, &t->drift, &t->hazard, &t->envelope_slope, &t->log_envelope};
  for (size_t i = 0; i < sizeof tables / sizeof tables[0]; i++) {
    double last = t->log_resolution + MASS_STEP * (double)(count - 1);
    ew_status status = ew_table_make(tables[i], t->log_resolution, last, count, error);
    if (status != EW_OK)
      return status;
    tables[i]->step = MASS_STEP;
    tables[i]->inverse_step = 1.0 / MASS_STEP;
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

static void fill_drift(ew_split_tables *t, const gsl_integration_glfixed_table *cell_rule) {
  for (size_t i = 1; i < t->drift.count; i++) {
    double from = ew_table_position(&t->drift, i - 1), to = ew_table_position(&t->drift, i);
    double time = 0.0, splits = 0.0;
    PANEL_SUM(time, cell_rule, CELL_RULE, from, to, y, 1.0 / ew_smooth_rate_on_clock(t, y));
    PANEL_SUM(splits, cell_rule, CELL_RULE, from, to, z, ew_split_rate_on_clock(t, z) / ew_smooth_rate_on_clock(t, z));
    t->drift.value[i] = t->drift.value[i - 1] + time;
    t->hazard.value[i] = t->hazard.value[i - 1] + splits;
  }
}

/* The highest that ln density - slope ln q gets between two shares: a scan of the range, then of what is next to the
 * best. */
static double highest_excess(const ew_split_tables *t, double log_mass, double slope, double low, double high) {
  double highest = -INFINITY, from = low, to = high;
  for (int scan = 0; scan < 2; scan++) {
    double step = (to - from) / ENVELOPE_SAMPLES, best = from;
    for (int k = 0; k <= ENVELOPE_SAMPLES; k++) {
      double share = from + step * (double)k, excess = ew_log_split_density(t, log_mass, share) - slope * share;
      if (excess > highest) {
        highest = excess;
        best = share;
      }
    }
    from = fmax(best - step, low);
    to = fmin(best + step, high);
  }
  return highest;
}

/* The envelope's slope joins the density at both ends of the range of q. Below twice the resolution, where nothing
 * splits, it is that just above. */
static void fill_envelope(ew_split_tables *t) {
  double lowest = t->log_resolution + log(2.0) + 1e-4;
  double largest = ew_table_position(&t->log_envelope, t->log_envelope.count - 1);
  for (size_t i = 0; i < t->log_envelope.count; i++) {
    double log_mass = fmax(ew_table_position(&t->log_envelope, i), fmin(lowest, largest));
    double low = t->log_resolution - log_mass, high = -log(2.0);
    double at_low = ew_log_split_density(t, log_mass, low), at_high = ew_log_split_density(t, log_mass, high);
    double slope = (at_high - at_low) / (high - low);
    t->envelope_slope.value[i] = slope;
    t->log_envelope.value[i] = highest_excess(t, log_mass, slope, low, high) + ENVELOPE_MARGIN;
  }
}

static ew_status fill_redshift(ew_split_tables *t, const ew_cosmology *cosmology, ew_error *error) {
  double latest_clock = ew_clock_of_barrier(t, ew_barrier(cosmology, 0.0));
  double earliest_clock = ew_clock_of_barrier(t, ew_barrier(cosmology, EW_HIGHEST_REDSHIFT));
  ew_status status = ew_table_make(&t->redshift, latest_clock, earliest_clock, REDSHIFT_POINTS, error);
  if (status != EW_OK)
    return status;
  for (size_t i = 0; i < t->redshift.count; i++)
    t->redshift.value[i] =
        ew_redshift_of_barrier(cosmology, ew_barrier_of_clock(t, ew_table_position(&t->redshift, i)));
  t->highest_clock = ew_clock_of_redshift(t, t->parameters.highest_redshift);
  return EW_OK;
}

static ew_status fill_tables(ew_split_tables *t, const ew_spectrum *spectrum, double largest_mass,
                             const gsl_integration_glfixed_table *cell_rule, ew_error *error) {
  ew_status status = make_mass_tables(t, largest_mass, error);
  if (status == EW_OK)
    status = fill_variance(t, spectrum, error);
  if (status != EW_OK)
    return status;
  fill_envelope(t);
  fill_drift(t, cell_rule);
  return fill_redshift(t, ew_spectrum_cosmology(spectrum), error);
}

ew_status ew_split_tables_make(ew_split_tables *tables, const ew_spectrum *spectrum,
                               const ew_tree_parameters *parameters, double largest_mass, ew_error *error) {
  *tables = (ew_split_tables){.parameters = *parameters,
                              .log_resolution = log(parameters->resolution_mass),
                              .rule = gsl_integration_glfixed_table_alloc(RULE)};
  gsl_integration_glfixed_table *cell_rule = gsl_integration_glfixed_table_alloc(CELL_RULE);
  ew_status status = tables->rule && cell_rule ? fill_tables(tables, spectrum, largest_mass, cell_rule, error)
                                               : ew_fail_memory(error, "the split tables");
  if (cell_rule)
    gsl_integration_glfixed_table_free(cell_rule);
  if (status != EW_OK)
    ew_split_tables_clear(tables);
  return status;
}

void ew_split_tables_clear(ew_split_tables *t) {
  ew_table *tables[] = {&t->variance,       &t->log_weight,   &t->drift,   &t->hazard,
                        &t->envelope_slope, &t->log_envelope, &t->redshift};
  for (size_t i = 0; i < sizeof tables / sizeof tables[0]; i++)
    ew_table_clear(tables[i]);
  if (t->rule)
    gsl_integration_glfixed_table_free(t->rule);
  t->rule = NULL;
}
