/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The state of a galaxy and the step that processes act on; internal to the galaxy room.
 *
 * A galaxy, its star events and its components lie in the arena of the realization and are never freed one by one, so a
 * merger only joins lists. */
#ifndef EW_GALAXY_STATE_H
#define EW_GALAXY_STATE_H

#include "elfinwood/galaxy.h"

#define EW_PENDING_SPAN     0.075   /* Gyr: longer than the life of any star that explodes */
#define EW_COHORT_SPAN      0.1     /* Gyr of formation that age together */
#define EW_HALF_MASS_RATIO  1.3048  /* 3D half-mass radius over scale of a Plummer sphere, (2^(2/3) - 1)^(-1/2) */
#define EW_EXPONENTIAL_HALF 1.67835 /* half-mass radius of an exponential disc over its scale */

/* Stars of one progenitor, a Plummer sphere. */
typedef struct ew_component {
  struct ew_component *next;
  struct ew_component *joined; /* the component that took this one in, or NULL */
  double mass;                 /* Msun formed */
  double radius;               /* 3D half-mass, kpc */
  double light;                /* Lsun,V; filled when observed */
} ew_component;

/* Stars of one slot of one galaxy. Abundances are means over its star clusters, by mass. */
typedef struct ew_star_event {
  struct ew_star_event *next;
  ew_component *component;
  uint64_t branch; /* of birth */
  double time;     /* Gyr */
  double mass;     /* Msun formed */
  double metal_fraction;
  double iron_mass;               /* Msun formed in clusters that hold iron: the weight of the means below */
  double iron, iron_square;       /* mean [Fe/H] and its square */
  double ratio[EW_ELEMENT_COUNT]; /* mean [X/Fe] */
  bool metal_free;
} ew_star_event;

/* Stars that age together. Composition is the sum over mass formed. */
typedef struct {
  double mass;         /* Msun formed of the normal IMF */
  double time;         /* Gyr, mean by mass */
  double returned;     /* Msun given back so far */
  double white_dwarfs; /* Msun left so far */
  double ia_expected;  /* Ia supernovae expected so far */
  double done;         /* Gyr: aged up to here */
  ew_composition formed;
} ew_cohort;

/* Deaths of massive stars that fall into one slot. */
typedef struct {
  double count;
  double energy; /* 1e51 erg */
  double first_star_count;
  double first_star_energy; /* the part from first stars */
  ew_composition ejected;   /* leaves living stars for the gas */
  ew_composition remnant;   /* leaves living stars for remnants */
  ew_composition made;
} ew_deaths;

struct ew_galaxy {
  ew_ledger ledger;
  ew_arena *arena;
  uint64_t branch;
  ew_branch_luck luck;
  double baryons; /* ever taken in, with all that joined; Msun */
  double supply;  /* Msun taken in during the last step */
  double held,
      held_squares;   /* sum over supernovae of the share of their ejecta that the gas holds, and of its square */
  double recovers_at; /* Gyr: gas heated by first stars is unavailable until then */
  uint64_t first_star_events;
  bool idle;                             /* no gas and no young stars: nothing happens but that stars grow old */
  double formed, formed_metal_free;      /* Msun */
  double last_formed_at;                 /* Gyr */
  double response_stars, response_gas;   /* Msun, that the stars have responded to */
  double response_scale;                 /* kpc, half-mass radius of that gas */
  double half_mass_radius, half_mass_at; /* kpc, as last solved for, and `formed` at that time */
  double last_merger_redshift;
  int64_t luminous_mergers, dark_mergers;
  ew_component *component; /* the first is that of stars born here, if any were */
  ew_component *born_here;
  ew_star_event *event, *last_event;
  ew_deaths *pending; /* ring over slots, NULL before the first stars */
  size_t pending_count;
  size_t pending_slot; /* the slot that pending[pending_first] stands for */
  size_t pending_first;
  ew_cohort *cohort; /* by formation time, NULL before the first normal stars */
  size_t cohort_count;
};

/* One slot of one galaxy. */
typedef struct {
  ew_galaxy *galaxy;
  const ew_environment *environment;
  double start, end; /* Gyr */
  double share;      /* baryons that the halo can hold over the mean, 0-1 */
  double supernovae; /* that exploded in this step */
  double energy;     /* 1e51 erg, of those */
  bool short_of_memory;
} ew_step;

static inline double ew_step_length(const ew_step *step) {
  return step->end - step->start;
}

/* Share that leaves within the step at an exponential rate. */
double ew_step_decay(const ew_step *step, double time_scale);

static inline bool ew_step_reionized(const ew_step *step) {
  const ew_environment *environment = step->environment;
  return environment->redshift < environment->patch->reionization_redshift;
}

