/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * halo: what follows from a halo's mass and redshift - virial relations, mass definitions, concentration, the NFW
 * profile, spin, and how long a satellite takes to sink.
 *
 * Mass is the virial mass of Bryan & Norman (1998, ApJ 495, 80, eq. 6) unless said. Proper kpc, km/s, Msun, Gyr, K. All
 * functions are pure, or read objects that never change after they were made, so threads may share them. */
#ifndef ELFINWOOD_HALO_H
#define ELFINWOOD_HALO_H

#include "elfinwood/cosmology.h"

/* ------------------------------------------------------------------------------------------------- virial relations */

/* A sphere of mean density Delta_vir(z) rho_crit(z): radius, circular velocity and temperature from G and that density.
 * Mass > 0 [Msun]; redshift as the cosmology room accepts it. */
double ew_virial_radius(const ew_cosmology *cosmology, double mass, double redshift);   /* proper kpc */
double ew_virial_velocity(const ew_cosmology *cosmology, double mass, double redshift); /* circular at r_vir, km/s */
double ew_virial_temperature(double virial_velocity, double mean_molecular_weight);     /* K; mu m_p V^2 / 2k */
double ew_mass_of_temperature(const ew_cosmology *cosmology, double temperature, double mean_molecular_weight,
                              double redshift); /* Msun, inverse of the above */

/* Free-fall time of the mean virial density, sqrt(3 pi / (32 G rho)) [Gyr]; and r_vir / V_vir [Gyr]. */
double ew_free_fall_time(const ew_cosmology *cosmology, double redshift);
double ew_halo_crossing_time(const ew_cosmology *cosmology, double redshift);

/* ------------------------------------------------------------------------------------------------------ NFW profile */

/* Navarro, Frenk & White 1997, ApJ 490, 493. */

typedef struct {
  double mass;          /* virial, Msun */
  double radius;        /* virial, proper kpc */
  double concentration; /* radius / scale radius */
} ew_nfw;

double ew_nfw_shape(double x); /* ln(1+x) - x/(1+x), x >= 0, to 1e-13 however small x is */

/* At a radius [kpc] >= 0 from the centre, without an edge at the virial radius. */
double ew_nfw_mass(const ew_nfw *halo, double radius);              /* inside it, Msun */
double ew_nfw_density(const ew_nfw *halo, double radius);           /* Msun/kpc^3; infinite at 0 */
double ew_nfw_potential(const ew_nfw *halo, double radius);         /* (km/s)^2: negative, finite at 0, 0 at infinity */
double ew_nfw_circular_velocity(const ew_nfw *halo, double radius); /* km/s; 0 at 0 */
double ew_nfw_escape_velocity(const ew_nfw *halo);                  /* from the centre, km/s */

/* Radius [kpc] inside which the mean density is that [Msun/kpc^3]. Every positive density has one, as the mean density
 * diverges at the centre; it is held at 100 virial radii, also for a density that is not positive. */
double ew_nfw_radius_of_density(const ew_nfw *halo, double mean_density);

/* Mass inside the radius where the mean density is `wanted`, of the NFW halo with this mass and concentration inside
 * the radius of `overdensity`; its concentration there through *new_concentration unless NULL. Exact to rounding. Both
 * overdensities refer to one density, say the critical, and are positive. */
typedef struct {
  double mass;          /* Msun */
  double concentration; /* radius of that mass over scale radius */
  double overdensity;   /* of the mass given */
  double wanted;        /* overdensity of the answer */
} ew_mass_conversion;
double ew_convert_mass(const ew_mass_conversion *conversion, double *new_concentration);

/* ------------------------------------------------------------------------------------------- concentration and spin */

typedef struct {
  double concentration_scatter; /* dex, at fixed mass and redshift */
  double spin_median;           /* lambda' of Bullock et al. 2001 */
  double spin_scatter;          /* of ln lambda' */
} ew_structure_parameters;

/* Group "structure". */
extern const ew_parameter ew_structure_rows[];

/* Median concentration c_vir of virial mass: Diemer & Joyce 2019, ApJ 871, 168 (median relation for c200c), converted
 * with the NFW profile. Tabulated over 1e4-1e16 Msun and z = 0-40, within 0.5 per cent of the relation; outside,
 * the value at the edge. The relation turns up at peak heights above 3 (rare haloes) and keeps rising: above 6, where
 * there are none, its value means nothing but is finite. `spectrum` need not outlive the table. */
typedef struct ew_concentration ew_concentration;
EW_CHECKED ew_status ew_concentration_new(ew_concentration **concentration, const ew_spectrum *spectrum,
                                          ew_error *error);
void ew_concentration_free(ew_concentration *concentration);
double ew_concentration_at(const ew_concentration *concentration, double mass, double redshift);

/* The relation itself: median c200c of M200c [Msun], solved directly (the reference for the table). Peak height is with
 * 1.68647/D(z), as in the paper, whatever threshold the trees use. EW_REFUSED outside EW_LOWEST_MASS-EW_HIGHEST_MASS
 * and z = 0-EW_HIGHEST_REDSHIFT. */
EW_CHECKED ew_status ew_concentration_200c(const ew_spectrum *spectrum, double mass_200c, double redshift,
                                           double *concentration, ew_error *error);

/* ----------------------------------------------------------------------------------------------------------- orbits */

typedef struct {
  double circularity;     /* J / J_circ(E) */
  double circular_radius; /* of the circular orbit of that energy, in virial radii of the host */
} ew_orbit;

/* Orbit at infall from two uniform draws in (0,1): circularity from [e(1-e)]^1.22 by exact inversion, radius uniform in
 * 0.6-1 virial radii (Zentner et al. 2005, ApJ 624, 505; numbers from memory). Monotonic in each draw. */
ew_orbit ew_orbit_draw(double u_circularity, double u_radius);

/* Time to sink to the centre [Gyr] of a satellite of mass m in a host of mass M, `host_over_satellite` = M/m, on
 * `orbit`; `host_crossing_time` is the host's r_vir/V_vir [Gyr]. Boylan-Kolchin, Ma & Quataert 2008, MNRAS 383, 93, eq.
 * 5, fitted to 0.025 < m/M < 0.3. A ratio below 1, or none, counts as 1; an infinite one gives a time that is very long
 * but finite. */
double ew_friction_time(double host_over_satellite, const ew_orbit *orbit, double host_crossing_time);

#endif
