/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The tree file: trees one after the other in columns of trees, branches and nodes. All indices count through the whole
 * file; branch_offset and node_offset have one entry more than there are trees and branches, so that tree i owns the
 * branches from branch_offset[i] up to branch_offset[i + 1]. */
#include "core/hdf.h"
#include "elfinwood/tree.h"

#include <stdlib.h>

typedef enum {
  NUMBER,
  HALO_ID,
  WEIGHT,
  ROOT_MASS,
  ROOT_REDSHIFT,
  BRANCH_OFFSET,
  NODE_OFFSET,
  JOINS_BRANCH,
  JOINS_NODE,
  KEY,
  MASS,
  REDSHIFT,
  COLUMN_COUNT
} column_index;

enum { TREE_CHUNK = 512, BRANCH_CHUNK = 2048, NODE_CHUNK = 8192 };

static const ew_hdf_column_header headers[COLUMN_COUNT] = {
    [NUMBER] = {"/trees/number", EW_HDF_KEY, 1, TREE_CHUNK, "1", "number of the tree, which names its random streams"},
    [HALO_ID] = {"/trees/halo_id", EW_HDF_INTEGER, 1, TREE_CHUNK, "1", "the user's own identifier; -1: none"},
    [WEIGHT] = {"/trees/weight", EW_HDF_REAL, 1, TREE_CHUNK, "1", "statistical weight of the tree"},
    [ROOT_MASS] = {"/trees/root_mass", EW_HDF_REAL, 1, TREE_CHUNK, "Msun", "virial mass of the root"},
    [ROOT_REDSHIFT] = {"/trees/root_redshift", EW_HDF_REAL, 1, TREE_CHUNK, "1", "redshift of the root"},
    [BRANCH_OFFSET] = {"/trees/branch_offset", EW_HDF_INTEGER, 1, TREE_CHUNK, "1",
                       "first branch of each tree, then the number of branches"},
    [NODE_OFFSET] = {"/branches/node_offset", EW_HDF_INTEGER, 1, BRANCH_CHUNK, "1",
                     "first node of each branch, then the number of nodes"},
    [JOINS_BRANCH] = {"/branches/joins_branch", EW_HDF_INTEGER, 1, BRANCH_CHUNK, "1",
                      "the branch that it joins; -1: main branch"},
    [JOINS_NODE] = {"/branches/joins_node", EW_HDF_INTEGER, 1, BRANCH_CHUNK, "1",
                    "the node that it joins, second of the merger's two; -1: main branch"},
    [KEY] = {"/branches/key", EW_HDF_KEY, 1, BRANCH_CHUNK, "1", "intrinsic name of the branch"},
    [MASS] = {"/nodes/mass", EW_HDF_REAL, 1, NODE_CHUNK, "Msun", "virial mass, just after any merger at the node"},
    [REDSHIFT] = {"/nodes/redshift", EW_HDF_REAL, 1, NODE_CHUNK, "1", "redshift"},
};

struct ew_tree_file {
  ew_hdf_file *file;
  ew_hdf_column *column[COLUMN_COUNT];
  int64_t branches, nodes; /* pushed so far */
};

/* ----------------------------------------------------------------------------------------------------------- create */

static ew_status put_cosmology(ew_hdf_file *file, const ew_cosmology_parameters *cosmology, ew_error *error) {
  const struct {
    const char *name;
    double value;
  } reals[] = {
      {"hubble", cosmology->hubble},
      {"omega_matter", cosmology->omega_matter},
      {"omega_baryon", cosmology->omega_baryon},
      {"spectral_index", cosmology->spectral_index},
      {"sigma8", cosmology->sigma8},
      {"cmb_temperature", cosmology->cmb_temperature},
      {"neutrino_number", cosmology->neutrino_number},
  };
  ew_status status = ew_hdf_put_integer(file, "radiation", cosmology->radiation, error);
  for (size_t i = 0; i < sizeof reals / sizeof reals[0] && status == EW_OK; i++)
    status = ew_hdf_put_real(file, reals[i].name, reals[i].value, error);
  return status;
}

static ew_status put_header(ew_hdf_file *file, const ew_tree_file_header *header, ew_error *error) {
  ew_status status = ew_hdf_put_text(file, "parameters", header->parameter_text, error);
  if (status == EW_OK)
    status = ew_hdf_put_key(file, "seed", header->seed, error);
  if (status == EW_OK)
    status = ew_hdf_put_real(file, "resolution_mass", header->resolution_mass, error);
  if (status == EW_OK)
    status = put_cosmology(file, header->cosmology, error);
  return status;
}

static ew_status add_columns(ew_tree_file *file, ew_error *error) {
  ew_status status = EW_OK;
  for (size_t i = 0; i < COLUMN_COUNT && status == EW_OK; i++)
    status = ew_hdf_add_column(&file->column[i], file->file, &headers[i], error);
  return status;
}

