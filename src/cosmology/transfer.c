/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Transfer functions of cold dark matter and baryons after Eisenstein & Hu 1998, ApJ 496, 605 (equation numbers below
 * are theirs), with acoustic oscillations and as the smooth curve through them. Where the paper can be read in two
 * ways, R is 31.5 omega_b theta^-4 (1000/z) with z itself, z_eq and z_d enter y as 1 + z, and the smooth form uses the
 * fitted sound horizon of eq. 26. The fits hold to some per cent up to about 10 h/Mpc. */
#include "cosmology/choices.h"
#include "elfinwood/cosmology.h"

#include <math.h>

#define EISENSTEIN_HU "Eisenstein & Hu 1998, ApJ 496, 605"

const ew_choice ew_transfer_choices[] = {
    [EW_TRANSFER_EISENSTEIN_HU] = {"eisenstein_hu", "cold dark matter and baryons with acoustic oscillations",
                                   EISENSTEIN_HU ", eqs 2-24"},
    [EW_TRANSFER_EISENSTEIN_HU_SMOOTH] = {"eisenstein_hu_smooth", "the same without oscillations",
                                          EISENSTEIN_HU ", eqs 26-31"},
    {NULL, NULL, NULL},
};

/* What both forms start from; lengths in Mpc. */
typedef struct {
  double matter;          /* omega_m = Omega_m h^2 */
  double baryon;          /* omega_b = Omega_b h^2 */
  double baryon_fraction; /* f_b */
  double theta;           /* T_cmb/2.7 K */
} densities;

static densities densities_of(const ew_cosmology_parameters *p) {
  double square = p->hubble * p->hubble;
  return (densities){.matter = p->omega_matter * square,
                     .baryon = p->omega_baryon * square,
                     .baryon_fraction = p->omega_baryon / p->omega_matter,
                     .theta = p->cmb_temperature / 2.7};
}

static double cube(double x) {
  return x * x * x;
}

static double sine_ratio(double x) {
  return x > 0.0 ? sin(x) / x : 1.0;
}

/* Equality, the drag epoch and the sound horizon between them. */
typedef struct {
  double equality;            /* z_eq */
  double equality_wavenumber; /* k_eq, 1/Mpc */
  double drag;                /* z_d */
  double drag_ratio;          /* R_d: momentum density of baryons over photons */
  double sound_horizon;       /* s, Mpc */
} epochs;

/* Eq. 4. */
static double drag_redshift(const densities *of) {
  double b1 = 0.313 * pow(of->matter, -0.419) * (1.0 + 0.607 * pow(of->matter, 0.674));
  double b2 = 0.238 * pow(of->matter, 0.223);
  double first = 1291.0 * pow(of->matter, 0.251) / (1.0 + 0.659 * pow(of->matter, 0.828));
  return first * (1.0 + b1 * pow(of->baryon, b2));
}

/* Eq. 6, its logarithm written so that few baryons lose no digits. */
static double sound_horizon(double equality_wavenumber, double equality_ratio, double drag_ratio) {
  double root = sqrt(equality_ratio);
  double rise = drag_ratio / (sqrt(1.0 + drag_ratio) + 1.0) + sqrt(drag_ratio + equality_ratio) - root;
  return 2.0 / (3.0 * equality_wavenumber) * sqrt(6.0) / root * log1p(rise / (1.0 + root));
}

/* Eqs 2-6. */
static epochs epochs_of(const densities *of) {
  double square = of->theta * of->theta;
  double ratio = 31.5 * of->baryon / (square * square) * 1e3; /* R z */
  epochs at = {.equality = 2.50e4 * of->matter / (square * square),
               .equality_wavenumber = 7.46e-2 * of->matter / square,
               .drag = drag_redshift(of)};
  at.drag_ratio = ratio / at.drag;
  at.sound_horizon = sound_horizon(at.equality_wavenumber, ratio / at.equality, at.drag_ratio);
  return at;
}

/* Eqs 19-20. */
static double pressureless(double q, double alpha, double beta) {
  double logarithm = log(exp(1.0) + 1.8 * beta * q);
  double c = 14.2 / alpha + 386.0 / (1.0 + 69.9 * pow(q, 1.08));
  return logarithm / (logarithm + c * q * q);
}

/* Eqs 11-12. */
static double cold_suppression(const densities *of) {
  double a1 = pow(46.9 * of->matter, 0.670) * (1.0 + pow(32.1 * of->matter, -0.532));
  double a2 = pow(12.0 * of->matter, 0.424) * (1.0 + pow(45.0 * of->matter, -0.582));
  return pow(a1, -of->baryon_fraction) * pow(a2, -cube(of->baryon_fraction));
}

