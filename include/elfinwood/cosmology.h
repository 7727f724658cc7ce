/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * cosmology: background, growth, power spectrum, sigma(M) and mass functions of flat LambdaCDM.
 *
 * Lengths are comoving Mpc, wavenumbers 1/Mpc, masses Msun (no h anywhere), times Gyr. Everything is built once and is
 * read-only afterwards, so it may be shared by threads. Functions without an error argument accept any redshift in
 * [0, EW_HIGHEST_REDSHIFT] and any mass in [EW_LOWEST_MASS, EW_HIGHEST_MASS], clamp outside and never fail. */
#ifndef ELFINWOOD_COSMOLOGY_H
#define ELFINWOOD_COSMOLOGY_H

#include "elfinwood/core.h"

#define EW_HIGHEST_REDSHIFT 60.0
#define EW_LOWEST_MASS      1e3
#define EW_HIGHEST_MASS     1e16

/* delta_c(z): 1.686470; times Omega_m(z)^0.0055 (Mo, van den Bosch & White 2010); times 1 + 0.012299 log10 Omega_m(z)
 * (Nakamura & Suto 1997). */
typedef enum { EW_THRESHOLD_CONSTANT, EW_THRESHOLD_MO_WHITE, EW_THRESHOLD_NAKAMURA_SUTO } ew_threshold;

typedef struct {
  double hubble;          /* h */
  double omega_matter;    /* with baryons, z = 0 */
  double omega_baryon;    /* z = 0 */
  double spectral_index;  /* n_s */
  double sigma8;          /* rms in 8 Mpc/h top hats, z = 0 */
  double cmb_temperature; /* K */
  double neutrino_number; /* massless; counts only with radiation */
  bool radiation;         /* photons and massless neutrinos in the background */
  int collapse_threshold; /* ew_threshold */
} ew_cosmology_parameters;

typedef enum { EW_TRANSFER_EISENSTEIN_HU, EW_TRANSFER_EISENSTEIN_HU_SMOOTH } ew_transfer_choice;
typedef enum { EW_FILTER_TOP_HAT } ew_filter_choice;

typedef struct {
  int transfer; /* ew_transfer_choice */
  int filter;   /* ew_filter_choice */
} ew_spectrum_parameters;

/* Parameter rows: groups "cosmology" and "spectrum". */
extern const ew_parameter ew_cosmology_rows[];
extern const ew_parameter ew_spectrum_rows[];

/* ------------------------------------------------------------------------------------------------------ background */

typedef struct ew_cosmology ew_cosmology;

/* Builds all tables of the background. Refuses, in one line with name, value and limit, values outside the ranges of
 * their rows and combinations that are no flat universe (omega_baryon above omega_matter, no room for Lambda >= 0). */
EW_CHECKED ew_status ew_cosmology_new(ew_cosmology **cosmology, const ew_cosmology_parameters *parameters,
                                      ew_error *error);
void ew_cosmology_free(ew_cosmology *cosmology);
const ew_cosmology_parameters *ew_cosmology_get(const ew_cosmology *cosmology);

double ew_hubble_rate(const ew_cosmology *cosmology, double redshift);      /* km/s/Mpc */
double ew_omega_matter(const ew_cosmology *cosmology, double redshift);     /* rho_m / rho_crit at z */
double ew_matter_density(const ew_cosmology *cosmology);                    /* mean, comoving, Msun/Mpc^3 */
double ew_critical_density(const ew_cosmology *cosmology, double redshift); /* proper, Msun/kpc^3 */
double ew_baryon_fraction(const ew_cosmology *cosmology);                   /* Omega_b / Omega_m */

/* Age of the universe at z [Gyr] and its inverse: fast, from tables good to 1e-11 (age) and 1e-10 of 1+z. */
double ew_age(const ew_cosmology *cosmology, double redshift);
double ew_redshift_at(const ew_cosmology *cosmology, double age);

double ew_comoving_distance(const ew_cosmology *cosmology, double redshift);   /* Mpc */
double ew_luminosity_distance(const ew_cosmology *cosmology, double redshift); /* Mpc */

/* Linear growth factor, D(0) = 1, and d ln D / d ln a, from tables good to 1e-10. Without radiation D ~ H int da/(aH)^3
 * (Heath 1977, MNRAS 179, 351); with radiation the growth equation is integrated from deep in the radiation era. */
double ew_growth(const ew_cosmology *cosmology, double redshift);
double ew_growth_rate(const ew_cosmology *cosmology, double redshift);

