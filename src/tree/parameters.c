/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Parameter rows of the tree room. */
#include "elfinwood/tree.h"

#define PARKINSON "Parkinson, Cole & Helly 2008, MNRAS 383, 557"

static const ew_choice sources[] = {
    {"grow", "grown by extended Press-Schechter", PARKINSON},
    {NULL, NULL, NULL},
};

#define ROW(field) offsetof(ew_tree_parameters, field)

const ew_parameter ew_tree_rows[] = {
    {.name = "trees.source",
     .type = EW_CHOICE,
     .offset = ROW(source),
     .unit = "",
     .standard = "\"grow\"",
     .choices = sources,
     .meaning = "where merger trees come from",
     .source = "own choice"},
    {.name = "trees.resolution_mass",
     .type = EW_REAL,
     .offset = ROW(resolution_mass),
     .unit = "Msun",
     .standard = "3e5",
     .low = 1e4,
     .high = 1e12,
     .meaning = "haloes below this mass are not followed: they are smooth accretion",
     .source = "own choice"},
    {.name = "trees.highest_redshift",
     .type = EW_REAL,
     .offset = ROW(highest_redshift),
     .unit = "1",
     .standard = "40",
     .low = 5,
     .high = 60,
     .meaning = "branches are followed back to this redshift",
     .source = "own choice"},
    {.name = "trees.split_amplitude",
     .type = EW_REAL,
     .offset = ROW(split_amplitude),
     .unit = "1",
     .standard = "0.57",
     .low = 0.1,
     .high = 2,
     .meaning = "G0 of the correction to the split rate (1 with both slopes 0: plain extended Press-Schechter)",
     .source = PARKINSON},
    {.name = "trees.split_mass_slope",
     .type = EW_REAL,
     .offset = ROW(split_mass_slope),
     .unit = "1",
     .standard = "0.38",
     .low = -0.5,
     .high = 0.9,
     .meaning = "gamma1: power of sigma(progenitor)/sigma(halo) in the correction",
     .source = PARKINSON},
    {.name = "trees.split_peak_slope",
     .type = EW_REAL,
     .offset = ROW(split_peak_slope),
     .unit = "1",
     .standard = "-0.01",
     .low = -0.5,
     .high = 0.5,
     .meaning = "gamma2: power of barrier/sigma(halo) in the correction",
     .source = PARKINSON},
    {.name = NULL},
};
