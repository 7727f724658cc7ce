/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * What all realizations on a tree share: slots of nodes, who joins whom and when, peak masses, the row of /trees. */
#include "population/evolution.h"

#include <math.h>

static ew_status make_arrays(ew_evolution *evolution, ew_error *error) {
  const ew_tree *tree = evolution->tree;
  ew_skeleton *s = &evolution->skeleton;
  s->node_slot = ew_arena_take(evolution->arena, tree->node_count * sizeof *s->node_slot);
  s->joiner = ew_arena_take(evolution->arena, tree->branch_count * sizeof *s->joiner);
  s->first_joiner = ew_arena_take(evolution->arena, (tree->branch_count + 1) * sizeof *s->first_joiner);
  s->peak_mass = ew_arena_take(evolution->arena, tree->branch_count * sizeof *s->peak_mass);
  if (!s->node_slot || !s->joiner || !s->first_joiner || !s->peak_mass)
    return ew_fail_memory(error, "a tree's skeleton");
  return EW_OK;
}

static void fill_nodes(ew_evolution *evolution) {
  const ew_tree *tree = evolution->tree;
  const ew_laboratory *lab = evolution->laboratory;
  for (size_t i = 0; i < tree->node_count; i++)
    evolution->skeleton.node_slot[i] =
        (uint32_t)ew_calendar_slot(&lab->calendar, ew_age(lab->cosmology, tree->redshift[i]));
  for (size_t b = 0; b < tree->branch_count; b++) {
    const ew_branch *branch = &tree->branch[b];
    for (size_t i = branch->first_node; i < branch->first_node + (size_t)branch->node_count; i++)
      evolution->skeleton.peak_mass[b] = fmax(evolution->skeleton.peak_mass[b], tree->mass[i]);
  }
}

/* Insertion sort by node of joining: builders give the joiners of a host in order or in reverse. */
static void sort_joiners(const ew_tree *tree, uint32_t *joiner, size_t count) {
  for (size_t i = 1; i < count; i++) {
    uint32_t moved = joiner[i];
    size_t k = i;
    for (; k > 0 && tree->branch[joiner[k - 1]].joins_node > tree->branch[moved].joins_node; k--)
      joiner[k] = joiner[k - 1];
    joiner[k] = moved;
  }
}

static void reverse(uint32_t *joiner, size_t count) {
  for (size_t low = 0, high = count; low + 1 < high; low++) {
    uint32_t kept = joiner[low];
    joiner[low] = joiner[--high];
    joiner[high] = kept;
  }
}

/* Counting sort by host. */
static void fill_joiners(ew_evolution *evolution) {
  const ew_tree *tree = evolution->tree;
  ew_skeleton *s = &evolution->skeleton;
  for (size_t b = 0; b + 1 < tree->branch_count; b++)
    s->first_joiner[tree->branch[b].joins_branch + 1]++;
  for (size_t b = 0; b < tree->branch_count; b++)
    s->first_joiner[b + 1] += s->first_joiner[b];
  for (size_t b = 0; b + 1 < tree->branch_count; b++)
    s->joiner[s->first_joiner[tree->branch[b].joins_branch]++] = (uint32_t)b;
  for (size_t b = tree->branch_count; b > 0; b--)
    s->first_joiner[b] = s->first_joiner[b - 1];
  s->first_joiner[0] = 0;
  for (size_t b = 0; b < tree->branch_count; b++) {
    size_t count = s->first_joiner[b + 1] - s->first_joiner[b];
    reverse(s->joiner + s->first_joiner[b], count);
    sort_joiners(tree, s->joiner + s->first_joiner[b], count);
  }
}

/* Mass that joins and first nodes do not account for, over all branches. */
static double smooth_fraction(const ew_tree *tree) {
  double resolved = 0.0;
  for (size_t b = 0; b < tree->branch_count; b++)
    resolved += tree->mass[tree->branch[b].first_node];
  return 1.0 - resolved / tree->mass[tree->node_count - 1];
}

static void fill_row(ew_evolution *evolution) {
  const ew_tree *tree = evolution->tree;
  const ew_branch *main_branch = &tree->branch[tree->branch_count - 1];
  evolution->row = (ew_tree_row){.tree = (int64_t)tree->number,
                                 .halo_id = tree->halo_id,
                                 .weight = tree->weight,
                                 .root_mass = tree->mass[tree->node_count - 1],
                                 .root_redshift = tree->redshift[tree->node_count - 1],
                                 .formation_redshift = ew_formation_redshift(tree, main_branch, 0.5),
                                 .branches = (int64_t)tree->branch_count,
                                 .nodes = (int64_t)tree->node_count,
                                 .smooth_fraction = smooth_fraction(tree)};
}

ew_status ew_skeleton_make(ew_evolution *evolution, ew_error *error) {
  ew_status status = make_arrays(evolution, error);
  if (status != EW_OK)
    return status;
  fill_nodes(evolution);
  fill_joiners(evolution);
  fill_row(evolution);
  return EW_OK;
}

/* The host's node decides: the satellite's own last redshift may differ by rounding and lie in the slot beside. */
size_t ew_infall_slot(const ew_evolution *evolution, const ew_branch *branch) {
  return evolution->skeleton.node_slot[branch->joins_node];
}

size_t ew_branch_end_slot(const ew_evolution *evolution, const ew_branch *branch) {
  return branch->joins_branch < 0 ? evolution->laboratory->calendar.slot_count : ew_infall_slot(evolution, branch);
}

ew_mass_reader ew_mass_reader_at(const ew_tree *tree, const ew_branch *branch) {
  return (ew_mass_reader){tree, branch->first_node, branch->first_node + (size_t)branch->node_count - 1};
}

double ew_mass_read(ew_mass_reader *reader, double redshift) {
  const double *z = reader->tree->redshift, *mass = reader->tree->mass;
  while (reader->node < reader->last && z[reader->node + 1] >= redshift)
    reader->node++;
  size_t i = reader->node;
  if (i == reader->last || redshift > z[i])
    return mass[i];
  return mass[i + 1] + (mass[i] - mass[i + 1]) * (redshift - z[i + 1]) / (z[i] - z[i + 1]);
}
