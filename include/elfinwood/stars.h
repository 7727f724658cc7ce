/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * stars: what a population of stars does once it has formed - initial mass functions, lifetimes, ejecta and remnants of
 * core-collapse, pair-instability and Ia supernovae, mass returned by old stars, V-band light.
 *
 * Masses Msun, ages Gyr, luminosities Lsun,V. The IMF of normal stars is Kroupa (2001), 0.1-100 Msun, normalised to the
 * mass FORMED. The handle is built once (ew_stars_new), read-only afterwards and may be shared by threads; it holds the
 * tables, which are compiled in from src/stars/tables. No function here fails but ew_stars_new: arguments outside a
 * table get the value at its end. */
#ifndef ELFINWOOD_STARS_H
#define ELFINWOOD_STARS_H

#include "elfinwood/core.h"

/* --------------------------------------------------------------------------------------------------------- elements */

/* Mass is carried by element; EW_OTHER_METALS is everything heavier than helium that is not listed. */
typedef enum {
  EW_HYDROGEN,
  EW_HELIUM,
  EW_CARBON,
  EW_NITROGEN,
  EW_OXYGEN,
  EW_MAGNESIUM,
  EW_SILICON,
  EW_CALCIUM,
  EW_IRON,
  EW_OTHER_METALS,
  EW_ELEMENT_COUNT
} ew_element;

typedef struct {
  double mass[EW_ELEMENT_COUNT]; /* Msun, or mass fractions where said */
} ew_composition;

const char *ew_element_name(ew_element element); /* "carbon" */

/* Solar mass fractions: Asplund et al. 2009, ARA&A 47, 481 (photosphere, X = 0.7381, Z = 0.0134). */
extern const ew_composition ew_solar;
#define EW_SOLAR_METALS 0.0134

/* Primordial mass fractions: hydrogen and helium only (Y = 0.2470, Planck 2018 VI). */
extern const ew_composition ew_primordial;

double ew_composition_mass(const ew_composition *composition);   /* sum over elements */
double ew_composition_metals(const ew_composition *composition); /* sum over elements heavier than helium */

/* log10 of the number ratio relative to solar, [X/H] or [X/Y]; -INFINITY when X is absent, NAN when Y is. */
double ew_abundance(const ew_composition *composition, ew_element element, ew_element relative_to);

/* ------------------------------------------------------------------------------------------------------- parameters */

typedef struct {
  double supernova_mass;     /* Msun: stars above explode by core collapse */
  double collapse_mass;      /* Msun: stars above collapse and eject nothing but their wind */
  double hypernova_fraction; /* of exploding stars of 20 Msun and more */
  double ia_per_mass;        /* Ia supernovae per Msun formed over 13.7 Gyr */
  double ia_slope;           /* of the delay-time distribution, t^-slope */
  double ia_delay;           /* Gyr: earliest Ia */
  int ia_model;              /* index: W7, W70, ... */
} ew_stars_parameters;

/* Rows of group "enrichment" that belong to this room. */
extern const ew_parameter ew_stars_rows[];

typedef struct ew_stars ew_stars;

/* Builds the tables. EW_REFUSED when a parameter is outside the range of its row. Release with ew_stars_free. */
EW_CHECKED ew_status ew_stars_new(ew_stars **stars, const ew_stars_parameters *parameters, ew_error *error);
void ew_stars_free(ew_stars *stars); /* accepts NULL */
const ew_stars_parameters *ew_stars_get(const ew_stars *stars);

/* ------------------------------------------------------------------------------------------------------- normal IMF */

/* Number and mass of stars born between two masses, per Msun formed (Kroupa 2001, MNRAS 322, 231; 0.1-100 Msun). */
double ew_imf_number(double low, double high);
double ew_imf_mass(double low, double high);

/* The mass below which a fraction u of the stars born between low and high lies: inverse of the IMF. */
double ew_imf_draw(double low, double high, double u);

/* A power law dN/dm ~ m^-slope between low and high, for first stars and clusters: the mass below which a fraction u of
 * the number lies, the mean mass, and the share of the number between two masses. 0 < low <= high; any slope. */
typedef struct {
  double slope, low, high;
} ew_power_law;
double ew_power_law_draw(const ew_power_law *law, double u);
double ew_power_law_mean(const ew_power_law *law);
double ew_power_law_share(const ew_power_law *law, double from, double to);

/* -------------------------------------------------------------------------------------------------------- lifetimes */

/* Gyr, of a star of that mass and metal mass fraction: Portinari et al. 1998, A&A 334, 505, Table 14 (hydrogen and
 * helium burning), log age bilinear in log mass and log Z; falls with mass. Z clamped to the table's 0.0004-0.05, mass
 * to 0.1-120 Msun; below the table's 0.6 Msun the lowest power law goes on. */
double ew_lifetime(const ew_stars *stars, double mass, double metal_fraction);

/* The exact inverse: mass of the star that dies at that age (clamped to 0.1-120 Msun). */
double ew_mass_dying_at(const ew_stars *stars, double age, double metal_fraction);

/* Metal-free stars: Schaerer 2002, A&A 382, 28, Table 6 (5-500 Msun, good to 10 per cent; clamped above). Below 5 Msun
 * Portinari's lowest Z, longer by a factor 1.6 at the joint. */
double ew_lifetime_metal_free(const ew_stars *stars, double mass);