/* Collapse threshold delta_c(z) by the chosen form, and the barrier omega(z) = delta_c(z)/D(z) with its inverse: rising
 * with z and fast, from tables that undo each other to 1e-10 of 1+z. */
double ew_collapse_threshold(const ew_cosmology *cosmology, double redshift);
double ew_barrier(const ew_cosmology *cosmology, double redshift);
double ew_redshift_of_barrier(const ew_cosmology *cosmology, double barrier);

/* Virial overdensity with respect to the critical density at z: Bryan & Norman 1998, ApJ 495, 80, eq. 6. */
double ew_virial_overdensity(const ew_cosmology *cosmology, double redshift);

/* ------------------------------------------------------------------------------------------- spectrum and variance */

/* A transfer function by name. `evaluate` gives T(k), k in 1/Mpc, T -> 1 for k -> 0. */
typedef struct {
  const ew_choice *label; /* of the row spectrum.transfer */
  double (*evaluate)(const ew_cosmology_parameters *parameters, double wavenumber);
} ew_transfer;

/* A smoothing filter by name: W(kR), dW/d(kR), the kR beyond which the window adds nothing to sigma, and the radius
 * [Mpc] of the mass [Msun] at the mean density [Msun/Mpc^3], which must go as mass^(1/3). */
typedef struct {
  const ew_choice *label; /* of the row spectrum.filter */
  double (*window)(double kr);
  double (*window_derivative)(double kr);
  double reach;
  double (*radius)(double mass, double mean_density);
} ew_filter;

const ew_transfer *ew_transfer_of(int choice);
const ew_filter *ew_filter_of(int choice);

typedef struct ew_spectrum ew_spectrum;

/* Normalises the spectrum to sigma8 (top hat) and tabulates sigma(M). `cosmology` must outlive it. Refuses choices that
 * are none and densities for which the transfer function has no value. */
EW_CHECKED ew_status ew_spectrum_new(ew_spectrum **spectrum, const ew_cosmology *cosmology,
                                     const ew_spectrum_parameters *parameters, ew_error *error);
void ew_spectrum_free(ew_spectrum *spectrum);
const ew_cosmology *ew_spectrum_cosmology(const ew_spectrum *spectrum);

double ew_transfer_at(const ew_spectrum *spectrum, double wavenumber); /* 1 */
double ew_power_at(const ew_spectrum *spectrum, double wavenumber);    /* linear, z = 0, Mpc^3 */

/* sigma(M) at z = 0 and d ln sigma / d ln M (negative): fast, from a table good to 1e-8 (sigma) and 5e-7 (slope; 1e-7
 * for universes like ours). */
double ew_sigma(const ew_spectrum *spectrum, double mass);
double ew_sigma_slope(const ew_spectrum *spectrum, double mass);

/* The same by adaptive integration for this one mass, to 1e-9: slow (some ms), the reference for the table. */
EW_CHECKED ew_status ew_sigma_integrate(const ew_spectrum *spectrum, double mass, double *sigma, double *slope,
                                        ew_error *error);

/* -------------------------------------------------------------------------------------------------- mass functions */

/* dn/dlnM [comoving Mpc^-3] of haloes. */
typedef struct {
  ew_choice label;
  double (*multiplicity)(double peak_height); /* f(nu), of dn/dlnM = (rho_m/M) f |dln sigma/dlnM| */
} ew_mass_function;

extern const ew_mass_function ew_press_schechter; /* Press & Schechter 1974, ApJ 187, 425 */
extern const ew_mass_function ew_sheth_tormen;    /* Sheth & Tormen 1999, MNRAS 308, 119 */

double ew_mass_function_at(const ew_mass_function *function, const ew_spectrum *spectrum, double mass, double redshift);

/* Progenitors of a halo (mass, redshift) at an earlier redshift: dN/dlnM1 and the mass fraction above M1 by extended
 * Press-Schechter (Lacey & Cole 1993, MNRAS 262, 627, eq. 2.15). 0 where M1 >= mass; no progenitors but the halo itself
 * (number 0, fraction 1) where `earlier` is not earlier. */
typedef struct {
  double mass;     /* Msun, of the descendant */
  double redshift; /* of the descendant */
  double earlier;  /* redshift of the progenitors */
} ew_progenitor_question;
double ew_progenitor_number(const ew_spectrum *spectrum, const ew_progenitor_question *question, double mass);
double ew_progenitor_fraction_above(const ew_spectrum *spectrum, const ew_progenitor_question *question, double mass);

#endif
