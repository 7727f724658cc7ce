/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The parameter engine from inside. A read goes through five steps, one file each:
 *   source  the file and what it includes become one text, each of whose lines knows where it came from;
 *   scan    the text is cut into tokens, which also tell the parameter that a line is about;
 *   check   faults that libconfig would pass over in silence, or report without a name, are found in the tokens;
 *   read    libconfig parses the text, and its tree is walked against the table;
 *   value   one setting is checked against its row and stored. */
#ifndef ELFINWOOD_CORE_PARAMETERS_INTERNAL_H
#define ELFINWOOD_CORE_PARAMETERS_INTERNAL_H

#include "elfinwood/core.h"

#include <libconfig.h>

/* ------------------------------------------------------------------------------------------------------ messages */

/* What a user wrote, short enough to stand in a message. */
typedef struct {
  char text[100];
} ew_excerpt;

ew_excerpt ew_excerpt_of(const char *start, size_t length);

/* What is being complained about; `value` may be NULL. */
typedef struct {
  const ew_parameter_table *table;
  ew_status status;
  const char *where, *name, *value;
} ew_complaint;

/* "WHERE: NAME = VALUE: reason", then what is allowed or, when the table has no such name, the nearest one. */
ew_status ew_complain(const ew_complaint *about, ew_error *error, const char *format, ...) EW_FORMAT(3, 4);

/* --------------------------------------------------------------------------------------------------------- table */

void *ew_parameters_field(const ew_parameter_table *table, void *target, size_t index);

/* The row whose name is fewest edits away; NULL for an empty table. */
const ew_parameter *ew_parameters_nearest(const ew_parameter_table *table, const char *name);

/* Rows of one prefix are shown together, where the first of them stands. */
bool ew_parameters_opens_prefix(const ew_parameter_table *table, size_t index);
bool ew_parameters_same_prefix(const ew_parameter *a, const ew_parameter *b);

/* -------------------------------------------------------------------------------------------------------- source */

typedef struct {
  size_t file, number;
} ew_source_line;

typedef struct {
  char *text; /* ends with a newline; NULL-terminated */
  size_t size, capacity;
  ew_source_line *lines;
  size_t line_count, line_capacity;
  char **files;
  size_t file_count;
  bool may_include;
  bool short_of_memory;
} ew_source;

/* Both leave a source to be cleared, also when they fail. */
ew_status ew_source_load(ew_source *source, const char *path, ew_error *error);
ew_status ew_source_take_text(ew_source *source, const char *text, const char *label, ew_error *error);
void ew_source_clear(ew_source *source);

ew_origin ew_source_where(const ew_source *source, size_t line);      /* "FILE:LINE" of a line of the whole text */
ew_excerpt ew_source_line_text(const ew_source *source, size_t line); /* without the blanks at either end */

/* ---------------------------------------------------------------------------------------------------------- scan */

typedef enum {
  EW_TOKEN_END,
  EW_TOKEN_WORD,
  EW_TOKEN_NUMBER, /* anything that starts like one */
  EW_TOKEN_TEXT,
  EW_TOKEN_INCLUDE,  /* @include "name" */
  EW_TOKEN_UNCLOSED, /* text or comment without an end */
  EW_TOKEN_MARK      /* one character */
} ew_token_kind;

typedef struct {
  ew_token_kind kind;
  const char *start;
  size_t length;
  size_t line; /* from 1 */
} ew_token;

typedef struct {
  const char *begin, *next;
  size_t line;
} ew_scan;

ew_scan ew_scan_start(const char *text);
ew_token ew_scan_next(ew_scan *scan);

bool ew_token_is_mark(const ew_token *token, char mark);
bool ew_token_is_whole(const ew_token *token); /* an integer as libconfig writes it */

bool ew_token_is_not_finite(const ew_token *token); /* nan, -inf, ... */

/* Why the token cannot be a value, or be part of one; NULL when it can. */
const char *ew_token_fault(const ew_token *token);

/* A token and the setting that it belongs to. */
typedef struct {
  ew_scan scan;
  ew_token before, token; /* `token` is the one just read */
  ew_token group, key;    /* length 0: none */
  size_t depth;           /* of braces */
} ew_place;

ew_place ew_place_start(const char *text);
void ew_place_advance(ew_place *place);
bool ew_place_at_key(const ew_place *place);
ew_excerpt ew_place_name(const ew_place *place);  /* "group.key" */
ew_excerpt ew_place_value(const ew_place *place); /* of the key, as it is written */

/* --------------------------------------------------------------------------------------------------------- check */

#define EW_MIXED_ARRAY "an array holds one type: all numbers whole, or all with a point as in [1.0, 2.5]"

/* Refuses, with name and allowed values, what libconfig reads wrongly or rejects without naming the parameter. */
ew_status ew_source_check(const ew_source *source, const ew_parameter_table *table, ew_error *error);

/* Turns libconfig's parse error into a message about the parameter on that line. */
ew_status ew_source_explain(const ew_source *source, const ew_parameter_table *table, const config_t *config,
                            ew_error *error);

/* The value of `name` (the setting's full name) as the source has it. */
ew_excerpt ew_source_value(const ew_source *source, const char *name);

/* --------------------------------------------------------------------------------------------------------- parse */

/* config_read_string with whole numbers taken as 64-bit, which libconfig 1.5 does only at an L and else wraps around.
 * Sets *parsed; EW_FAILED when memory is short. */
ew_status ew_parse_text(config_t *config, const char *text, bool *parsed, ew_error *error);

/* One value on its own; *setting is NULL when `text` is none. It lives as long as `config`. */
ew_status ew_parse_value(config_t *config, const char *text, const config_setting_t **setting, ew_error *error);

/* --------------------------------------------------------------------------------------------------------- value */

enum { EW_NUMBER_SIZE = 32, EW_ALLOWED_SIZE = 512 };

/* The shortest decimal form that reads back to the same double. */
void ew_number_text(double value, char text[EW_NUMBER_SIZE]);

/* "a number from 0.4 to 1 Msun" */
void ew_allowed_text(const ew_parameter *row, char *text, size_t size);

/* Checks a setting against its row and stores it in the field. */
ew_status ew_value_store(const ew_parameter *row, const config_setting_t *setting, void *field,
                         const ew_complaint *about, ew_error *error);

/* The same for text without quotes. */
ew_status ew_value_store_text(const ew_parameter *row, const char *text, void *field, const ew_complaint *about,
                              ew_error *error);

/* Writes the field as libconfig text. */
void ew_value_write(const ew_parameter *row, const void *field, FILE *out);

#endif
