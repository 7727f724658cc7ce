/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Elements and their mixtures: names, the solar and the primordial mixture, abundances relative to the Sun. */
#include "elfinwood/stars.h"

#include <math.h>

static const char *const element_names[EW_ELEMENT_COUNT] = {
    [EW_HYDROGEN] = "hydrogen",        [EW_HELIUM] = "helium",   [EW_CARBON] = "carbon",
    [EW_NITROGEN] = "nitrogen",        [EW_OXYGEN] = "oxygen",   [EW_MAGNESIUM] = "magnesium",
    [EW_SILICON] = "silicon",          [EW_CALCIUM] = "calcium", [EW_IRON] = "iron",
    [EW_OTHER_METALS] = "other_metals"};

/* Mass fractions from log eps of Asplund et al. 2009, Table 1, X_i = A_i 10^(log eps - 12) X / 1.008; the other metals
 * are what is missing in Z = 0.0134. */
const ew_composition ew_solar = {{[EW_HYDROGEN] = 0.7381,
                                  [EW_HELIUM] = 0.2485,
                                  [EW_CARBON] = 2.367e-3,
                                  [EW_NITROGEN] = 6.934e-4,
                                  [EW_OXYGEN] = 5.738e-3,
                                  [EW_MAGNESIUM] = 7.085e-4,
                                  [EW_SILICON] = 6.655e-4,
                                  [EW_CALCIUM] = 6.420e-5,
                                  [EW_IRON] = 1.293e-3,
                                  [EW_OTHER_METALS] = 1.8704e-3}};

const ew_composition ew_primordial = {{[EW_HYDROGEN] = 0.7530, [EW_HELIUM] = 0.2470}};

const char *ew_element_name(ew_element element) {
  return element_names[element];
}

double ew_composition_mass(const ew_composition *composition) {
  double sum = 0.0;
  for (int i = 0; i < EW_ELEMENT_COUNT; i++)
    sum += composition->mass[i];
  return sum;
}

double ew_composition_metals(const ew_composition *composition) {
  double sum = 0.0;
  for (int i = EW_HELIUM + 1; i < EW_ELEMENT_COUNT; i++)
    sum += composition->mass[i];
  return sum;
}

/* Atomic masses cancel in the ratio of number ratios. */
double ew_abundance(const ew_composition *composition, ew_element element, ew_element relative_to) {
  double above = composition->mass[element], below = composition->mass[relative_to];
  if (!(below > 0.0))
    return (double)NAN;
  if (!(above > 0.0))
    return -HUGE_VAL;
  return log10(above / below * (ew_solar.mass[relative_to] / ew_solar.mass[element]));
}
