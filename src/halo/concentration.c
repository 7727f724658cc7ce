/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Concentration of virial mass, tabulated once and looked up in every halo step.
 *
 * The relation is known for M200c; for each virial mass on the grid the M200c that converts to it is found by
 * iteration. ln c is held on a uniform grid in ln M and ln(1+z) and interpolated linearly in both. */
#include "halo/diemer_joyce.h"

#include <math.h>
#include <stdlib.h>

#define LOWEST_MASS      1e4 /* Msun */
#define HIGHEST_MASS     1e16
#define HIGHEST_REDSHIFT 40.0

/* Eight points per decade and steps of 0.08 in ln(1+z): good to 0.25 per cent. */
enum { MASSES = 97, EPOCHS = 48 };

#define MASS_TOLERANCE 1e-8 /* of the virial mass: 1e-9 in concentration */
#define MASS_LIMIT     50

/* A uniform axis of the grid. */
typedef struct {
  double first;
  double inverse_step;
  size_t count;
} grid_axis;

struct ew_concentration {
  grid_axis mass;                    /* ln M */
  grid_axis epoch;                   /* ln(1+z) */
  double log_value[EPOCHS * MASSES]; /* ln c_vir at [epoch * MASSES + mass] */
};

static grid_axis axis_between(double first, double last, size_t count) {
  return (grid_axis){.first = first, .inverse_step = (double)(count - 1) / (last - first), .count = count};
}

static double axis_value(const grid_axis *axis, size_t index) {
  return axis->first + (double)index / axis->inverse_step;
}

/* The grid interval that holds x, through *index, and the weight of its upper end. Outside (and for NaN), an end of the
 * axis. */
static inline double axis_place(const grid_axis *axis, double x, size_t *index) {
  double place = (x - axis->first) * axis->inverse_step;
  *index = 0;
  if (!(place > 0.0))
    return 0.0;
  *index = axis->count - 2;
  if (place >= (double)(axis->count - 1))
    return 1.0;
  *index = (size_t)place;
  return place - (double)*index;
}

/* ln c_vir of a virial mass. The ratio of the two masses hardly depends on mass, so scaling M200c by the miss gains two
 * digits at each turn; *ratio = M200c/M_vir is the first guess and the answer. */
static ew_status log_virial_concentration(const ew_diemer_joyce_epoch *epoch, double mass, double overdensity,
                                          double *ratio, double *log_c, ew_error *error) {
  for (int i = 0; i < MASS_LIMIT; i++) {
    ew_mass_conversion to_virial = {.mass = *ratio * mass, .overdensity = 200.0, .wanted = overdensity};
    ew_status status = ew_diemer_joyce_concentration(epoch, to_virial.mass, &to_virial.concentration, error);
    if (status != EW_OK)
      return status;
    double c;
    double miss = ew_convert_mass(&to_virial, &c) / mass;
    *ratio /= miss;
    *log_c = log(c);
    if (fabs(miss - 1.0) < MASS_TOLERANCE)
      return EW_OK;
  }
  return ew_fail(error, EW_FAILED, "concentration of M_vir = %g Msun does not converge", mass);
}

static ew_status fill_epoch(ew_concentration *table, const ew_spectrum *spectrum, size_t index, ew_error *error) {
  double redshift = expm1(axis_value(&table->epoch, index));
  double overdensity = ew_virial_overdensity(ew_spectrum_cosmology(spectrum), redshift);
  ew_diemer_joyce_epoch epoch = ew_diemer_joyce_at(spectrum, redshift);
  double ratio = 1.0;
  for (size_t i = 0; i < MASSES; i++) {
    ew_status status = log_virial_concentration(&epoch, exp(axis_value(&table->mass, i)), overdensity, &ratio,
                                                &table->log_value[index * MASSES + i], error);
    if (status != EW_OK)
      return status;
  }
  return EW_OK;
}

ew_status ew_concentration_new(ew_concentration **concentration, const ew_spectrum *spectrum, ew_error *error) {
  *concentration = NULL;
  ew_concentration *table = malloc(sizeof *table);
  if (!table)
    return ew_fail_memory(error, "the table of concentrations");
  table->mass = axis_between(log(LOWEST_MASS), log(HIGHEST_MASS), MASSES);
  table->epoch = axis_between(0.0, log1p(HIGHEST_REDSHIFT), EPOCHS);
  for (size_t i = 0; i < EPOCHS; i++) {
    ew_status status = fill_epoch(table, spectrum, i, error);
    if (status != EW_OK) {
      free(table);
      return status;
    }
  }
  *concentration = table;
  return EW_OK;
}

void ew_concentration_free(ew_concentration *concentration) {
  free(concentration);
}

double ew_concentration_at(const ew_concentration *concentration, double mass, double redshift) {
  size_t i, k;
  double u = axis_place(&concentration->mass, log(mass), &i);
  double w = axis_place(&concentration->epoch, log(1.0 + redshift), &k);
  const double *below = &concentration->log_value[k * MASSES + i];
  const double *above = below + MASSES;
  double early = above[0] + u * (above[1] - above[0]);
  double late = below[0] + u * (below[1] - below[0]);
  return exp(late + w * (early - late));
}
