/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The fixed grid of cosmic time, and what every galaxy asks of each slot. */
#include "elfinwood/galaxy.h"

#include <math.h>
#include <stdlib.h>

#define ATOMIC_TEMPERATURE 1e4 /* K, below which atomic hydrogen does not cool: common practice */
#define NEUTRAL_WEIGHT     1.22

ew_status ew_calendar_make(ew_calendar *calendar, const ew_cosmology *cosmology, double final_redshift, double step,
                           ew_error *error) {
  double end = ew_age(cosmology, final_redshift);
  size_t count = (size_t)ceil(end / step);
  *calendar = (ew_calendar){.step = step, .end = end, .slot_count = count};
  calendar->redshift = calloc(4 * count, sizeof(double));
  if (!calendar->redshift)
    return ew_fail_memory(error, "the calendar");
  calendar->radius = calendar->redshift + count;
  calendar->free_fall = calendar->radius + count;
  calendar->atomic_mass = calendar->free_fall + count;
  for (size_t k = 0; k < count; k++) {
    double z = k + 1 == count ? final_redshift : ew_redshift_at(cosmology, ew_calendar_end_of(calendar, k));
    calendar->redshift[k] = z;
    calendar->radius[k] = ew_virial_radius(cosmology, 1.0, z);
    calendar->free_fall[k] = ew_free_fall_time(cosmology, z);
    calendar->atomic_mass[k] = ew_mass_of_temperature(cosmology, ATOMIC_TEMPERATURE, NEUTRAL_WEIGHT, z);
  }
  return EW_OK;
}

void ew_calendar_clear(ew_calendar *calendar) {
  free(calendar->redshift);
  *calendar = (ew_calendar){0};
}

size_t ew_calendar_slot(const ew_calendar *calendar, double time) {
  if (!(time > 0.0))
    return 0;
  double slot = time / calendar->step;
  return slot < (double)calendar->slot_count ? (size_t)slot : calendar->slot_count - 1;
}

double ew_calendar_end_of(const ew_calendar *calendar, size_t slot) {
  return fmin((double)(slot + 1) * calendar->step, calendar->end);
}
