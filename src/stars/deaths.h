/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * What the files on dying stars share: published ejecta turned into net yields, and sums of deaths. */
#ifndef EW_STARS_DEATHS_H
#define EW_STARS_DEATHS_H

#include "elfinwood/stars.h"

enum { EW_YIELD_METALLICITIES = 5, EW_YIELD_MASSES = 7, EW_HYPERNOVA_MASSES = 4 };

/* Grids of the published models: initial mass [Msun] and metal mass fraction. Below the first mass only metal-free
 * stars have a model, of EW_METAL_FREE_LOWEST Msun. */
extern const double ew_yield_masses[EW_YIELD_MASSES];
extern const double ew_yield_metals[EW_YIELD_METALLICITIES];

/* Net yields of core collapse at the published models. The metal-free supernovae start with one model more, so the
 * chain of metal-free masses begins at supernova[0], that of normal stars of metallicity z at supernova[1 + 7 z]. */
typedef struct {
  ew_death supernova[1 + EW_YIELD_METALLICITIES * EW_YIELD_MASSES];
  ew_death hypernova[EW_YIELD_METALLICITIES * EW_HYPERNOVA_MASSES];
  double wind_share[EW_YIELD_METALLICITIES * EW_YIELD_MASSES]; /* of the initial mass, before the explosion */
} ew_core_collapse;

void ew_core_collapse_fill(ew_core_collapse *models);

/* Explosion of a star of that mass, interpolated; held constant below and above the models, where ejected follows the
 * mass. The hypernova branch starts at 20 Msun. */
ew_death ew_core_collapse_of(const ew_core_collapse *models, double mass, double metal_fraction, bool hypernova);
ew_death ew_core_collapse_metal_free(const ew_core_collapse *models, double mass, bool hypernova);

/* Share of its mass that a star loses by winds before the end; held constant above the models. */
double ew_wind_share(const ew_core_collapse *models, double mass, double metal_fraction);

/* Pair instability of a metal-free star, EW_PAIR_LOW..EW_PAIR_HIGH Msun. */
#define EW_PAIR_LOW  140.0
#define EW_PAIR_HIGH 260.0
ew_death ew_pair_instability(double mass);

/* White dwarf left by a star: EW_WHITE_DWARF_SLOPE m + EW_WHITE_DWARF_FLOOR. */
#define EW_WHITE_DWARF_SLOPE 0.077
#define EW_WHITE_DWARF_FLOOR 0.48 /* Msun */

/* sum += weight * death; the fate of `sum` stays. */
void ew_death_add(ew_death *sum, double weight, const ew_death *death);

/* Metals of a published model: those listed one by one, in the order C, N, O, Mg, Si, Ca, Fe, and the others, which are
 * what is missing in the sum `metals`. Hydrogen and helium are left at zero. */
enum { EW_LISTED_METALS = 7 };
ew_composition ew_tabulated_metals(const double listed[EW_LISTED_METALS], double metals);

#endif
