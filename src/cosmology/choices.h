/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The named variants of this room, each list beside its formulas and in the order of its enum. A list ends with a NULL
 * name. */
#ifndef EW_COSMOLOGY_CHOICES_H
#define EW_COSMOLOGY_CHOICES_H

#include "elfinwood/core.h"

extern const ew_choice ew_threshold_choices[]; /* ew_threshold */
extern const ew_choice ew_transfer_choices[];  /* ew_transfer_choice */
extern const ew_choice ew_filter_choices[];    /* ew_filter_choice */

#endif
