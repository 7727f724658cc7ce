/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * tree: merger trees - the type, the builder that grows them by extended Press-Schechter, and the tree file.
 *
 * A tree is an array of branches; a branch is a contiguous run of nodes (mass, redshift), earliest first, and the
 * branch and node that it joins. Branches stand before the branch that they join, in an order in which a branch follows
 * directly upon all that joins it; the main branch is last. Mass is the virial mass in Msun. A node's mass is that just
 * after any merger at that node; a merger is two nodes of equal redshift, before and after, and the satellite's branch
 * ends at that redshift. Between nodes mass is linear in redshift to one per cent; what nodes gain beyond joins is
 * smooth accretion. */
#ifndef ELFINWOOD_TREE_H
#define ELFINWOOD_TREE_H

#include "elfinwood/halo.h"

typedef struct {
  uint64_t key;         /* intrinsic name, see ew_branch_key_root */
  uint32_t first_node;  /* index into the tree's nodes */
  uint32_t node_count;  /* at least 1 */
  int32_t joins_branch; /* index into the tree's branches; -1 for the main branch */
  uint32_t joins_node;  /* index into the tree's nodes: the second of the merger's two; 0 for the main branch */
} ew_branch;

/* Borrowed memory: valid as long as the builder or reader that made the tree says. */
typedef struct {
  uint64_t number;
  int64_t halo_id; /* the user's own for imported trees, -1: none */
  double weight;
  size_t branch_count, node_count;
  const ew_branch *branch;
  const double *mass;     /* [node_count] Msun */
  const double *redshift; /* [node_count] */
} ew_tree;

/* What a tree is grown from. */
typedef struct {
  uint64_t number;
  int64_t halo_id; /* -1: none */
  double weight;   /* 1 by default */
  double mass;     /* Msun */
  double redshift;
} ew_root;

typedef struct {
  int source;              /* 0: grow */
  double resolution_mass;  /* Msun */
  double highest_redshift; /* branches are followed up to here */
  double split_amplitude;  /* G0 of Parkinson, Cole & Helly 2008 */
  double split_mass_slope; /* gamma1 */
  double split_peak_slope; /* gamma2 */
} ew_tree_parameters;

/* Group "trees". */
extern const ew_parameter ew_tree_rows[];

/* --------------------------------------------------------------------------------------------------------- builder */

/* Binary splits by extended Press-Schechter with the correction of Parkinson, Cole & Helly 2008, MNRAS 383, 557, in the
 * limit of vanishing step: waiting times between splits are drawn from the exact hazard along the smooth drift of the
 * mass. With split_amplitude 1 and both slopes 0 it is plain extended Press-Schechter. */

typedef struct ew_tree_builder ew_tree_builder;

/* Tables for roots up to `largest_mass`. Refuses a resolution that is not below it. Shared by threads. */
EW_CHECKED ew_status ew_tree_builder_new(ew_tree_builder **builder, const ew_spectrum *spectrum,
                                         const ew_tree_parameters *parameters, double largest_mass, ew_error *error);
void ew_tree_builder_free(ew_tree_builder *builder);

/* Memory for one tree at a time, reused from tree to tree: one per thread. */
typedef struct ew_tree_memory ew_tree_memory;
ew_tree_memory *ew_tree_memory_new(void); /* NULL when memory is short */
void ew_tree_memory_free(ew_tree_memory *memory);

/* Grows the tree of a root with the draws' `assembly` stream. The tree lies in `memory` until the next call with it. It
 * does not depend on the builder's largest mass; a lower highest redshift only cuts it. */
EW_CHECKED ew_status ew_tree_grow(const ew_tree_builder *builder, const ew_root *root, const ew_draws *draws,
                                  ew_tree_memory *memory, ew_tree *tree, ew_error *error);

/* Instantaneous rates of a halo of that mass, per unit of the barrier omega = delta_c/D at the barrier given: number of
 * splits with both parts above the resolution, and the mass fraction lost to parts below it. */
double ew_split_rate(const ew_tree_builder *builder, double mass, double barrier);
double ew_smooth_rate(const ew_tree_builder *builder, double mass, double barrier);

/* ------------------------------------------------------------------------------------------------ looking at trees */

/* Mass of a branch at a redshift, linear between its nodes; 0 before its first node, the last mass after its last. */
double ew_branch_mass(const ew_tree *tree, const ew_branch *branch, double redshift);

/* Highest redshift at which the branch (the main one: the root) had that share of its final mass; its first node's
 * redshift if it was never below. */
double ew_formation_redshift(const ew_tree *tree, const ew_branch *branch, double share);

/* Checks every rule at the head of this page; EW_REFUSED with the branch at fault otherwise. */
EW_CHECKED ew_status ew_tree_check(const ew_tree *tree, ew_error *error);

/* ------------------------------------------------------------------------------------------------------- tree file */

typedef struct ew_tree_file ew_tree_file;

/* What the file says about its making. */
typedef struct {
  const char *parameter_text; /* the resolved parameters, libconfig */
  const ew_cosmology_parameters *cosmology;
  double resolution_mass;
  uint64_t seed;
} ew_tree_file_header;

/* HDF5 file with /trees, /branches and /nodes, written as PATH.partial and renamed to PATH by ew_tree_file_finish.
 * Trees must be appended in order. ew_tree_file_close leaves the .partial (attribute complete = 0) if not finished. */
EW_CHECKED ew_status ew_tree_file_create(ew_tree_file **file, const char *path, const ew_tree_file_header *header,
                                         ew_error *error);
EW_CHECKED ew_status ew_tree_file_append(ew_tree_file *file, const ew_tree *tree, ew_error *error);
EW_CHECKED ew_status ew_tree_file_finish(ew_tree_file *file, ew_error *error);
void ew_tree_file_close(ew_tree_file *file); /* accepts NULL */

/* Brings to the disk what it can; the number of whole trees that the file holds. */
uint64_t ew_tree_file_kept(ew_tree_file *file);

#endif
