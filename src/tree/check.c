/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The rules that every tree keeps, whoever made it. */
#include "elfinwood/tree.h"

#include <math.h>

#define JOIN_TOLERANCE 1e-9 /* of 1 + z at a merger */

static ew_status fault(ew_error *error, const ew_tree *tree, size_t branch, const char *what) {
  return ew_fail(error, EW_REFUSED, "tree %llu, branch %zu: %s", (unsigned long long)tree->number, branch, what);
}

static ew_status check_nodes(const ew_tree *tree, size_t index, ew_error *error) {
  const ew_branch *branch = &tree->branch[index];
  if (branch->node_count == 0 || branch->first_node + (size_t)branch->node_count > tree->node_count)
    return fault(error, tree, index, "its nodes are outside the tree's");
  for (size_t i = branch->first_node; i < branch->first_node + branch->node_count; i++) {
    if (!(tree->mass[i] > 0.0 && isfinite(tree->mass[i])))
      return fault(error, tree, index, "a node's mass is not positive");
    if (!(tree->redshift[i] >= 0.0 && isfinite(tree->redshift[i])))
      return fault(error, tree, index, "a node's redshift is not a number of 0 or more");
    if (i > branch->first_node && tree->redshift[i] > tree->redshift[i - 1])
      return fault(error, tree, index, "its nodes do not run to lower redshift");
  }
  return EW_OK;
}

static ew_status check_join(const ew_tree *tree, size_t index, ew_error *error) {
  const ew_branch *branch = &tree->branch[index];
  bool last = index + 1 == tree->branch_count;
  if (last != (branch->joins_branch < 0))
    return fault(error, tree, index, "the last branch, and no other, joins nothing");
  if (last)
    return EW_OK;
  if ((size_t)branch->joins_branch <= index || (size_t)branch->joins_branch >= tree->branch_count)
    return fault(error, tree, index, "it must join a branch that stands after it");
  const ew_branch *host = &tree->branch[branch->joins_branch];
  size_t node = branch->joins_node;
  if (node <= host->first_node || node >= host->first_node + (size_t)host->node_count)
    return fault(error, tree, index, "it must join at a node after its host's first");
  double z = tree->redshift[branch->first_node + branch->node_count - 1];
  if (!(fabs(z - tree->redshift[node]) <= JOIN_TOLERANCE * (1.0 + z) &&
        fabs(z - tree->redshift[node - 1]) <= JOIN_TOLERANCE * (1.0 + z)))
    return fault(error, tree, index, "it does not end at the redshift of the merger's two nodes");
  return EW_OK;
}

ew_status ew_tree_check(const ew_tree *tree, ew_error *error) {
  if (tree->branch_count == 0)
    return ew_fail(error, EW_REFUSED, "tree %llu has no branch", (unsigned long long)tree->number);
  for (size_t i = 0; i < tree->branch_count; i++) {
    ew_status status = check_nodes(tree, i, error);
    if (status == EW_OK)
      status = check_join(tree, i, error);
    if (status != EW_OK)
      return status;
  }
  return EW_OK;
}
