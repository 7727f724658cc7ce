/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The fate of a star by its birth mass, and the sums of deaths that the averages are made of. */
#include "stars/deaths.h"

#include "elfinwood/stars.h"
#include "stars/handle.h"

#include <math.h>

void ew_death_add(ew_death *sum, double weight, const ew_death *death) {
  sum->ejected += weight * death->ejected;
  sum->remnant += weight * death->remnant;
  sum->energy += weight * death->energy;
  for (int i = 0; i < EW_ELEMENT_COUNT; i++)
    sum->made.mass[i] += weight * death->made.mass[i];
}

ew_composition ew_tabulated_metals(const double listed[EW_LISTED_METALS], double metals) {
  static const ew_element element[EW_LISTED_METALS] = {EW_CARBON,  EW_NITROGEN, EW_OXYGEN, EW_MAGNESIUM,
                                                       EW_SILICON, EW_CALCIUM,  EW_IRON};
  ew_composition result = {{0.0}};
  for (int k = 0; k < EW_LISTED_METALS; k++)
    result.mass[element[k]] = listed[k];
  result.mass[EW_OTHER_METALS] = metals - ew_composition_metals(&result);
  return result;
}

/* Stars too light for the relation, which do not die within the age of the Universe, stay whole. */
static ew_death white_dwarf(double mass) {
  double remnant = fmin(EW_WHITE_DWARF_SLOPE * mass + EW_WHITE_DWARF_FLOOR, mass);
  return (ew_death){.fate = EW_FATE_WHITE_DWARF, .ejected = mass - remnant, .remnant = remnant};
}

static ew_death collapse(double mass, double wind_share) {
  double wind = wind_share * mass;
  return (ew_death){.fate = EW_FATE_COLLAPSE, .ejected = wind, .remnant = mass - wind};
}

ew_death ew_death_of(const ew_stars *stars, double mass, double metal_fraction, bool hypernova) {
  if (!(mass >= stars->parameters.supernova_mass))
    return white_dwarf(mass);
  if (mass <= stars->parameters.collapse_mass)
    return ew_core_collapse_of(&stars->core_collapse, mass, metal_fraction, hypernova);
  return collapse(mass, ew_wind_share(&stars->core_collapse, mass, metal_fraction));
}

ew_death ew_death_of_metal_free(const ew_stars *stars, double mass, double collapse_mass, bool hypernova) {
  if (!(mass >= stars->parameters.supernova_mass))
    return white_dwarf(mass);
  if (mass >= EW_PAIR_LOW && mass <= EW_PAIR_HIGH)
    return ew_pair_instability(mass);
  if (mass <= collapse_mass && mass < EW_PAIR_LOW)
    return ew_core_collapse_metal_free(&stars->core_collapse, mass, hypernova);
  return collapse(mass, 0.0);
}