static double cold_shift(const densities *of) {
  double b1 = 0.944 / (1.0 + pow(458.0 * of->matter, -0.708));
  double b2 = pow(0.395 * of->matter, -0.0266);
  return 1.0 / (1.0 + b1 * (pow(1.0 - of->baryon_fraction, b2) - 1.0));
}

/* Eqs 17-18. */
static double cold_part(const densities *of, double q, double ks) {
  double blend = 1.0 / (1.0 + pow(ks / 5.4, 4));
  double shift = cold_shift(of);
  return blend * pressureless(q, 1.0, shift) + (1.0 - blend) * pressureless(q, cold_suppression(of), shift);
}

/* Eqs 14-15. */
static double baryon_amplitude(const epochs *at) {
  double y = (1.0 + at->equality) / (1.0 + at->drag);
  double root = sqrt(1.0 + y);
  double g = y * (-6.0 * root + (2.0 + 3.0 * y) * log((root + 1.0) / (root - 1.0)));
  return 2.07 * at->equality_wavenumber * at->sound_horizon * pow(1.0 + at->drag_ratio, -0.75) * g;
}

/* Eq. 7, in 1/Mpc. */
static double silk_wavenumber(const densities *of) {
  return 1.6 * pow(of->baryon, 0.52) * pow(of->matter, 0.73) * (1.0 + pow(10.4 * of->matter, -0.95));
}

/* Eqs 21-24. */
static double baryon_part(const densities *of, const epochs *at, double q, double wavenumber) {
  double ks = wavenumber * at->sound_horizon;
  double node = 8.41 * pow(of->matter, 0.435);
  double phase = ks / cbrt(1.0 + cube(node / ks));
  double fraction = of->baryon_fraction;
  double shift = 0.5 + fraction + (3.0 - 2.0 * fraction) * sqrt(pow(17.2 * of->matter, 2) + 1.0);
  double damping = exp(-pow(wavenumber / silk_wavenumber(of), 1.4));
  double free = pressureless(q, 1.0, 1.0) / (1.0 + pow(ks / 5.2, 2));
  double driven = baryon_amplitude(at) / (1.0 + cube(shift / ks)) * damping;
  return (free + driven) * sine_ratio(phase);
}

/* Eqs 10 and 16. Without baryons the cold part is the pressureless form and the sound horizon means nothing. */
static double with_oscillations(const ew_cosmology_parameters *parameters, double wavenumber) {
  densities of = densities_of(parameters);
  epochs at = epochs_of(&of);
  double q = wavenumber / (13.41 * at.equality_wavenumber);
  if (!(of.baryon > 0.0))
    return pressureless(q, 1.0, 1.0);
  double cold = cold_part(&of, q, wavenumber * at.sound_horizon);
  double baryons = baryon_part(&of, &at, q, wavenumber);
  return of.baryon_fraction * baryons + (1.0 - of.baryon_fraction) * cold;
}

/* Eqs 26-31. */
static double without_oscillations(const ew_cosmology_parameters *parameters, double wavenumber) {
  densities of = densities_of(parameters);
  double fraction = of.baryon_fraction;
  double ks = wavenumber * 44.5 * log(9.83 / of.matter) / sqrt(1.0 + 10.0 * pow(of.baryon, 0.75));
  double alpha = 1.0 - 0.328 * log(431.0 * of.matter) * fraction + 0.38 * log(22.3 * of.matter) * fraction * fraction;
  double gamma = parameters->omega_matter * parameters->hubble * (alpha + (1.0 - alpha) / (1.0 + pow(0.43 * ks, 4)));
  double q = wavenumber / parameters->hubble * of.theta * of.theta / gamma;
  double logarithm = log(2.0 * exp(1.0) + 1.8 * q);
  double c = 14.2 + 731.0 / (1.0 + 62.5 * q);
  return logarithm / (logarithm + c * q * q);
}

static const ew_transfer transfers[] = {
    [EW_TRANSFER_EISENSTEIN_HU] = {&ew_transfer_choices[EW_TRANSFER_EISENSTEIN_HU], with_oscillations},
    [EW_TRANSFER_EISENSTEIN_HU_SMOOTH] = {&ew_transfer_choices[EW_TRANSFER_EISENSTEIN_HU_SMOOTH], without_oscillations},
};

const ew_transfer *ew_transfer_of(int choice) {
  int count = (int)(sizeof transfers / sizeof *transfers);
  return choice >= 0 && choice < count ? &transfers[choice] : NULL;
}
