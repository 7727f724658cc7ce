/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Old stars: winds of low-mass stars and Ia supernovae. Where the gas supply is shut off after reionization, what they
 * give back leaves the galaxy with its metals; elsewhere it joins the disc. */
#include "galaxy/state.h"

#include <math.h>

#define YOUNG_AGE    0.5 /* Gyr: older cohorts change slowly ... */
#define OLD_PATIENCE 0.1 /* Gyr: ... and are brought up to date after this */

typedef struct {
  ew_step *step;
  ew_reservoir gas;
  double ia_mean;
  ew_draw_purpose purpose;
} ageing;

static void move_formed(const ageing *work, const ew_cohort *cohort, ew_reservoir to, double mass) {
  ew_composition part;
  for (int i = 0; i < EW_ELEMENT_COUNT; i++)
    part.mass[i] = cohort->formed.mass[i] * mass / cohort->mass;
  ew_ledger_move(&work->step->galaxy->ledger, EW_LIVING_STARS, to, &part);
}

/* Brings a cohort to the age that it has at the end of the step. */
static void age_cohort(ageing *work, ew_cohort *cohort) {
  const ew_stars *stars = work->step->environment->world->stars;
  double age = fmax(work->step->end - cohort->time, 0.0);
  double metals = ew_composition_metals(&cohort->formed) / cohort->mass;
  double returned = cohort->mass * ew_returned_mass(stars, age, metals);
  double dwarfs = cohort->mass * ew_white_dwarf_mass(stars, age, metals);
  double expected = cohort->mass * ew_ia_number(stars, 0.0, age);
  move_formed(work, cohort, work->gas, fmax(returned - cohort->returned, 0.0));
  move_formed(work, cohort, EW_REMNANTS, fmax(dwarfs - cohort->white_dwarfs, 0.0));
  work->ia_mean += fmax(expected - cohort->ia_expected, 0.0);
  cohort->returned = fmax(returned, cohort->returned);
  cohort->white_dwarfs = fmax(dwarfs, cohort->white_dwarfs);
  cohort->ia_expected = fmax(expected, cohort->ia_expected);
  cohort->done = work->step->end;
}

/* White dwarfs blow up: their mass turns into metals. A living star makes good what remnants lack. */
static void explode_ia(ageing *work) {
  ew_ledger *ledger = &work->step->galaxy->ledger;
  const ew_composition *ejecta = ew_ia_ejecta(work->step->environment->world->stars);
  ew_stream stream = ew_step_stream(work->step, EW_PROCESS_BURSTS, work->purpose);
  double one = ew_composition_mass(ejecta);
  double held = ew_ledger_mass(ledger, EW_REMNANTS) + ew_ledger_mass(ledger, EW_LIVING_STARS);
  double count = fmin((double)ew_draw_poisson(&stream, work->ia_mean), floor(held / one));
  if (!(count > 0.0))
    return;
  double from_remnants = fmin(count * one, ew_ledger_mass(ledger, EW_REMNANTS));
  ew_ledger_move_mass(ledger, EW_REMNANTS, EW_MADE, from_remnants);
  ew_ledger_move_mass(ledger, EW_LIVING_STARS, EW_MADE, count * one - from_remnants);
  ew_composition made = *ejecta;
  for (int i = 0; i < EW_ELEMENT_COUNT; i++)
    made.mass[i] *= count;
  ew_ledger_move(ledger, EW_MADE, work->gas, &made);
  if (work->gas != EW_DISC_GAS)
    return;
  work->step->supernovae += count;
  work->step->energy += count;
  ew_hold_supernovae(work->step->galaxy, count);
}

void ew_age_stars(ew_step *step, bool keep_gas, bool all) {
  ageing work = {step, keep_gas ? EW_DISC_GAS : EW_LOST_GAS, 0.0, all ? EW_DRAW_IA_SETTLED : EW_DRAW_IA};
  for (size_t i = 0; i < step->galaxy->cohort_count; i++) {
    ew_cohort *cohort = &step->galaxy->cohort[i];
    if (!(cohort->mass > 0.0))
      continue;
    bool waits = step->end - cohort->time > YOUNG_AGE && step->end - cohort->done < OLD_PATIENCE;
    if (all || !waits)
      age_cohort(&work, cohort);
  }
  if (work.ia_mean > 0.0)
    explode_ia(&work);
}
