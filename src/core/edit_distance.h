/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * How far apart two names are, for guessing which one was meant. */
#ifndef EW_CORE_EDIT_DISTANCE_H
#define EW_CORE_EDIT_DISTANCE_H

#include <stddef.h>

/* Insertions, deletions and substitutions that turn one string into the other (Levenshtein 1966, Soviet Physics Doklady
 * 10, 707). Only the first 64 bytes of each count. */
size_t ew_edit_distance(const char *a, size_t a_length, const char *b, size_t b_length);

#endif
