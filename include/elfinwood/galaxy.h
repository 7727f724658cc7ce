/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * galaxy: a galaxy is a state advanced in an environment. The environment carries the halo as it stands and the
 * backgrounds of the patch; the state carries gas, stars, metals and sizes; processes, one file each, act on it in
 * turn.
 *
 * Msun, Gyr, kpc, km/s; metallicities in solar units are log10 unless said. Every move of mass goes through the ledger.
 */
#ifndef ELFINWOOD_GALAXY_H
#define ELFINWOOD_GALAXY_H

#include "elfinwood/halo.h"
#include "elfinwood/stars.h"

/* ------------------------------------------------------------------------------------------- parameters by process */

typedef enum { EW_SUPPRESSION_NONE, EW_SUPPRESSION_CHARACTERISTIC_MASS } ew_suppression_choice;

typedef struct {
  int suppression;             /* ew_suppression_choice */
  double redshift;             /* mean redshift of local reionization */
  double redshift_scatter;     /* standard deviation between patches */
  double sharpness;            /* alpha of the baryon fraction */
  bool evaporation;            /* gas already inside small haloes leaves */
  double evaporation_velocity; /* km/s: haloes below lose their gas */
  double evaporation_speed;    /* km/s: of the outflow */
} ew_reionization_parameters;

typedef enum { EW_FIRST_STARS_NONE, EW_FIRST_STARS_ATOMIC, EW_FIRST_STARS_MOLECULAR } ew_first_star_choice;

typedef struct {
  int threshold;               /* ew_first_star_choice */
  double streaming_rms;        /* km/s at z = 1060 */
  double background;           /* factor on the Lyman-Werner fit */
  double critical_metallicity; /* log10 of Z over solar: stars below are first stars */
  double imf_slope;            /* dN/dm ~ m^-slope */
  double imf_range[2];         /* Msun */
  double burst_mass;           /* Msun: stars are drawn until their masses reach it */
  double collapse_mass;        /* Msun: above (and below pair instability) a star collapses whole */
  double binding_factor;       /* gas is lost if the energy exceeds this times its binding energy */
  double recovery_range[2];    /* Gyr */
} ew_first_star_parameters;

typedef struct {
  double delay;                /* Gyr: e-folding time in which gas joins the disc, at the least */
  double return_time;          /* Gyr, of ejected gas at 1e10 Msun */
  double return_velocity;      /* km/s: below it ejected gas is lost after reionization */
  bool external_enrichment;    /* gas from outside may carry metals */
  double external_metallicity; /* log10 of Z over solar */
  double external_scatter;     /* dex */
} ew_gas_parameters;

typedef struct {
  double depletion_time; /* Gyr, of molecular gas */
  double pressure_scale; /* P0/k, K cm^-3 */
  double pressure_slope;
  double dispersion_ratio; /* velocity dispersion of gas over stars */
  double cluster_range[2]; /* Msun */
  double cluster_slope;
  double cluster_efficiency; /* stars over gas of the cloud that makes the cluster */
  double heated_time;        /* Gyr: e-folding time in which the rest of the cloud is available again */
  double star_by_star_mass;  /* Msun: supernovae of clusters below are drawn star by star */
} ew_star_formation_parameters;

typedef struct {
  double loading_scale; /* mass loading at 60 km/s, z = 0 */
  double loading_max;   /* cap */
  double energy_share;  /* of supernova energy in the outflow */
  double metal_loading; /* metallicity of the outflow over that of the gas */
} ew_feedback_parameters;

typedef struct {
  double mixing_floor;    /* dex */
  double mixing_scatter;  /* dex, for one supernova */
  double element_scatter; /* dex, between elements of one event */
} ew_mixing_parameters;

typedef struct {
  double birth_factor; /* on the radius at which stars are born */
  bool gas_response;   /* stars respond to gas that leaves or arrives */
  bool merger_growth;
  double orbital_share;   /* f of the merger energy balance */
  double binding_share;   /* c of the same */
  double smallest_merger; /* mass ratio at infall below which starless haloes are left out */
} ew_size_parameters;

