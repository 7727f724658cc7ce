/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Branches without a galaxy: baryons are counted at their nodes, and nothing else is done. */
#include "population/evolution.h"

#include <math.h>

/* Gas still in a dark halo when it joins another: after reionization small haloes have lost theirs. */
static bool has_evaporated(const ew_evolution *evolution, double mass, size_t slot) {
  const ew_reionization_parameters *p = &evolution->model->reionization;
  const ew_calendar *calendar = &evolution->laboratory->calendar;
  if (!p->evaporation || calendar->redshift[slot] >= evolution->patch.reionization_redshift)
    return false;
  double velocity = sqrt(EW_GRAVITY * mass / (calendar->radius[slot] * cbrt(mass)));
  return velocity < p->evaporation_velocity;
}

/* Metals that the branch's gas owes to its surroundings. */
static double external_metals(const ew_evolution *evolution, const ew_branch *branch, double redshift) {
  if (!evolution->model->gas.external_enrichment)
    return 0.0;
  bool enriched = redshift < evolution->patch.reionization_redshift ||
                  redshift < ew_enrichment_redshift_draw(evolution->draws, branch->key);
  return enriched ? ew_branch_luck_draw(evolution->model, evolution->draws, branch->key).external_metals : 0.0;
}

static void receive(ew_arrival *to, const ew_arrival *from) {
  to->baryons += from->baryons;
  to->gas += from->gas;
  to->gas_metals += from->gas_metals;
}

/* What the halo takes in of its own at a node. */
static double supply_at(const ew_evolution *evolution, const ew_arrival *so_far, size_t node) {
  size_t slot = evolution->skeleton.node_slot[node];
  double mass = evolution->tree->mass[node];
  double share = ew_baryon_share(&evolution->model->reionization, mass, evolution->patch.characteristic_mass[slot]);
  double supply = ew_baryon_fraction(evolution->laboratory->cosmology) * share * mass - so_far->baryons;
  return supply > 0.0 ? supply : 0.0;
}

void ew_count_baryons(ew_evolution *evolution, size_t index, size_t until_slot) {
  const ew_tree *tree = evolution->tree;
  const ew_skeleton *s = &evolution->skeleton;
  const ew_branch *branch = &tree->branch[index];
  ew_arrival sum = {0};
  size_t joiner = s->first_joiner[index], last = branch->first_node;
  double own = 0.0;
  for (size_t node = branch->first_node; node < branch->first_node + (size_t)branch->node_count; node++) {
    if (s->node_slot[node] >= until_slot && node > branch->first_node)
      break;
    for (; joiner < s->first_joiner[index + 1] && tree->branch[s->joiner[joiner]].joins_node <= node; joiner++)
      receive(&sum, &evolution->arrival[s->joiner[joiner]]);
    double supply = supply_at(evolution, &sum, node);
    sum.baryons += supply;
    own += supply;
    last = node;
  }
  if (has_evaporated(evolution, tree->mass[last], s->node_slot[last]))
    sum.gas = sum.gas_metals = 0.0;
  else {
    sum.gas += own;
    sum.gas_metals += own * external_metals(evolution, branch, tree->redshift[last]);
  }
  evolution->arrival[index] = sum;
}

static size_t first_galaxy_arrives(const ew_evolution *evolution, size_t index) {
  const ew_skeleton *s = &evolution->skeleton;
  for (size_t k = s->first_joiner[index]; k < s->first_joiner[index + 1]; k++)
    if (evolution->arrival[s->joiner[k]].galaxy)
      return ew_infall_slot(evolution, &evolution->tree->branch[s->joiner[k]]);
  return EW_NEVER;
}

/* First slot in [from, end) at whose end the halo exceeds the threshold. */
static size_t first_above_threshold(const ew_evolution *evolution, const ew_branch *branch, size_t from, size_t end) {
  const ew_calendar *calendar = &evolution->laboratory->calendar;
  ew_mass_reader reader = ew_mass_reader_at(evolution->tree, branch);
  for (size_t slot = from; slot < end; slot++)
    if (ew_mass_read(&reader, calendar->redshift[slot]) >= evolution->patch.threshold_mass[slot])
      return slot;
  return EW_NEVER;
}

/* Whether a node comes near the threshold: its mass against the threshold one node earlier, when it was lower. */
static size_t candidate_slot(const ew_evolution *evolution, const ew_branch *branch) {
  const ew_tree *tree = evolution->tree;
  const uint32_t *slot = evolution->skeleton.node_slot;
  const double *threshold = evolution->patch.threshold_mass;
  size_t first = branch->first_node;
  if (tree->mass[first] >= threshold[slot[first]])
    return slot[first];
  for (size_t node = first + 1; node < first + branch->node_count; node++)
    if (tree->mass[node] >= threshold[slot[node - 1]])
      return slot[node - 1];
  return EW_NEVER;
}

size_t ew_waking_slot(const ew_evolution *evolution, size_t index) {
  const ew_branch *branch = &evolution->tree->branch[index];
  size_t end = ew_branch_end_slot(evolution, branch), candidate = candidate_slot(evolution, branch);
  size_t arrives = first_galaxy_arrives(evolution, index), exceeds = EW_NEVER;
  if (candidate < end)
    exceeds = first_above_threshold(evolution, branch, candidate, end);
  return arrives < exceeds ? arrives : exceeds;
}
