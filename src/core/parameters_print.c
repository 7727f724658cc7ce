/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Parameters on their way out: the table for people, the values as text that can be read again, one value in a
 * refusal. */
#include "core/parameters_internal.h"

#include <stdarg.h>
#include <stdlib.h>
#include <string.h>

/* ---------------------------------------------------------------------------------------------------- for people */

enum { PAGE_WIDTH = 110, ALLOWED_COLUMN = 73 };

/* Columns on the page: bytes that start a UTF-8 character. */
static int columns(const char *text, size_t length) {
  int count = 0;
  for (size_t i = 0; i < length; i++)
    count += ((unsigned char)text[i] & 0xc0) != 0x80;
  return count;
}

/* Words of `text` from column `at` on, continued at column `indent`; returns the column reached. */
static int print_wrapped(const char *text, int at, int indent, FILE *out) {
  bool first = true;
  for (text += strspn(text, " "); *text; text += strspn(text, " ")) {
    size_t length = strcspn(text, " ");
    int width = columns(text, length);
    if (!first && at + 1 + width > PAGE_WIDTH) {
      fprintf(out, "\n%*s", indent, "");
      at = indent;
    } else if (!first) {
      fputc(' ', out);
      at++;
    }
    fwrite(text, 1, length, out);
    at += width;
    text += length;
    first = false;
  }
  return at;
}

static void print_meaning(const char *meaning, const char *source, int at, int indent, FILE *out) {
  char bracketed[EW_TEXT_SIZE];
  snprintf(bracketed, sizeof bracketed, "%s [%s]", meaning, source);
  print_wrapped(bracketed, at, indent, out);
  fputc('\n', out);
}

static void print_choices(const ew_choice *choice, FILE *out) {
  for (; choice->name; choice++) {
    const int name_column = 6, meaning_column = 28;
    int at = fprintf(out, "%*s%-*s ", name_column, "", meaning_column - name_column - 1, choice->name);
    print_meaning(choice->meaning, choice->source, at, meaning_column, out);
  }
}

static void print_row(const ew_parameter *row, FILE *out) {
  char allowed[EW_ALLOWED_SIZE] = "one of these:";
  if (row->type != EW_CHOICE)
    ew_allowed_text(row, allowed, sizeof allowed);
  int at = fprintf(out, "  %-38s %-12s %-18s ", row->name, row->unit, row->standard);
  print_wrapped(allowed, at, ALLOWED_COLUMN, out);
  fputs("\n    ", out);
  print_meaning(row->meaning, row->source, 4, 4, out);
  if (row->type == EW_CHOICE)
    print_choices(row->choices, out);
}

void ew_parameters_print(const ew_parameter_table *table, FILE *out) {
  size_t count = ew_parameters_count(table);
  for (size_t i = 0; i < count; i++) {
    const ew_parameter *first = ew_parameters_row(table, i);
    if (!ew_parameters_opens_prefix(table, i))
      continue;
    char heading[40];
    snprintf(heading, sizeof heading, "%.*s", (int)strcspn(first->name, "."), first->name);
    fprintf(out, "%s%-40s %-12s %-18s %s\n", i > 0 ? "\n" : "", heading, "unit", "default", "allowed");
    for (size_t j = i; j < count; j++)
      if (ew_parameters_same_prefix(ew_parameters_row(table, j), first))
        print_row(ew_parameters_row(table, j), out);
  }
}

/* -------------------------------------------------------------------------------------------------- for a reread */

static void write_prefix(const ew_parameter_values *values, size_t first, FILE *out) {
  const ew_parameter *opener = ew_parameters_row(values->table, first);
  size_t count = ew_parameters_count(values->table);
  fprintf(out, "%.*s :\n{\n", (int)strcspn(opener->name, "."), opener->name);
  for (size_t i = first; i < count; i++) {
    const ew_parameter *row = ew_parameters_row(values->table, i);
    if (!ew_parameters_same_prefix(row, opener))
      continue;
    fprintf(out, "  %s = ", strchr(row->name, '.') + 1);
    ew_value_write(row, ew_parameters_field(values->table, values->target, i), out);
    fputs(";\n", out);
  }
  fputs("};\n", out);
}

/* Closes a memory stream; the text, or NULL when memory was short. */
static char *taken(FILE *out, char **text) {
  bool whole = !ferror(out);
  if (fclose(out) == 0 && whole)
    return *text;
  free(*text);
  return NULL;
}

char *ew_parameters_echo(const ew_parameter_values *values) {
  char *text = NULL;
  size_t size, count = ew_parameters_count(values->table);
  FILE *out = open_memstream(&text, &size);
  if (!out)
    return NULL;
  for (size_t i = 0; i < count; i++)
    if (ew_parameters_opens_prefix(values->table, i))
      write_prefix(values, i, out);
  return taken(out, &text);
}

/* ---------------------------------------------------------------------------------------------------- in refusal */

static char *value_text(const ew_parameter *row, const void *field) {
  char *text = NULL;
  size_t size;
  FILE *out = open_memstream(&text, &size);
  if (!out)
    return NULL;
  ew_value_write(row, field, out);
  return taken(out, &text);
}

ew_status ew_parameters_refuse(const ew_parameter_values *values, const char *name, ew_error *error, const char *format,
                               ...) {
  size_t index;
  const ew_parameter *row = ew_parameters_find(values->table, name, &index);
  if (!row)
    return ew_fail(error, EW_FAILED, "a check names %s, which is no parameter", name);
  char reason[600];
  va_list arguments;
  va_start(arguments, format);
  vsnprintf(reason, sizeof reason, format, arguments);
  va_end(arguments);
  char *value = value_text(row, ew_parameters_field(values->table, values->target, index));
  if (!value)
    return ew_fail_memory(error, "a message");
  ew_fail(error, EW_REFUSED, "%s: %s = %s: %s", values->origin[index].text, name,
          ew_excerpt_of(value, strlen(value)).text, reason);
  free(value);
  return EW_REFUSED;
}