typedef struct {
  double friction_factor; /* on the time to sink */
} ew_satellite_parameters;

/* Everything that may differ between two models evolved on the same trees. */
typedef struct {
  ew_reionization_parameters reionization;
  ew_first_star_parameters first_stars;
  ew_gas_parameters gas;
  ew_star_formation_parameters star_formation;
  ew_feedback_parameters feedback;
  ew_mixing_parameters mixing;
  ew_size_parameters sizes;
  ew_satellite_parameters satellites;
  ew_structure_parameters structure;
} ew_model;

/* A process: what it is, where it comes from, and its rows (ended by a row without a name). The registry in the
 * population room lists them all. */
typedef struct {
  const char *name;
  const char *meaning;
  const char *source;
  const ew_parameter *rows;
} ew_process_record;

extern const ew_process_record ew_structure_process;
extern const ew_process_record ew_reionization_process;
extern const ew_process_record ew_first_star_process;
extern const ew_process_record ew_gas_process;
extern const ew_process_record ew_star_formation_process;
extern const ew_process_record ew_feedback_process;
extern const ew_process_record ew_mixing_process;
extern const ew_process_record ew_size_process;
extern const ew_process_record ew_satellite_process;

extern const ew_parameter ew_reionization_rows[];
extern const ew_parameter ew_first_star_rows[];
extern const ew_parameter ew_gas_rows[];
extern const ew_parameter ew_star_formation_rows[];
extern const ew_parameter ew_feedback_rows[];
extern const ew_parameter ew_mixing_rows[];
extern const ew_parameter ew_size_rows[];
extern const ew_parameter ew_satellite_rows[];

/* Checks between parameters of the model: EW_REFUSED, and the name of the parameter at fault in *name. */
EW_CHECKED ew_status ew_model_check(const ew_model *model, const char **name, ew_error *error);

/* ------------------------------------------------------------------------------------------ world, calendar, patch */

/* Immutable tables shared by all models and threads; borrowed. */
typedef struct {
  const ew_cosmology *cosmology;
  const ew_concentration *concentration;
  const ew_stars *stars;
  ew_composition external_metals; /* shares by mass, adding up to 1, of the metals in gas enriched from outside */
} ew_world;

/* Borrows the tables; the external metals are those of the average core-collapse supernova. */
ew_world ew_world_of(const ew_cosmology *cosmology, const ew_concentration *concentration, const ew_stars *stars);

/* The fixed cosmic-time grid and what depends on time alone. Slot k runs from k to k+1 steps after the Big Bang; the
 * last one ends at the final redshift. */
typedef struct {
  double step; /* Gyr */
  double end;  /* Gyr, age at the final redshift */
  size_t slot_count;
  double *redshift;    /* [slot_count] at the end of each slot */
  double *radius;      /* [slot_count] virial radius of 1 Msun there, kpc */
  double *free_fall;   /* [slot_count] Gyr */
  double *atomic_mass; /* [slot_count] Msun: virial temperature of 1e4 K */
} ew_calendar;

EW_CHECKED ew_status ew_calendar_make(ew_calendar *calendar, const ew_cosmology *cosmology, double final_redshift,
                                      double step, ew_error *error);
void ew_calendar_clear(ew_calendar *calendar);
size_t ew_calendar_slot(const ew_calendar *calendar, double time);   /* the slot that holds it, at most the last */
double ew_calendar_end_of(const ew_calendar *calendar, size_t slot); /* Gyr */

/* The neighbourhood that a root and all its branches share. */
typedef struct {
  double reionization_redshift;
  double streaming_velocity;   /* km/s at z = 1060 */
  double *characteristic_mass; /* [slot_count] Msun, of the gas supply; 0: no suppression */
  double *threshold_mass;      /* [slot_count] Msun: gas in smaller haloes does not cool */
} ew_patch;

/* Draws the patch (stream `patch`, root key) into arrays taken from `arena`. */
EW_CHECKED ew_status ew_patch_draw(ew_patch *patch, const ew_world *world, const ew_model *model,
                                   const ew_calendar *calendar, const ew_draws *draws, ew_arena *arena,
                                   ew_error *error);

