/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Parameters of the scatter in halo structure: concentration at fixed mass, and spin. */
#include "elfinwood/halo.h"

#define ROW(field, measure, value, least, most, sentence, paper)                                                       \
  {                                                                                                                    \
    .name = "structure." #field, .type = EW_REAL, .offset = offsetof(ew_structure_parameters, field), .unit = measure, \
    .standard = value, .low = least, .high = most, .meaning = sentence, .source = paper                                \
  }

const ew_parameter ew_structure_rows[] = {
    ROW(concentration_scatter, "dex", "0.16", 0.0, 0.5,
        "Log-normal scatter of concentration at fixed mass and redshift.",
        "Diemer & Joyce 2019, ApJ 871, 168 (all haloes; from memory)"),
    ROW(spin_median, "1", "0.035", 0.001, 0.3, "Median of the log-normal spin lambda' = J/(sqrt(2) M V R).",
        "Bullock et al. 2001, ApJ 555, 240 (from memory)"),
    ROW(spin_scatter, "1", "0.50", 0.0, 1.5, "Scatter of the natural logarithm of spin.",
        "Bullock et al. 2001, ApJ 555, 240 (from memory)"),
    {.name = NULL},
};
