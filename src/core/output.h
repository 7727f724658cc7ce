/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * A file that stands under its name only when it is whole: it grows as PATH.partial and is renamed at the end. Whatever
 * stood at PATH before is replaced by that rename and by nothing else. All failures are EW_FAILED and name the path. */
#ifndef EW_CORE_OUTPUT_H
#define EW_CORE_OUTPUT_H

#include "elfinwood/core.h"

typedef struct {
  char *path;    /* where it will stand */
  char *partial; /* where it grows */
} ew_output;

/* Could PATH be written? Tries to open PATH.partial for writing and leaves everything as it was. Refuses a PATH that is
 * a folder, a link, a device or write-protected, and a PATH.partial that a running program holds open. */
EW_CHECKED ew_status ew_output_probe(const char *path, ew_error *error);

/* Probes, removes a stale PATH.partial and keeps both names. Release with ew_output_clear. */
EW_CHECKED ew_status ew_output_open(ew_output *output, const char *path, ew_error *error);

/* Brings PATH.partial to the disk and renames it to PATH. */
EW_CHECKED ew_status ew_output_publish(const ew_output *output, ew_error *error);

void ew_output_clear(ew_output *output);

/* EW_FAILED with "cannot write PATH: reason". */
ew_status ew_output_fail(const char *path, const char *reason, ew_error *error);

#endif