/* Share of the mean baryon fraction that a halo can hold, s of (1 + (2^(a/3) - 1) (M/Mc)^-a)^(-3/a): Gnedin 2000, ApJ
 * 542, 535, eq. 7. 1 where characteristic_mass is 0. */
double ew_baryon_share(const ew_reionization_parameters *parameters, double mass, double characteristic_mass);

/* Characteristic mass of Okamoto, Gao & Theuns 2008, MNRAS 390, 920, for local reionization at that redshift [Msun]. */
double ew_characteristic_mass(double hubble, double redshift, double reionization_redshift);

/* Critical mass for gas to cool by molecules under a Lyman-Werner background (J21) and streaming [Msun]: Kulkarni,
 * Visbal & Bryan 2021, ApJ 917, 40, eqs 2-4 (coefficients from memory), clamped to J21 <= 30, v <= 60 km/s, z 10-30. */
double ew_molecular_threshold(double redshift, double lyman_werner, double streaming_velocity);

/* Lyman-Werner background J21: fit of Incatasciato, Khochfar & Onorbe 2023, MNRAS 522, 330 (from memory). */
double ew_lyman_werner_background(double redshift);

/* What grew where is one branch's own luck: drawn once per branch and realization (stream `structure`). */
typedef struct {
  double concentration_factor; /* on the median */
  double spin;                 /* lambda' */
  double enrichment_redshift;  /* from here on inflow carries metals from outside, whatever the patch */
  double external_metals;      /* mass fraction in such gas */
} ew_branch_luck;
ew_branch_luck ew_branch_luck_draw(const ew_model *model, const ew_draws *draws, uint64_t branch_key);

/* The same redshift of enrichment alone, for branches of which nothing else is asked. */
double ew_enrichment_redshift_draw(const ew_draws *draws, uint64_t branch_key);

/* ----------------------------------------------------------------------------------------------------- environment */

typedef struct {
  const ew_world *world;
  const ew_calendar *calendar;
  const ew_model *model;
  const ew_patch *patch;
  const ew_draws *draws;
  size_t slot;
  double redshift;        /* at the end of the step */
  ew_nfw halo;            /* as it stands; of a satellite: at infall */
  double virial_velocity; /* km/s */
  bool satellite;         /* no supply from outside */
} ew_environment;

/* The halo part of an environment for a mass at its slot and redshift. */
void ew_environment_set_halo(ew_environment *environment, double mass, double concentration_factor);

/* ---------------------------------------------------------------------------------------------------------- ledger */

typedef enum {
  EW_OUTSIDE,     /* where inflow comes from: negative */
  EW_HALO_GAS,    /* accreted, not in the disc */
  EW_DISC_GAS,    /* can form stars */
  EW_HEATED_GAS,  /* in the galaxy, unavailable for a while */
  EW_EJECTED_GAS, /* out of the galaxy, may return */
  EW_LOST_GAS,    /* out for good */
  EW_LIVING_STARS,
  EW_REMNANTS,
  EW_MADE, /* nucleosynthesis: negative of what was made, sums to 0 over elements */
  EW_RESERVOIR_COUNT
} ew_reservoir;

typedef struct {
  ew_composition in[EW_RESERVOIR_COUNT]; /* Msun */
} ew_ledger;

/* Moves masses by element; what a reservoir of real matter does not have is not moved. */
void ew_ledger_move(ew_ledger *ledger, ew_reservoir from, ew_reservoir to, const ew_composition *amount);

/* Moves that share (clamped to 0-1) of everything in `from`. */
void ew_ledger_move_share(ew_ledger *ledger, ew_reservoir from, ew_reservoir to, double share);

/* Moves `mass` of the composition that `from` has, at most all. */
void ew_ledger_move_mass(ew_ledger *ledger, ew_reservoir from, ew_reservoir to, double mass);

double ew_ledger_mass(const ew_ledger *ledger, ew_reservoir reservoir);
void ew_ledger_add(ew_ledger *ledger, const ew_ledger *other); /* at a merger */

