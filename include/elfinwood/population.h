/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * population: many trees, many realizations, many models - roots, the registry of all parameters, and the driver. */
#ifndef ELFINWOOD_POPULATION_H
#define ELFINWOOD_POPULATION_H

#include "elfinwood/galaxy.h"
#include "elfinwood/tree.h"

#include <signal.h>

/* -------------------------------------------------------------------------------------------------------- settings */

typedef enum { EW_ROOTS_SINGLE, EW_ROOTS_RANGE } ew_root_choice;

typedef struct {
  int kind;             /* ew_root_choice */
  double mass;          /* Msun, for "single" */
  double mass_range[2]; /* Msun, log-uniform, for "range" */
  int64_t count;
  double redshift;
} ew_root_parameters;

typedef struct {
  int64_t seed;
} ew_random_parameters;

typedef struct {
  int64_t realizations;
  double time_step; /* Gyr */
} ew_ensemble_parameters;

typedef struct {
  bool members;
} ew_output_parameters;

/* The target of the whole parameter table. */
typedef struct {
  ew_cosmology_parameters cosmology;
  ew_spectrum_parameters spectrum;
  ew_root_parameters roots;
  ew_tree_parameters trees;
  ew_stars_parameters stars;
  ew_model model;
  ew_random_parameters random;
  ew_ensemble_parameters ensemble;
  ew_output_parameters output;
} ew_settings;

/* Every parameter row of the library, in the order in which it is printed. */
const ew_parameter_table *ew_settings_table(void);

/* The processes that act on galaxies, `*count` of them. */
const ew_process_record *const *ew_processes(size_t *count);

/* Checks between parameters (values holds an ew_settings); EW_REFUSED with one line. */
EW_CHECKED ew_status ew_settings_check(const ew_parameter_values *values, ew_error *error);

/* ----------------------------------------------------------------------------------------------------------- roots */

/* Root number draws->tree, from stream `roots`: it does not depend on how many are asked for. */
ew_root ew_root_draw(const ew_settings *settings, const ew_draws *draws);

/* The largest mass that ew_root_draw can give. */
double ew_roots_largest_mass(const ew_settings *settings);

/* ---------------------------------------------------------------------------------------------------------- tables */

/* What a run needs besides its models, built once: cosmology, spectrum, split, concentration and stellar tables and the
 * calendar. */
typedef struct {
  ew_settings settings;
  ew_cosmology *cosmology;
  ew_spectrum *spectrum;
  ew_tree_builder *builder;
  ew_concentration *concentration;
  ew_stars *stars;
  ew_calendar calendar;
  ew_world world;
} ew_laboratory;

EW_CHECKED ew_status ew_laboratory_new(ew_laboratory **laboratory, const ew_settings *settings, ew_error *error);
void ew_laboratory_free(ew_laboratory *laboratory);

/* ------------------------------------------------------------------------------------------------------------ rows */

/* One galaxy of one realization: a row of /galaxies. */
typedef struct {
  int64_t tree, realization, model;
  uint64_t branch;
  int64_t halo_id;
  int64_t central; /* 1 or 0 */
  double weight;
  double halo_mass, peak_halo_mass; /* Msun */
  double formation_redshift;
  double reionization_redshift;
  double streaming_velocity; /* km/s */
  ew_observables observed;
} ew_galaxy_row;

/* One tree: a row of /trees. */
typedef struct {
  int64_t tree;
  int64_t halo_id;
  double weight;
  double root_mass, root_redshift;
  double formation_redshift;
  int64_t branches, nodes;
  double smooth_fraction; /* of the root's mass that came by smooth accretion, over all branches */
} ew_tree_row;

/* Takes what a tree gave, in the order of tree numbers, from one thread at a time. Rows are ordered by model,
 * realization, central first. */
typedef struct {
  ew_status (*take)(void *context, const ew_tree_row *tree, const ew_galaxy_row *rows, size_t count, ew_error *error);
  void *context;
} ew_row_sink;

/* ---------------------------------------------------------------------------------------------------------- driver */

typedef struct {
  const ew_laboratory *laboratory;
  const ew_model *models; /* [model_count] */
  size_t model_count;
  uint64_t first_tree, tree_count;
  uint64_t realization_offset[EW_PROCESS_COUNT]; /* added to each process's realization number */
  int threads;                                   /* 0: as many as OpenMP offers */
  bool progress;                                 /* a line on stderr if that is a terminal */
  const volatile sig_atomic_t *stop;             /* non-zero: drop the trees under way and return; may be NULL */
} ew_plan;

/* What a run that was stopped says. */
#define EW_INTERRUPTED "interrupted"

/* Grows each tree once and evolves it under every model and realization. Rows do not depend on the number of threads.
 * Memory is bounded by a window of trees (shorter when each gives many rows) and the largest tree per thread. *done
 * counts trees handed to the sink. EW_FAILED "interrupted" when stopped; the sink then holds a whole prefix. */
EW_CHECKED ew_status ew_run(const ew_plan *plan, const ew_row_sink *sink, uint64_t *done, ew_error *error);

/* Memory for the evolution of one tree at a time: one per thread. */
typedef struct ew_evolution ew_evolution;
ew_evolution *ew_evolution_new(void);
void ew_evolution_free(ew_evolution *evolution);

/* Looks at a tree once; realizations follow. The tree must outlive it. */
EW_CHECKED ew_status ew_evolution_load(ew_evolution *evolution, const ew_laboratory *laboratory, const ew_tree *tree,
                                       ew_error *error);
EW_CHECKED ew_status ew_evolution_run(ew_evolution *evolution, const ew_model *model, const ew_draws *draws,
                                      ew_error *error);
const ew_tree_row *ew_evolution_tree_row(const ew_evolution *evolution);
/* The rows of the last run: the central, then bound members if the settings ask for them. */
const ew_galaxy_row *ew_evolution_rows(const ew_evolution *evolution, size_t *count);
/* Makes runs return EW_FAILED, EW_INTERRUPTED as soon as *stop is not 0; NULL: never. */
void ew_evolution_heed(ew_evolution *evolution, const volatile sig_atomic_t *stop);
/* Adds up the ledgers of all galaxies alive at the end of the last run. */
void ew_evolution_ledger(const ew_evolution *evolution, ew_ledger *ledger);

#endif