/* Several streams of one process in one slot, apart from each other. */
typedef enum {
  EW_DRAW_CLUSTERS,
  EW_DRAW_SUPERNOVAE,
  EW_DRAW_IA,
  EW_DRAW_IA_SETTLED,
  EW_DRAW_MIXING,
  EW_DRAW_PURPOSES
} ew_draw_purpose;
ew_stream ew_step_stream(const ew_step *step, ew_process process, ew_draw_purpose purpose);

/* Supernovae enrich the gas; a share of the gas leaves; how many supernovae the gas's metals stem from, effectively. */
void ew_hold_supernovae(ew_galaxy *galaxy, double number);
void ew_release_supernovae(ew_galaxy *galaxy, double share);
double ew_effective_supernovae(const ew_galaxy *galaxy);

double ew_gas_in_galaxy(const ew_galaxy *galaxy); /* disc and heated gas, Msun */
double ew_stellar_mass(const ew_galaxy *galaxy);  /* living stars and remnants, Msun */

/* Half-mass radius of the gas disc, from spin [kpc]. */
double ew_disc_half_mass_radius(const ew_galaxy *galaxy, const ew_environment *environment);

/* Brings all stars of a galaxy up to the end of the slot, before it merges, wakes or is observed. What explodes on the
 * way, at most 0.1 Gyr late in a galaxy that has gas, gives metals but no wind. */
void ew_galaxy_settle(ew_galaxy *galaxy, const ew_environment *environment);

/* ----------------------------------------------------------------------------- processes, in the order in which they
 * act */

void ew_take_in_gas(ew_step *step);   /* reionization.c */
void ew_evaporate_gas(ew_step *step); /* reionization.c */
void ew_cycle_gas(ew_step *step);     /* gas.c: heated and ejected gas returns, halo gas joins the disc */
void ew_form_stars(ew_step *step);    /* star_formation.c; calls first_stars.c for gas below the critical metallicity */
void ew_form_first_stars(ew_step *step);
void ew_explode_supernovae(ew_step *step); /* deaths.c */
/* old_stars.c: gas is kept or leaves; `all`: also those cohorts that could wait. */
void ew_age_stars(ew_step *step, bool keep_gas, bool all);
void ew_blow_wind(ew_step *step);      /* feedback.c */
void ew_respond_slowly(ew_step *step); /* response.c */
void ew_respond_fast(ew_step *step);

/* Composition of gas from outside with that mass fraction of metals. */
ew_composition ew_external_gas(const ew_world *world, double mass, double metal_fraction);

/* A cluster of stars takes its share of metals: the gas's mean, scattered by incomplete mixing, but no more than the
 * gas has (mixing.c). `fraction` gets mass fractions that add up to 1. */
void ew_mix_cluster(const ew_step *step, ew_stream *stream, double cluster_mass, ew_composition *fraction);

/* Bookkeeping of newly formed stars (stars_book.c). */
ew_star_event *ew_event_of_slot(ew_step *step, bool metal_free);
void ew_event_add(ew_star_event *event, double mass, const ew_composition *fraction);
void ew_cohort_add(ew_step *step, double mass, const ew_composition *fraction);
void ew_component_add(ew_step *step, double mass, double radius); /* born with that half-mass radius, kpc */

/* A star of that composition that dies `age` after the middle of the step (deaths.c); `number` of them alike. */
typedef struct {
  ew_death death;
  double age; /* Gyr */
  double number;
  bool first_star;
  const ew_composition *fraction;
} ew_dying;
void ew_schedule_death(ew_step *step, const ew_dying *dying);
/* Brings in the pending deaths of a galaxy that merges. */
bool ew_pending_join(ew_galaxy *galaxy, const ew_galaxy *other, const ew_calendar *calendar);

/* ------------------------------------------------------------------------------------------------ components and
 * profiles */

double ew_plummer_share(double radius, double half_mass_radius); /* of the mass inside a radius */
double ew_half_mass_radius(ew_galaxy *galaxy);                   /* of all stars, kpc; 0 without stars */
double ew_projected_half_light_radius(const ew_galaxy *galaxy);  /* kpc */
void ew_scale_components(ew_galaxy *galaxy, double factor);
ew_component *ew_component_root(ew_component *component);
void ew_limit_components(ew_galaxy *galaxy); /* keeps their number bounded */
double ew_mass_inside(const ew_galaxy *galaxy, const ew_environment *environment, double radius);

/* Line-of-sight dispersion of the stars, km/s (kinematics.c). */
double ew_velocity_dispersion(const ew_galaxy *galaxy, const ew_environment *environment);

#endif