/* Largest |sum over reservoirs| of an element over the sum of their absolute values: 0 to rounding. */
double ew_ledger_imbalance(const ew_ledger *ledger);

/* ---------------------------------------------------------------------------------------------------------- galaxy */

typedef struct ew_galaxy ew_galaxy;

/* A galaxy without stars and gas. Lies in `arena`; NULL when memory is short. */
ew_galaxy *ew_galaxy_new(ew_arena *arena, uint64_t branch_key, const ew_branch_luck *luck);

/* What comes from a halo without a galaxy: baryons that it ever took in, and of those the gas that it still holds,
 * which joins the halo gas. */
typedef struct {
  double baryons, gas;   /* Msun */
  double metal_fraction; /* of the gas */
} ew_received;
void ew_galaxy_receive(ew_galaxy *galaxy, const ew_received *received, const ew_world *world);

/* Advances one slot (from t0 to t1 Gyr, within environment->slot). EW_FAILED when memory is short. */
EW_CHECKED ew_status ew_galaxy_advance(ew_galaxy *galaxy, const ew_environment *environment, double t0, double t1,
                                       ew_error *error);

/* Baryons that the halo and all that joined it ever took in [Msun]. */
double ew_galaxy_baryons(const ew_galaxy *galaxy);
bool ew_galaxy_has_stars(const ew_galaxy *galaxy);
bool ew_galaxy_is_idle(const ew_galaxy *galaxy); /* no gas, no young stars: nothing happens without new supply */
const ew_ledger *ew_galaxy_ledger(const ew_galaxy *galaxy);
uint64_t ew_galaxy_branch(const ew_galaxy *galaxy);
const ew_branch_luck *ew_galaxy_luck(const ew_galaxy *galaxy);

/* Infall: the satellite's halo gas goes over to the host's; what it took in counts for the host from now on. */
void ew_galaxy_fall_in(ew_galaxy *host, ew_galaxy *satellite);

/* The same for a satellite without stars, which is stripped of all its gas and no galaxy any more. */
void ew_galaxy_dissolve(ew_galaxy *host, ew_galaxy *satellite);

/* Time from infall until a halo of that mass reaches the centre of the host's [Gyr]: stream `orbits` of the satellite's
 * branch, slot `ordinal` (it may fall in more than once). */
double ew_sinking_time(const ew_environment *host, double satellite_mass, uint64_t satellite_branch, uint64_t ordinal);

/* A halo that reaches the centre, with its galaxy or without stars (satellite NULL). Sizes grow, contents add up; the
 * satellite must not be used any more. */
typedef struct {
  ew_nfw host;
  ew_nfw satellite; /* at its infall */
  double redshift;
  double mass_ratio; /* satellite over host at infall */
} ew_merger;
EW_CHECKED ew_status ew_galaxy_merge(ew_galaxy *host, ew_galaxy *satellite, const ew_merger *merger,
                                     const ew_environment *environment, ew_error *error);

/* ------------------------------------------------------------------------------------------------ what is observed */

/* All in the catalogue's units; NaN where it has no meaning. */
typedef struct {
  double stellar_mass, stellar_mass_formed, gas_mass; /* Msun */
  double luminosity_v, magnitude_v;                   /* Lsun,V; mag */
  double metallicity, metallicity_spread;             /* dex */
  double abundance[EW_ELEMENT_COUNT];                 /* mean [X/Fe], dex */
  double half_light_radius;                           /* pc, projected */
  double velocity_dispersion;                         /* km/s, line of sight, global */
  double time_50, time_90;                            /* Gyr */
  double first_star_fraction;
  double last_merger_redshift;
  int64_t luminous_mergers, dark_mergers;
  int64_t quenched; /* 1, 0, -1: never formed a star */
} ew_observables;

void ew_galaxy_observe(ew_galaxy *galaxy, const ew_environment *environment, ew_observables *observables);

/* The same of a halo that never had a galaxy. */
void ew_observe_nothing(ew_observables *observables);

#endif
