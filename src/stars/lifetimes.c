/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * How long stars live. Log age is bilinear in log mass and log metallicity between the entries of Portinari et al.
 * 1998, and falls with mass everywhere, so the age can be inverted exactly: at a given metallicity it is a chain of
 * power laws. Below 0.6 Msun the lowest one goes on. */
#include "stars/lifetimes.h"

#include "elfinwood/stars.h"
#include "stars/handle.h"
#include "stars/locate.h"

#include <math.h>

#define MASS_LOW  0.1
#define MASS_HIGH 120.0
#define YEAR      1e-9 /* Gyr */

const double ew_lifetime_metals[EW_LIFETIME_METALLICITIES] = {0.0004, 0.004, 0.008, 0.02, 0.05};

static const struct {
  double mass;
  double age[EW_LIFETIME_METALLICITIES];
} rows[EW_LIFETIME_MASSES] = {
#include "stars/tables/lifetimes.inc"
};

void ew_lifetimes_fill(ew_lifetimes *lifetimes) {
  for (int z = 0; z < EW_LIFETIME_METALLICITIES; z++) {
    lifetimes->log_metals[z] = log(ew_lifetime_metals[z]);
    for (int i = 0; i < EW_LIFETIME_MASSES; i++)
      lifetimes->log_age[z][i] = log(rows[i].age[z] * YEAR);
  }
  for (int i = 0; i < EW_LIFETIME_MASSES; i++)
    lifetimes->log_mass[i] = log(rows[i].mass);
}

/* Log age against log mass at one metallicity, between two columns of the table. */
typedef struct {
  const double *poor, *rich;
  double weight;
} column;

static column column_at(const ew_lifetimes *lifetimes, double metal_fraction) {
  ew_place place = {0, 0.0};
  if (metal_fraction > ew_lifetime_metals[0])
    place = ew_locate(lifetimes->log_metals, EW_LIFETIME_METALLICITIES, log(metal_fraction));
  return (column){lifetimes->log_age[place.index], lifetimes->log_age[place.index + 1], place.weight};
}

static double node(const column *of, size_t i) {
  return ew_between(of->poor[i], of->rich[i], of->weight);
}

double ew_lifetime(const ew_stars *stars, double mass, double metal_fraction) {
  const ew_lifetimes *lifetimes = &stars->lifetimes;
  double log_mass = log(fmin(fmax(mass, MASS_LOW), MASS_HIGH));
  column at = column_at(lifetimes, metal_fraction);
  ew_place place = ew_locate(lifetimes->log_mass, EW_LIFETIME_MASSES, log_mass);
  size_t i = place.index;
  double weight = (log_mass - lifetimes->log_mass[i]) / (lifetimes->log_mass[i + 1] - lifetimes->log_mass[i]);
  return exp(ew_between(node(&at, i), node(&at, i + 1), weight));
}

/* The segment of the chain that holds this log age: the last node that lives longer, or the end segments. */
static size_t segment_of_age(const column *at, double log_age) {
  size_t low = 0, high = EW_LIFETIME_MASSES - 1;
  while (high - low > 1) {
    size_t middle = (low + high) / 2;
    if (node(at, middle) >= log_age)
      low = middle;
    else
      high = middle;
  }
  return low;
}

double ew_mass_dying_at(const ew_stars *stars, double age, double metal_fraction) {
  if (!(age > 0.0))
    return MASS_HIGH;
  const ew_lifetimes *lifetimes = &stars->lifetimes;
  column at = column_at(lifetimes, metal_fraction);
  double log_age = log(age);
  size_t i = segment_of_age(&at, log_age);
  double weight = (log_age - node(&at, i)) / (node(&at, i + 1) - node(&at, i));
  double mass = exp(ew_between(lifetimes->log_mass[i], lifetimes->log_mass[i + 1], weight));
  return fmin(fmax(mass, MASS_LOW), MASS_HIGH);
}

double ew_lifetime_metal_free(const ew_stars *stars, double mass) {
  if (!(mass >= 5.0))
    return ew_lifetime(stars, mass, 0.0);
  double x = log10(fmin(mass, 500.0));
  return YEAR * pow(10.0, 9.785 + x * (-3.759 + x * (1.413 - x * 0.186)));
}

double ew_living_number(const ew_stars *stars, double age, double metal_fraction) {
  return ew_imf_number(EW_IMF_LOW, ew_mass_dying_at(stars, age, metal_fraction));
}
