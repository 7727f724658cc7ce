/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The rows of a parameter table: counting, finding, guessing which one was meant, and the complaint that names it. */
#include "core/edit_distance.h"
#include "core/parameters_internal.h"

#include <stdarg.h>
#include <string.h>

size_t ew_parameters_count(const ew_parameter_table *table) {
  size_t count = 0;
  for (size_t g = 0; g < table->count; g++)
    count += ew_rows_count(table->groups[g].rows);
  return count;
}

/* The group that holds row `index`, which is left counted within that group. */
static const ew_parameter_group *group_of(const ew_parameter_table *table, size_t *index) {
  const ew_parameter_group *group = table->groups;
  for (size_t count = ew_rows_count(group->rows); *index >= count; count = ew_rows_count(group->rows)) {
    *index -= count;
    group++;
  }
  return group;
}

const ew_parameter *ew_parameters_row(const ew_parameter_table *table, size_t index) {
  const ew_parameter_group *group = group_of(table, &index);
  return &group->rows[index];
}

void *ew_parameters_field(const ew_parameter_table *table, void *target, size_t index) {
  const ew_parameter_group *group = group_of(table, &index);
  return (char *)target + group->offset + group->rows[index].offset;
}

const ew_parameter *ew_parameters_find(const ew_parameter_table *table, const char *name, size_t *index) {
  size_t count = ew_parameters_count(table);
  for (size_t i = 0; i < count; i++) {
    const ew_parameter *row = ew_parameters_row(table, i);
    if (strcmp(row->name, name) != 0)
      continue;
    if (index)
      *index = i;
    return row;
  }
  return NULL;
}

bool ew_parameters_same_prefix(const ew_parameter *a, const ew_parameter *b) {
  size_t length = strcspn(a->name, ".");
  return length == strcspn(b->name, ".") && strncmp(a->name, b->name, length) == 0;
}

bool ew_parameters_opens_prefix(const ew_parameter_table *table, size_t index) {
  const ew_parameter *row = ew_parameters_row(table, index);
  for (size_t i = 0; i < index; i++)
    if (ew_parameters_same_prefix(ew_parameters_row(table, i), row))
      return false;
  return true;
}

/* -------------------------------------------------------------------------------------------------- nearest name */

static size_t least(size_t a, size_t b) {
  return a < b ? a : b;
}

/* A right key in a wrong group is a common slip, so a group costs two edits at most. A name without a group may be
 * meant as either part. */
static size_t name_distance(const char *given, const char *name) {
  size_t given_group = strcspn(given, "."), group = strcspn(name, ".");
  size_t groups = ew_edit_distance(given, given_group, name, group);
  const char *key = name + group + 1;
  if (given[given_group] == '\0')
    return least(groups, ew_edit_distance(given, given_group, key, strlen(key)));
  const char *given_key = given + given_group + 1;
  return least(groups, 2) + ew_edit_distance(given_key, strlen(given_key), key, strlen(key));
}

const ew_parameter *ew_parameters_nearest(const ew_parameter_table *table, const char *name) {
  const ew_parameter *nearest = NULL;
  size_t nearest_distance = SIZE_MAX, count = ew_parameters_count(table);
  for (size_t i = 0; i < count; i++) {
    const ew_parameter *row = ew_parameters_row(table, i);
    size_t distance = name_distance(name, row->name);
    if (distance < nearest_distance) {
      nearest_distance = distance;
      nearest = row;
    }
  }
  return nearest;
}

/* ------------------------------------------------------------------------------------------------------ messages */

ew_excerpt ew_excerpt_of(const char *start, size_t length) {
  ew_excerpt excerpt;
  const size_t room = sizeof excerpt.text - sizeof "...";
  size_t kept = length;
  if (length > room)
    for (kept = room; kept > 0 && ((unsigned char)start[kept] & 0xc0) == 0x80;) /* no half of a UTF-8 character */
      kept--;
  snprintf(excerpt.text, sizeof excerpt.text, "%.*s%s", (int)kept, start, kept < length ? "..." : "");
  return excerpt;
}

ew_status ew_complain(const ew_complaint *about, ew_error *error, const char *format, ...) {
  char reason[300], allowed[EW_ALLOWED_SIZE] = "";
  va_list arguments;
  va_start(arguments, format);
  vsnprintf(reason, sizeof reason, format, arguments);
  va_end(arguments);
  const ew_parameter *row = ew_parameters_find(about->table, about->name, NULL);
  const ew_parameter *nearest = row ? NULL : ew_parameters_nearest(about->table, about->name);
  if (row)
    ew_allowed_text(row, allowed, sizeof allowed);
  const char *value = about->value ? about->value : "";
  return ew_fail(error, about->status, "%s: %s%s%s: %s%s%s%s", about->where,
                 ew_excerpt_of(about->name, strlen(about->name)).text, about->value ? " = " : "",
                 ew_excerpt_of(value, strlen(value)).text, reason,
                 row       ? "; allowed: "
                 : nearest ? "; did you mean "
                           : "",
                 row ? allowed : (nearest ? nearest->name : ""), nearest ? "?" : "");
}
