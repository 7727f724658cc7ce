/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Core-collapse supernovae of normal stars, averaged over bins of birth mass. */
#ifndef EW_STARS_SUPERNOVA_BINS_H
#define EW_STARS_SUPERNOVA_BINS_H

#include "stars/deaths.h"

typedef struct {
  double edge[EW_SUPERNOVA_BINS + 1];                        /* Msun, ascending */
  double number[EW_SUPERNOVA_BINS];                          /* per Msun formed */
  double total;                                              /* per Msun formed */
  ew_death death[EW_YIELD_METALLICITIES][EW_SUPERNOVA_BINS]; /* mean per supernova */
} ew_supernova_bins;

/* Needs the handle's parameters, lifetimes and models of core collapse. */
void ew_supernova_bins_fill(ew_stars *stars);

#endif
