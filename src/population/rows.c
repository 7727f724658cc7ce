/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * What a realization leaves behind: rows of the central and its bound members, and the sum of ledgers. */
#include "population/evolution.h"

#include <math.h>

static size_t count_members(const ew_member *members) {
  size_t count = 0;
  for (; members; members = members->next)
    count += members->galaxy && ew_galaxy_has_stars(members->galaxy);
  return count;
}

static ew_galaxy_row common_row(const ew_evolution *evolution, const ew_branch *branch) {
  const ew_tree *tree = evolution->tree;
  size_t last = branch->first_node + branch->node_count - 1;
  return (ew_galaxy_row){.tree = (int64_t)tree->number,
                         .realization = (int64_t)evolution->draws->realization[EW_PROCESS_BURSTS],
                         .branch = branch->key,
                         .halo_id = tree->halo_id,
                         .weight = tree->weight,
                         .halo_mass = tree->mass[last],
                         .peak_halo_mass = evolution->skeleton.peak_mass[branch - tree->branch],
                         .formation_redshift = ew_formation_redshift(tree, branch, 0.5),
                         .reionization_redshift = evolution->patch.reionization_redshift,
                         .streaming_velocity = evolution->patch.streaming_velocity};
}

static void central_row(ew_evolution *evolution, ew_galaxy_row *row) {
  size_t index = evolution->tree->branch_count - 1;
  ew_arrival *arrival = &evolution->arrival[index];
  *row = common_row(evolution, &evolution->tree->branch[index]);
  row->central = 1;
  if (arrival->galaxy)
    ew_galaxy_observe(arrival->galaxy, &evolution->environment, &row->observed);
  else
    ew_observe_nothing(&row->observed);
}

static void member_row(ew_evolution *evolution, const ew_member *member, ew_galaxy_row *row) {
  *row = common_row(evolution, member->branch);
  ew_environment environment = ew_member_environment(evolution, member);
  ew_galaxy_observe(member->galaxy, &environment, &row->observed);
}

ew_status ew_evolution_collect(ew_evolution *evolution, ew_error *error) {
  const ew_arrival *root = &evolution->arrival[evolution->tree->branch_count - 1];
  size_t members = evolution->laboratory->settings.output.members ? count_members(root->members) : 0;
  evolution->row_count = 0;
  evolution->rows = ew_arena_take(evolution->arena, (1 + members) * sizeof *evolution->rows);
  if (!evolution->rows)
    return ew_fail_memory(error, "rows");
  central_row(evolution, &evolution->rows[0]);
  evolution->row_count = 1;
  for (const ew_member *m = root->members; m && members > 0; m = m->next)
    if (m->galaxy && ew_galaxy_has_stars(m->galaxy))
      member_row(evolution, m, &evolution->rows[evolution->row_count++]);
  return EW_OK;
}

const ew_galaxy_row *ew_evolution_rows(const ew_evolution *evolution, size_t *count) {
  *count = evolution->row_count;
  return evolution->rows;
}

const ew_tree_row *ew_evolution_tree_row(const ew_evolution *evolution) {
  return &evolution->row;
}

void ew_evolution_ledger(const ew_evolution *evolution, ew_ledger *ledger) {
  const ew_arrival *root = &evolution->arrival[evolution->tree->branch_count - 1];
  ew_ledger_add(ledger, &evolution->gone);
  if (root->galaxy)
    ew_ledger_add(ledger, ew_galaxy_ledger(root->galaxy));
  for (const ew_member *m = root->members; m; m = m->next)
    if (m->galaxy)
      ew_ledger_add(ledger, ew_galaxy_ledger(m->galaxy));
}
