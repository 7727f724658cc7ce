/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * How one tree is evolved; internal to the population room.
 *
 * Branches are taken in the tree's order, so all that joins a branch is done before it. Each branch leaves an
 * `arrival`: what it brings to its host. Most branches never hold a galaxy; of those only the baryons are counted, node
 * by node. A branch wakes when its halo first exceeds the cooling threshold or a galaxy falls into it; from then on it
 * is advanced slot by slot with all its members. A branch that joins its host in slot k is advanced up to slot k - 1 by
 * itself, and from slot k on by the host. */
#ifndef EW_POPULATION_EVOLUTION_H
#define EW_POPULATION_EVOLUTION_H

#include "elfinwood/population.h"

/* A halo within another, with its galaxy or dark. */
typedef struct ew_member {
  struct ew_member *next;
  struct ew_member *bound_to; /* the member that it orbits; NULL: the central */
  ew_galaxy *galaxy;          /* NULL: starless */
  ew_nfw halo;                /* at infall */
  double mass_ratio;          /* to what it orbits, when it began to */
  double sinks_at;            /* Gyr */
  const ew_branch *branch;
  uint64_t infalls; /* ordinal of the next orbit draw */
} ew_member;

/* What a branch brings to its host, or has at the end of the run. */
typedef struct {
  double baryons;     /* Msun ever taken in, with all that joined */
  double gas;         /* Msun still in a halo without a galaxy */
  double gas_metals;  /* Msun of metals in it */
  ew_galaxy *galaxy;  /* NULL: never had one, or one without stars that is dissolved by its host */
  ew_member *members; /* of the galaxy */
} ew_arrival;

/* A tree as galaxies see it; the same for all realizations. */
typedef struct {
  uint32_t *node_slot;    /* [node_count] slot that holds the node's time */
  uint32_t *joiner;       /* [branch_count - 1] branches by host, then by time of joining */
  uint32_t *first_joiner; /* [branch_count + 1] into joiner */
  double *peak_mass;      /* [branch_count] Msun */
} ew_skeleton;

struct ew_evolution {
  const ew_laboratory *laboratory;
  const ew_tree *tree;
  ew_arena *arena;
  ew_skeleton skeleton;
  ew_arena_mark after_skeleton;
  ew_tree_row row;
  /* of the realization under way */
  const volatile sig_atomic_t *stop;
  const ew_model *model;
  const ew_draws *draws;
  ew_patch patch;
  ew_environment environment;
  ew_arrival *arrival; /* [branch_count] */
  ew_ledger gone;      /* of galaxies that were dissolved */
  ew_galaxy_row *rows;
  size_t row_count;
};

EW_CHECKED ew_status ew_skeleton_make(ew_evolution *evolution, ew_error *error);

/* The slot in which a branch with a host falls in; the slot before which any branch is advanced by itself. */
size_t ew_infall_slot(const ew_evolution *evolution, const ew_branch *branch);
size_t ew_branch_end_slot(const ew_evolution *evolution, const ew_branch *branch);

/* Mass of a branch at the ends of slots that only go up: keeps its place between calls. */
typedef struct {
  const ew_tree *tree;
  size_t node, last;
} ew_mass_reader;
ew_mass_reader ew_mass_reader_at(const ew_tree *tree, const ew_branch *branch);
double ew_mass_read(ew_mass_reader *reader, double redshift);

/* Counts the baryons of a branch from its first node up to the slot (none of it included), everything dark. */
void ew_count_baryons(ew_evolution *evolution, size_t branch, size_t until_slot);

/* First slot in which the branch needs a galaxy, up to the one in which it falls in; EW_NEVER if it needs none. */
#define EW_NEVER SIZE_MAX
size_t ew_waking_slot(const ew_evolution *evolution, size_t branch);

/* Members (members.c). */
typedef struct {
  ew_galaxy *galaxy; /* the central */
  ew_member *members;
} ew_household;
EW_CHECKED ew_status ew_household_admit(ew_evolution *evolution, ew_household *home, size_t branch, ew_error *error);
EW_CHECKED ew_status ew_household_advance(ew_evolution *evolution, ew_household *home, double t0, double t1,
                                          ew_error *error);
EW_CHECKED ew_status ew_household_merge(ew_evolution *evolution, ew_household *home, double now, ew_error *error);
ew_environment ew_member_environment(const ew_evolution *evolution, const ew_member *member);

EW_CHECKED ew_status ew_evolution_collect(ew_evolution *evolution, ew_error *error); /* rows.c */

#endif
