/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The rules that every tree keeps, whoever made it. */
#include "elfinwood/tree.h"

#include <math.h>

#define JOIN_TOLERANCE 1e-9 /* of 1 + z at a merger */

static ew_status fault(ew_error *error, const ew_tree *tree, size_t branch, const char *what) {
  return ew_fail(error, EW_REFUSED, "tree %llu, branch %zu: %s", (unsigned long long)tree->number, branch, what);
}

/* Where the nodes of the branch before end. */
static size_t nodes_before(const ew_tree *tree, size_t index) {
  return index > 0 ? tree->branch[index - 1].first_node + (size_t)tree->branch[index - 1].node_count : 0;
}

static ew_status check_nodes(const ew_tree *tree, size_t index, ew_error *error) {
  const ew_branch *branch = &tree->branch[index];
  if (branch->node_count == 0 || branch->first_node + (size_t)branch->node_count > tree->node_count)
    return fault(error, tree, index, "its nodes are outside the tree's");
  if (branch->first_node != nodes_before(tree, index))
    return fault(error, tree, index, "its nodes do not follow upon those of the branch before");
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

/* A branch follows directly upon all that joins it, so between a branch and the one that it joins stand only branches
 * that lead to the latter: the next branch is that one, or comes to it by joining. */
static ew_status check_order(const ew_tree *tree, size_t index, ew_error *error) {
  int32_t joined = tree->branch[index].joins_branch, next = (int32_t)index + 1;
  while (next < joined && tree->branch[next].joins_branch >= 0)
    next = tree->branch[next].joins_branch;
  if (joined >= 0 && next != joined)
    return fault(error, tree, index, "between it and the branch that it joins stand branches that lead elsewhere");
  return EW_OK;
}

/* Each rule relies on those before it for the whole tree. */
ew_status ew_tree_check(const ew_tree *tree, ew_error *error) {
  ew_status (*const rules[])(const ew_tree *, size_t, ew_error *) = {check_nodes, check_join, check_order};
  if (tree->branch_count == 0)
    return ew_fail(error, EW_REFUSED, "tree %llu has no branch", (unsigned long long)tree->number);
  for (size_t r = 0; r < sizeof rules / sizeof *rules; r++)
    for (size_t i = 0; i < tree->branch_count; i++) {
      ew_status status = rules[r](tree, i, error);
      if (status != EW_OK)
        return status;
    }
  if (nodes_before(tree, tree->branch_count) != tree->node_count)
    return fault(error, tree, tree->branch_count - 1, "the tree has nodes of no branch");
  return EW_OK;
}
