/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Failures travel as a status and one line of text; the first one of a chain is the one that is told. */
#include "elfinwood/core.h"

#include <gsl/gsl_errno.h>
#include <stdarg.h>

/* Names and values come from users: whatever they hold, a message stays one line and moves no cursor. */
static void keep_on_one_line(char *text) {
  for (; *text; text++) {
    unsigned char c = (unsigned char)*text, next = (unsigned char)text[1];
    if (c == '\n' || c == '\t')
      *text = ' ';
    else if (c < 0x20 || c == 0x7f)
      *text = '?';
    else if (c == 0xc2 && next >= 0x80 && next < 0xa0) /* a C1 control in UTF-8 */
      text[0] = text[1] = '?';
  }
}

ew_status ew_fail(ew_error *error, ew_status status, const char *format, ...) {
  if (!error || error->status != EW_OK)
    return status;
  error->status = status;
  va_list arguments;
  va_start(arguments, format);
  vsnprintf(error->message, sizeof error->message, format, arguments);
  va_end(arguments);
  keep_on_one_line(error->message);
  return status;
}

ew_status ew_fail_memory(ew_error *error, const char *what) {
  return ew_fail(error, EW_FAILED, "out of memory for %s", what);
}

ew_status ew_fail_gsl(ew_error *error, int gsl_status, const char *what) {
  return ew_fail(error, EW_FAILED, "%s: %s", what, gsl_strerror(gsl_status));
}

void ew_core_start(void) {
  gsl_set_error_handler_off();
}

const char *ew_version(void) {
  return EW_VERSION;
}
