/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The tables of a run, built once. */
#include "elfinwood/population.h"

#include <stdlib.h>

static ew_status build(ew_laboratory *lab, ew_error *error) {
  const ew_settings *s = &lab->settings;
  ew_status status = ew_cosmology_new(&lab->cosmology, &s->cosmology, error);
  if (status == EW_OK)
    status = ew_spectrum_new(&lab->spectrum, lab->cosmology, &s->spectrum, error);
  if (status == EW_OK)
    status = ew_tree_builder_new(&lab->builder, lab->spectrum, &s->trees, ew_roots_largest_mass(s), error);
  if (status == EW_OK)
    status = ew_concentration_new(&lab->concentration, lab->spectrum, error);
  if (status == EW_OK)
    status = ew_stars_new(&lab->stars, &s->stars, error);
  if (status == EW_OK)
    status = ew_calendar_make(&lab->calendar, lab->cosmology, s->roots.redshift, s->ensemble.time_step, error);
  return status;
}

ew_status ew_laboratory_new(ew_laboratory **laboratory, const ew_settings *settings, ew_error *error) {
  *laboratory = NULL;
  ew_laboratory *lab = calloc(1, sizeof *lab);
  if (!lab)
    return ew_fail_memory(error, "the tables of the run");
  lab->settings = *settings;
  ew_status status = build(lab, error);
  if (status != EW_OK) {
    ew_laboratory_free(lab);
    return status;
  }
  lab->world = ew_world_of(lab->cosmology, lab->concentration, lab->stars);
  *laboratory = lab;
  return EW_OK;
}

void ew_laboratory_free(ew_laboratory *laboratory) {
  if (!laboratory)
    return;
  ew_calendar_clear(&laboratory->calendar);
  ew_stars_free(laboratory->stars);
  ew_concentration_free(laboratory->concentration);
  ew_tree_builder_free(laboratory->builder);
  ew_spectrum_free(laboratory->spectrum);
  ew_cosmology_free(laboratory->cosmology);
  free(laboratory);
}
