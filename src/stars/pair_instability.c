/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Pair instability disrupts metal-free stars of 140-260 Msun. The models are bare helium cores of (13/24)(m - 20) Msun
 * (Heger & Woosley 2002, ApJ 567, 532, eq. 1); around them lies an envelope of primordial mixture that is returned as
 * it was. Energy: 5e51 + 1.304e51 (M_He - 64) erg, a linear fit to the models (from memory). */
#include "elfinwood/stars.h"
#include "stars/deaths.h"
#include "stars/locate.h"

enum { CORES = 14 };

#define LOWEST_CORE 65.0 /* Msun */
#define CORE_STEP   5.0

static const struct {
  double core, helium, listed[EW_LISTED_METALS], metals;
} cores[CORES] = {
#include "stars/tables/pair_instability.inc"
};

static ew_place core_place(double core) {
  double steps = (core - LOWEST_CORE) / CORE_STEP;
  size_t index = steps > 0.0 ? (size_t)steps : 0;
  if (index > CORES - 2)
    index = CORES - 2;
  return (ew_place){index, steps - (double)index};
}

/* The core has no hydrogen left; what the published sums miss of the core's mass is counted as helium. */
ew_death ew_pair_instability(double mass) {
  double core = 13.0 / 24.0 * (mass - 20.0);
  ew_place place = core_place(core);
  size_t i = place.index;
  double listed[EW_LISTED_METALS];
  for (int k = 0; k < EW_LISTED_METALS; k++)
    listed[k] = ew_between(cores[i].listed[k], cores[i + 1].listed[k], place.weight);
  double metals = ew_between(cores[i].metals, cores[i + 1].metals, place.weight);
  ew_death death = {.fate = EW_FATE_PAIR_INSTABILITY, .ejected = mass, .energy = 5.0 + 1.304 * (core - 64.0)};
  death.made = ew_tabulated_metals(listed, metals);
  death.made.mass[EW_HYDROGEN] = -core * ew_primordial.mass[EW_HYDROGEN];
  death.made.mass[EW_HELIUM] = -(death.made.mass[EW_HYDROGEN] + metals);
  return death;
}