/* -------------------------------------------------------------------------------------------- end of a massive star */

typedef enum {
  EW_FATE_CORE_COLLAPSE,
  EW_FATE_HYPERNOVA,
  EW_FATE_PAIR_INSTABILITY,
  EW_FATE_COLLAPSE,
  EW_FATE_WHITE_DWARF
} ew_fate;

/* What one dying star gives back. Per element: mass newly made (negative where destroyed), which adds up to zero, on
 * top of the `ejected` mass that leaves with the star's own initial composition. ejected + remnant = initial mass.
 * Metals are never destroyed; hydrogen destroyed is at most 0.38 and helium 0.12 of the ejected mass, so the sum stays
 * positive whatever normal mixture the star was born with. */
typedef struct {
  ew_fate fate;
  double ejected;      /* Msun, wind included */
  double remnant;      /* Msun */
  double energy;       /* 1e51 erg */
  ew_composition made; /* Msun, net; sums to 0 */
} ew_death;

/* Star with metals: below supernova_mass a white dwarf; up to collapse_mass core collapse, Nomoto, Kobayashi & Tominaga
 * 2013, ARA&A 51, 457; collapse above, where only the wind (the share that the models lose) is ejected. Linear in mass
 * and in Z between the models, 13-40 Msun and Z = 0-0.02, and held constant beyond: made and remnant down to
 * supernova_mass are those of 13 Msun, as the [Mg/Fe] of old metal-poor stars asks for. `hypernova` picks that branch
 * from 20 Msun. */
ew_death ew_death_of(const ew_stars *stars, double mass, double metal_fraction, bool hypernova);

/* Metal-free star: below supernova_mass a white dwarf; core collapse (Nomoto et al. 2013, Z = 0, from 11 Msun) up to
 * the `collapse_mass` given; then collapse without ejecta; 140-260 Msun pair instability (Heger & Woosley 2002, ApJ
 * 567, 532, Table 3), no remnant; collapse above. */
ew_death ew_death_of_metal_free(const ew_stars *stars, double mass, double collapse_mass, bool hypernova);

/* Bins of birth mass, supernova_mass..collapse_mass, ascending and even in log lifetime, for populations too large to
 * be drawn star by star. The mean death is the exact IMF average per supernova, hypernovae mixed in by their fraction,
 * and its fate says core collapse. */
enum { EW_SUPERNOVA_BINS = 12 };
double ew_supernova_bin_edge(const ew_stars *stars, int edge);                          /* Msun; 0..EW_SUPERNOVA_BINS */
double ew_supernova_bin_number(const ew_stars *stars, int bin);                         /* supernovae per Msun formed */
ew_death ew_supernova_bin_death(const ew_stars *stars, int bin, double metal_fraction); /* mean per supernova */

/* All core-collapse supernovae per Msun formed, i.e. ew_imf_number(supernova_mass, collapse_mass). */
double ew_supernovae_per_mass(const ew_stars *stars);

/* ---------------------------------------------------------------------------------------------------- Ia supernovae */

/* Mean number per Msun formed that explode between two ages [Gyr]: power-law delay-time distribution, Maoz & Graur
 * 2017, ApJ 848, 25, normalised over ia_delay..13.7 Gyr. */
double ew_ia_number(const ew_stars *stars, double age_from, double age_to);

/* Ejecta of one [Msun], metals only: Iwamoto et al. 1999, ApJS 125, 439, Table 3 (stable species; their sum is the mass
 * of the white dwarf that is gone). Owned by `stars`. */
const ew_composition *ew_ia_ejecta(const ew_stars *stars);

/* -------------------------------------------------------------------------------------- slow mass loss of old stars */

/* Stars below supernova_mass: mass returned (with the birth composition) and mass left in white dwarfs by that age, per
 * Msun formed; both grow with age. White dwarf mass 0.077 m + 0.48 Msun (Renzini & Ciotti 1993, ApJ 416, L49, from
 * memory). Linear in log age (1 Myr-20 Gyr) and log Z (0.0004-0.05), clamped outside. */
double ew_returned_mass(const ew_stars *stars, double age, double metal_fraction);
double ew_white_dwarf_mass(const ew_stars *stars, double age, double metal_fraction);

/* Number of stars still alive at that age per Msun formed. */
double ew_living_number(const ew_stars *stars, double age, double metal_fraction);

/* ------------------------------------------------------------------------------------------------------------ light */

/* V luminosity per Msun formed [Lsun,V; M_V,sun = 4.82 Vega] of a population of that age [Gyr] and total metal mass
 * fraction: MIUSCAT/BaSTI populations (Vazdekis et al. 2012, MNRAS 424, 157) for 0.03-14 Gyr, PARSEC-based below (age
 * >= 1 Myr), joined smoothly; log L is linear in log age and log Z, clamped outside (Z = 0.0001-0.0198). The metal
 * fraction is that of the models themselves; they have solar mixture, so alpha-enhanced stars enter by their total
 * metals. */
double ew_luminosity_v(const ew_stars *stars, double age, double metal_fraction);
#define EW_SUN_MAGNITUDE_V 4.82

/* Luminosity-weighted mean stellar luminosity, sum n L^2 / sum n L [Lsun,V]: the scale of shot noise. The relative
 * variance of the light of a population of luminosity L is this over L. */
double ew_fluctuation_luminosity_v(const ew_stars *stars, double age, double metal_fraction);

#endif
