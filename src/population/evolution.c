/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * One tree through one realization: branch by branch, slot by slot. */
#include "population/evolution.h"

#include <stdlib.h>

ew_evolution *ew_evolution_new(void) {
  ew_evolution *evolution = calloc(1, sizeof *evolution);
  if (evolution)
    evolution->arena = ew_arena_new();
  if (evolution && !evolution->arena) {
    free(evolution);
    return NULL;
  }
  return evolution;
}

void ew_evolution_free(ew_evolution *evolution) {
  if (!evolution)
    return;
  ew_arena_free(evolution->arena);
  free(evolution);
}

ew_status ew_evolution_load(ew_evolution *evolution, const ew_laboratory *laboratory, const ew_tree *tree,
                            ew_error *error) {
  ew_arena_return(evolution->arena, (ew_arena_mark){0});
  evolution->laboratory = laboratory;
  evolution->tree = tree;
  evolution->row_count = 0;
  ew_status status = ew_skeleton_make(evolution, error);
  evolution->after_skeleton = ew_arena_tell(evolution->arena);
  return status;
}

static void set_slot(ew_evolution *evolution, size_t slot) {
  evolution->environment.slot = slot;
  evolution->environment.redshift = evolution->laboratory->calendar.redshift[slot];
}

/* Takes in all that has joined by the slot of the environment. */
static ew_status admit_joiners(ew_evolution *evolution, ew_household *home, size_t index, size_t *joiner,
                               ew_error *error) {
  const ew_skeleton *s = &evolution->skeleton;
  ew_status status = EW_OK;
  for (; *joiner < s->first_joiner[index + 1] && status == EW_OK; ++*joiner) {
    size_t child = s->joiner[*joiner];
    if (ew_infall_slot(evolution, &evolution->tree->branch[child]) > evolution->environment.slot)
      break;
    status = ew_household_admit(evolution, home, child, error);
  }
  return status;
}

/* Joiners before the waking slot were counted while the branch was dark. */
static size_t first_joiner_from(const ew_evolution *evolution, size_t index, size_t slot) {
  const ew_skeleton *s = &evolution->skeleton;
  size_t joiner = s->first_joiner[index];
  while (joiner < s->first_joiner[index + 1] &&
         ew_infall_slot(evolution, &evolution->tree->branch[s->joiner[joiner]]) < slot)
    joiner++;
  return joiner;
}

/* The environment of a branch at the end of a slot. */
static void set_environment(ew_evolution *evolution, const ew_household *home, ew_mass_reader *reader, size_t slot) {
  set_slot(evolution, slot);
  double factor = ew_galaxy_luck(home->galaxy)->concentration_factor;
  ew_environment_set_halo(&evolution->environment, ew_mass_read(reader, evolution->environment.redshift), factor);
}

/* What joins in the slot in which the branch itself falls in is handed on with it. */
static ew_status admit_last_joiners(ew_evolution *evolution, ew_household *home, size_t index, size_t *joiner,
                                    ew_mass_reader *reader, ew_error *error) {
  size_t end = ew_branch_end_slot(evolution, &evolution->tree->branch[index]);
  if (*joiner == evolution->skeleton.first_joiner[index + 1])
    return EW_OK;
  set_environment(evolution, home, reader, end);
  return admit_joiners(evolution, home, index, joiner, error);
}

static ew_status live_through(ew_evolution *evolution, ew_household *home, size_t index, size_t waking,
                              ew_error *error) {
  const ew_branch *branch = &evolution->tree->branch[index];
  const ew_calendar *calendar = &evolution->laboratory->calendar;
  size_t end = ew_branch_end_slot(evolution, branch), joiner = first_joiner_from(evolution, index, waking);
  ew_mass_reader reader = ew_mass_reader_at(evolution->tree, branch);
  ew_status status = EW_OK;
  for (size_t slot = waking; slot < end && status == EW_OK; slot++) {
    double now = ew_calendar_end_of(calendar, slot);
    set_environment(evolution, home, &reader, slot);
    status = admit_joiners(evolution, home, index, &joiner, error);
    if (status == EW_OK)
      status = ew_household_advance(evolution, home, (double)slot * calendar->step, now, error);
    if (status == EW_OK)
      status = ew_household_merge(evolution, home, now, error);
  }
  return status == EW_OK ? admit_last_joiners(evolution, home, index, &joiner, &reader, error) : status;
}

static ew_status wake(ew_evolution *evolution, size_t index, size_t waking, ew_error *error) {
  const ew_branch *branch = &evolution->tree->branch[index];
  ew_arrival *arrival = &evolution->arrival[index];
  ew_branch_luck luck = ew_branch_luck_draw(evolution->model, evolution->draws, branch->key);
  ew_household home = {ew_galaxy_new(evolution->arena, branch->key, &luck), NULL};
  if (!home.galaxy)
    return ew_fail_memory(error, "a galaxy");
  double metals = arrival->gas > 0.0 ? arrival->gas_metals / arrival->gas : 0.0;
  ew_galaxy_receive(home.galaxy, &(ew_received){arrival->baryons, arrival->gas, metals}, &evolution->laboratory->world);
  ew_status status = live_through(evolution, &home, index, waking, error);
  arrival->galaxy = home.galaxy;
  arrival->members = home.members;
  return status;
}

void ew_evolution_heed(ew_evolution *evolution, const volatile sig_atomic_t *stop) {
  evolution->stop = stop;
}

static ew_status evolve_branch(ew_evolution *evolution, size_t index, ew_error *error) {
  if (evolution->stop && *evolution->stop)
    return ew_fail(error, EW_FAILED, EW_INTERRUPTED);
  size_t waking = ew_waking_slot(evolution, index);
  ew_count_baryons(evolution, index, waking);
  return waking != EW_NEVER ? wake(evolution, index, waking, error) : EW_OK;
}

ew_status ew_evolution_run(ew_evolution *evolution, const ew_model *model, const ew_draws *draws, ew_error *error) {
  const ew_laboratory *lab = evolution->laboratory;
  ew_arena_return(evolution->arena, evolution->after_skeleton);
  evolution->model = model;
  evolution->draws = draws;
  evolution->gone = (ew_ledger){0};
  evolution->arrival = ew_arena_take(evolution->arena, evolution->tree->branch_count * sizeof *evolution->arrival);
  if (!evolution->arrival)
    return ew_fail_memory(error, "a realization");
  ew_status status =
      ew_patch_draw(&evolution->patch, &lab->world, model, &lab->calendar, draws, evolution->arena, error);
  evolution->environment = (ew_environment){
      .world = &lab->world, .calendar = &lab->calendar, .model = model, .patch = &evolution->patch, .draws = draws};
  for (size_t b = 0; b < evolution->tree->branch_count && status == EW_OK; b++)
    status = evolve_branch(evolution, b, error);
  return status == EW_OK ? ew_evolution_collect(evolution, error) : status;
}
