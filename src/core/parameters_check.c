/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Faults found in the text itself. libconfig 1.5 reads some of them without a word (a point alone is 0, a comment
 * without an end hides the rest) and stops at others without saying which parameter it was about. */
#include "core/parameters_internal.h"

#include <string.h>

static ew_status complain_at(const ew_place *place, size_t line, const ew_source *source,
                             const ew_parameter_table *table, const char *reason, ew_error *error) {
  ew_origin where = ew_source_where(source, line);
  ew_excerpt name = ew_place_name(place), value = ew_place_value(place);
  const char *shown = place->key.length > 0 ? value.text : NULL;
  return ew_complain(&(ew_complaint){table, EW_REFUSED, where.text, name.text, shown}, error, "%s", reason);
}

static bool follows_one_of(const ew_place *place, const char *marks) {
  return place->before.kind == EW_TOKEN_MARK && strchr(marks, *place->before.start);
}

/* Words and numbers that stand where no value can are left to libconfig. */
static bool is_value(const ew_place *place) {
  if (place->token.kind != EW_TOKEN_WORD && place->token.kind != EW_TOKEN_NUMBER)
    return true;
  return !ew_place_at_key(place) && follows_one_of(place, "=:[(,");
}

/* libconfig wants one type in an array. `first` is the first element of the array that is open. */
static bool mixes_types(const ew_place *place, ew_token *first) {
  const ew_token *token = &place->token;
  if (ew_token_is_mark(token, '[') || ew_token_is_mark(token, ']'))
    *first = (ew_token){0};
  if (token->kind == EW_TOKEN_MARK)
    return false;
  if (ew_token_is_mark(&place->before, '['))
    *first = *token;
  return first->length > 0 && (first->kind != token->kind || ew_token_is_whole(first) != ew_token_is_whole(token));
}

static const char *fault_at(const ew_place *place, ew_token *first_of_array) {
  if (ew_place_at_key(place) && memchr(place->key.start, '.', place->key.length))
    return "in a file a key stands inside its group, \"group : { key = value; };\"";
  if (ew_place_at_key(place) && follows_one_of(place, "=:"))
    return "the setting before it has no value";
  if (ew_token_is_mark(&place->token, ';') && follows_one_of(place, "=:"))
    return "no value";
  if (place->token.kind == EW_TOKEN_TEXT && place->before.kind != EW_TOKEN_TEXT && !follows_one_of(place, "=:[(,"))
    return "text where none can stand (is a = or a quote missing)";
  if (is_value(place) && ew_token_fault(&place->token))
    return ew_token_fault(&place->token);
  if (mixes_types(place, first_of_array))
    return EW_MIXED_ARRAY;
  return NULL;
}

static bool is_about_key(const ew_place *place) {
  bool in_comment = place->token.kind == EW_TOKEN_UNCLOSED && *place->token.start == '/';
  return place->key.length > 0 && !in_comment;
}

ew_status ew_source_check(const ew_source *source, const ew_parameter_table *table, ew_error *error) {
  ew_place place = ew_place_start(source->text);
  ew_token first_of_array = {0};
  do {
    ew_place_advance(&place);
    const char *fault = fault_at(&place, &first_of_array);
    if (fault && is_about_key(&place))
      return complain_at(&place, place.token.line, source, table, fault, error);
    if (fault)
      return ew_fail(error, EW_REFUSED, "%s: %s: \"%s\"", ew_source_where(source, place.token.line).text, fault,
                     ew_source_line_text(source, place.token.line).text);
  } while (place.token.kind != EW_TOKEN_END);
  if (place.group.length > 0)
    return ew_fail(error, EW_REFUSED, "%s: %s: this group is never closed",
                   ew_source_where(source, place.group.line).text,
                   ew_excerpt_of(place.group.start, place.group.length).text);
  return EW_OK;
}

/* ----------------------------------------------------------------------------------------------------- libconfig */

static bool same_key(const ew_place *a, const ew_place *b) {
  return a->depth == b->depth && strcmp(ew_place_name(a).text, ew_place_name(b).text) == 0;
}

/* The first key on `line` that was there before, and where. */
static bool find_repeat(const ew_source *source, size_t line, ew_place *repeat, ew_place *earlier) {
  *repeat = ew_place_start(source->text);
  do {
    ew_place_advance(repeat);
    if (!ew_place_at_key(repeat) || repeat->token.line != line)
      continue;
    *earlier = ew_place_start(source->text);
    for (ew_place_advance(earlier); earlier->token.start < repeat->token.start; ew_place_advance(earlier))
      if (ew_place_at_key(earlier) && same_key(earlier, repeat))
        return true;
  } while (repeat->token.kind != EW_TOKEN_END && repeat->token.line <= line);
  return false;
}

static ew_status refuse_repeat(const ew_source *source, const ew_parameter_table *table, const ew_place *repeat,
                               const ew_place *earlier, ew_error *error) {
  ew_origin first = ew_source_where(source, earlier->token.line);
  char reason[sizeof first.text + 32];
  if (repeat->depth > 0) {
    snprintf(reason, sizeof reason, "set twice, first at %s", first.text);
    return complain_at(repeat, repeat->token.line, source, table, reason, error);
  }
  return ew_fail(error, EW_REFUSED, "%s: %s: opened twice, first at %s; allowed: once, with all its keys inside",
                 ew_source_where(source, repeat->token.line).text, ew_place_name(repeat).text, first.text);
}

/* The last key that starts on `line`, if any does. */
static bool find_key(const ew_source *source, size_t line, ew_place *found) {
  bool any = false;
  ew_place place = ew_place_start(source->text);
  for (ew_place_advance(&place); place.token.kind != EW_TOKEN_END && place.token.line <= line; ew_place_advance(&place))
    if (place.token.line == line && ew_place_at_key(&place)) {
      *found = place;
      any = true;
    }
  return any;
}

ew_status ew_source_explain(const ew_source *source, const ew_parameter_table *table, const config_t *config,
                            ew_error *error) {
  const char *text = config_error_text(config) ? config_error_text(config) : "syntax error";
  size_t line = (size_t)config_error_line(config);
  while (line > 1 && strlen(ew_source_line_text(source, line).text) == 0) /* at the end of a file */
    line--;
  ew_place place, earlier;
  if (strcmp(text, "duplicate setting name") == 0 && find_repeat(source, line, &place, &earlier))
    return refuse_repeat(source, table, &place, &earlier, error);
  char reason[200];
  snprintf(reason, sizeof reason, "%s in \"%s\"", text, ew_source_line_text(source, line).text);
  if (find_key(source, line, &place))
    return complain_at(&place, line, source, table, reason, error);
  return ew_fail(error, EW_REFUSED, "%s: %s", ew_source_where(source, line).text, reason);
}

ew_excerpt ew_source_value(const ew_source *source, const char *name) {
  ew_place place = ew_place_start(source->text);
  do {
    ew_place_advance(&place);
    if (ew_place_at_key(&place) && strcmp(ew_place_name(&place).text, name) == 0)
      return ew_place_value(&place);
  } while (place.token.kind != EW_TOKEN_END);
  return (ew_excerpt){""};
}
