/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The universe that tests and benchmarks stand in: that of the reference tables in tests/data, matter and Lambda only.
 */
#ifndef EW_TESTS_PLANCK18_H
#define EW_TESTS_PLANCK18_H

#include "elfinwood/cosmology.h"

static const ew_cosmology_parameters planck18 = {
    .hubble = 0.6736,
    .omega_matter = 0.3153,
    .omega_baryon = 0.0493,
    .spectral_index = 0.9649,
    .sigma8 = 0.8111,
    .cmb_temperature = 2.7255,
    .neutrino_number = 3.046,
    .radiation = false,
    .collapse_threshold = EW_THRESHOLD_CONSTANT,
};

#endif