/* Both offsets begin with 0, before any tree: a file without trees has it too. */
static ew_status start(ew_tree_file *file, ew_error *error) {
  const int64_t zero = 0;
  ew_status status = ew_hdf_begin(file->file, error);
  if (status == EW_OK)
    status = ew_hdf_push(file->column[BRANCH_OFFSET], &zero, 1, error);
  if (status == EW_OK)
    status = ew_hdf_push(file->column[NODE_OFFSET], &zero, 1, error);
  if (status == EW_OK)
    status = ew_hdf_seal(file->file, error);
  return status == EW_OK ? ew_hdf_commit(file->file, error) : status;
}

ew_status ew_tree_file_create(ew_tree_file **file, const char *path, const ew_tree_file_header *header,
                              ew_error *error) {
  *file = NULL;
  ew_tree_file *made = calloc(1, sizeof *made);
  if (!made)
    return ew_fail_memory(error, "a tree file");
  ew_status status = ew_hdf_create(&made->file, path, error);
  if (status == EW_OK)
    status = put_header(made->file, header, error);
  if (status == EW_OK)
    status = add_columns(made, error);
  if (status == EW_OK)
    status = start(made, error);
  if (status != EW_OK) {
    ew_tree_file_close(made);
    return status;
  }
  *file = made;
  return EW_OK;
}

/* ----------------------------------------------------------------------------------------------------------- append */

static ew_status push_tree(ew_tree_file *file, const ew_tree *tree, ew_error *error) {
  const ew_branch *main_branch = &tree->branch[tree->branch_count - 1];
  size_t root = main_branch->first_node + main_branch->node_count - 1;
  int64_t branch_end = file->branches + (int64_t)tree->branch_count;
  const struct {
    column_index column;
    const void *value;
  } row[] = {
      {NUMBER, &tree->number},
      {HALO_ID, &tree->halo_id},
      {WEIGHT, &tree->weight},
      {ROOT_MASS, &tree->mass[root]},
      {ROOT_REDSHIFT, &tree->redshift[root]},
      {BRANCH_OFFSET, &branch_end},
  };
  ew_status status = EW_OK;
  for (size_t i = 0; i < sizeof row / sizeof row[0] && status == EW_OK; i++)
    status = ew_hdf_push(file->column[row[i].column], row[i].value, 1, error);
  return status;
}

static ew_status push_branch(ew_tree_file *file, const ew_branch *branch, ew_error *error) {
  bool is_main = branch->joins_branch < 0;
  int64_t joins_branch = is_main ? -1 : file->branches + branch->joins_branch;
  int64_t joins_node = is_main ? -1 : file->nodes + branch->joins_node;
  int64_t node_end = file->nodes + branch->first_node + branch->node_count;
  ew_status status = ew_hdf_push(file->column[JOINS_BRANCH], &joins_branch, 1, error);
  if (status == EW_OK)
    status = ew_hdf_push(file->column[JOINS_NODE], &joins_node, 1, error);
  if (status == EW_OK)
    status = ew_hdf_push(file->column[KEY], &branch->key, 1, error);
  return status == EW_OK ? ew_hdf_push(file->column[NODE_OFFSET], &node_end, 1, error) : status;
}

/* Offsets alone say where nodes lie, so they must lie one branch after the other. */
static bool lies_in_order(const ew_tree *tree) {
  size_t end = 0;
  for (size_t i = 0; i < tree->branch_count; i++) {
    if (tree->branch[i].first_node != end)
      return false;
    end += tree->branch[i].node_count;
  }
  return tree->branch_count > 0 && end == tree->node_count;
}

ew_status ew_tree_file_append(ew_tree_file *file, const ew_tree *tree, ew_error *error) {
  if (!lies_in_order(tree))
    return ew_fail(error, EW_FAILED, "tree %llu: its nodes are not in the order of its branches",
                   (unsigned long long)tree->number);
  ew_status status = push_tree(file, tree, error);
  for (size_t i = 0; i < tree->branch_count && status == EW_OK; i++)
    status = push_branch(file, &tree->branch[i], error);
  if (status == EW_OK)
    status = ew_hdf_push(file->column[MASS], tree->mass, tree->node_count, error);
  if (status == EW_OK)
    status = ew_hdf_push(file->column[REDSHIFT], tree->redshift, tree->node_count, error);
  if (status != EW_OK)
    return status;
  file->branches += (int64_t)tree->branch_count;
  file->nodes += (int64_t)tree->node_count;
  return ew_hdf_seal(file->file, error);
}

/* ------------------------------------------------------------------------------------------------------------ close */

uint64_t ew_tree_file_kept(ew_tree_file *file) {
  return ew_hdf_kept_rows(file->column[NUMBER]);
}

ew_status ew_tree_file_finish(ew_tree_file *file, ew_error *error) {
  return ew_hdf_finish(file->file, error);
}

void ew_tree_file_close(ew_tree_file *file) {
  if (!file)
    return;
  ew_hdf_close(file->file);
  free(file);
}
