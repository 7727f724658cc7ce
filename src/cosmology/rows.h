/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The checks of single values that come from the parameter rows, for callers that fill the structs themselves. */
#ifndef EW_COSMOLOGY_ROWS_H
#define EW_COSMOLOGY_ROWS_H

#include "elfinwood/core.h"

/* Refuses the first value of `target` that is outside its row's range or no choice of its row. */
EW_CHECKED ew_status ew_rows_check(const ew_parameter *rows, size_t count, const void *target, ew_error *error);

#endif
