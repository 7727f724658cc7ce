/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Rows on their own: counting, and checking a struct that was not filled by the engine. */
#include "elfinwood/core.h"

#include <string.h>

size_t ew_rows_count(const ew_parameter *rows) {
  size_t count = 0;
  while (rows[count].name)
    count++;
  return count;
}

static ew_status check_real(const ew_parameter *row, const void *field, ew_error *error) {
  double value;
  memcpy(&value, field, sizeof value);
  if (value >= row->low && value <= row->high)
    return EW_OK;
  return ew_fail(error, EW_REFUSED, "%s = %g is outside %g to %g", row->name, value, row->low, row->high);
}

static ew_status check_choice(const ew_parameter *row, const void *field, ew_error *error) {
  int value, count = 0;
  memcpy(&value, field, sizeof value);
  while (row->choices[count].name)
    count++;
  if (value >= 0 && value < count)
    return EW_OK;
  return ew_fail(error, EW_REFUSED, "%s = %d is none of its %d choices", row->name, value, count);
}

ew_status ew_rows_check(const ew_parameter *rows, const void *parameters, ew_error *error) {
  ew_status status = EW_OK;
  for (const ew_parameter *row = rows; row->name && status == EW_OK; row++) {
    const void *field = (const char *)parameters + row->offset;
    if (row->type == EW_REAL)
      status = check_real(row, field, error);
    else if (row->type == EW_CHOICE)
      status = check_choice(row, field, error);
  }
  return status;
}
