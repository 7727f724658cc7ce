/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * By a given age all stars above the one that is just dying have died. Those below supernova_mass have become white
 * dwarfs whose mass is linear in that at birth, so the mass left in them and the mass returned are plain combinations
 * of the number and the mass of the IMF between the two: no integral needs to be done numerically. The grid has nodes
 * between the metallicities of the lifetimes too, since near 1 Gyr these depend on metallicity in jumps. */
#include "elfinwood/stars.h"
#include "stars/handle.h"

#include <math.h>

#define FIRST_AGE 1e-3 /* Gyr */
#define LAST_AGE  20.0
enum { AGES = 500, NODES_PER_STEP = 4, METALLICITIES = (EW_LIFETIME_METALLICITIES - 1) * NODES_PER_STEP + 1 };

static void fill_column(ew_stars *stars, size_t z, double metal_fraction) {
  ew_table *returned = &stars->mass_return.returned.by_age[z];
  ew_table *white_dwarfs = &stars->mass_return.white_dwarfs.by_age[z];
  for (size_t i = 0; i < AGES; i++) {
    double dying = ew_mass_dying_at(stars, exp(ew_table_position(returned, i)), metal_fraction);
    double number = ew_imf_number(dying, stars->parameters.supernova_mass);
    double mass = ew_imf_mass(dying, stars->parameters.supernova_mass);
    white_dwarfs->value[i] = EW_WHITE_DWARF_SLOPE * mass + EW_WHITE_DWARF_FLOOR * number;
    returned->value[i] = mass - white_dwarfs->value[i];
  }
}

static void choose_metals(double metal_fraction[METALLICITIES]) {
  for (size_t z = 0; z < METALLICITIES - 1; z++) {
    double low = ew_lifetime_metals[z / NODES_PER_STEP], high = ew_lifetime_metals[z / NODES_PER_STEP + 1];
    metal_fraction[z] = low * pow(high / low, (double)(z % NODES_PER_STEP) / NODES_PER_STEP);
  }
  metal_fraction[METALLICITIES - 1] = ew_lifetime_metals[EW_LIFETIME_METALLICITIES - 1];
}

ew_status ew_mass_return_fill(ew_stars *stars, ew_error *error) {
  double metals[METALLICITIES];
  choose_metals(metals);
  ew_mass_return *tables = &stars->mass_return;
  ew_status status = ew_age_grid_make(&tables->returned, metals, METALLICITIES, FIRST_AGE, LAST_AGE, AGES, error);
  if (status == EW_OK)
    status = ew_age_grid_make(&tables->white_dwarfs, metals, METALLICITIES, FIRST_AGE, LAST_AGE, AGES, error);
  for (size_t z = 0; status == EW_OK && z < METALLICITIES; z++)
    fill_column(stars, z, metals[z]);
  return status;
}

void ew_mass_return_clear(ew_mass_return *tables) {
  ew_age_grid_clear(&tables->returned);
  ew_age_grid_clear(&tables->white_dwarfs);
}

double ew_returned_mass(const ew_stars *stars, double age, double metal_fraction) {
  return ew_age_grid_at(&stars->mass_return.returned, age, metal_fraction);
}

double ew_white_dwarf_mass(const ew_stars *stars, double age, double metal_fraction) {
  return ew_age_grid_at(&stars->mass_return.white_dwarfs, age, metal_fraction);
}
