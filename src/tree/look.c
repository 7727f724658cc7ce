/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Reading a branch: its mass at a redshift, when it had formed. */
#include "elfinwood/tree.h"

#include <math.h>

/* Straight line through two nodes; the later one where they share a redshift. */
static double mass_between(const ew_tree *tree, size_t earlier, double redshift) {
  double z0 = tree->redshift[earlier], z1 = tree->redshift[earlier + 1];
  double m0 = tree->mass[earlier], m1 = tree->mass[earlier + 1];
  return z0 > z1 ? m1 + (m0 - m1) * (redshift - z1) / (z0 - z1) : m1;
}

double ew_branch_mass(const ew_tree *tree, const ew_branch *branch, double redshift) {
  size_t low = branch->first_node, high = low + branch->node_count - 1;
  if (redshift > tree->redshift[low])
    return 0.0;
  if (redshift <= tree->redshift[high])
    return tree->mass[high];
  /* The last node at or before the redshift: nodes run to lower redshift. */
  while (high - low > 1) {
    size_t middle = low + (high - low) / 2;
    if (tree->redshift[middle] >= redshift)
      low = middle;
    else
      high = middle;
  }
  return mass_between(tree, low, redshift);
}

double ew_formation_redshift(const ew_tree *tree, const ew_branch *branch, double share) {
  size_t first = branch->first_node, last = first + branch->node_count - 1;
  double wanted = share * tree->mass[last];
  size_t node = first;
  while (node < last && tree->mass[node] < wanted)
    node++;
  if (node == first)
    return tree->redshift[first];
  double m0 = tree->mass[node - 1], m1 = tree->mass[node];
  double part = m1 > m0 ? fmin((wanted - m0) / (m1 - m0), 1.0) : 1.0;
  return tree->redshift[node - 1] + part * (tree->redshift[node] - tree->redshift[node - 1]);
}
