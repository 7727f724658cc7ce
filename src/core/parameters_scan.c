/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Parameter text cut into tokens, by libconfig's own rules for names, text and comments, and a little more widely for
 * numbers and words so that what is not quite one can be named in a message. */
#include "core/parameters_internal.h"

#include <ctype.h>
#include <errno.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>
#include <strings.h>

static bool starts_word(char c) {
  return isalpha((unsigned char)c) || c == '*' || c == '_';
}

static bool is_sign(char c) {
  return c == '+' || c == '-';
}

static void move_to(ew_scan *scan, const char *end) {
  for (; scan->next < end; scan->next++)
    if (*scan->next == '\n')
      scan->line++;
}

/* The end of the blank or comment that starts here; `at` itself when none does, NULL when a comment has no end. */
static const char *after_blank(const char *at) {
  if (isspace((unsigned char)*at))
    return at + 1;
  if (at[0] == '#' || (at[0] == '/' && at[1] == '/'))
    return at + strcspn(at, "\n");
  if (at[0] != '/' || at[1] != '*')
    return at;
  const char *close = strstr(at + 2, "*/");
  return close ? close + 2 : NULL;
}

static const char *after_word(const char *at) {
  while (isalnum((unsigned char)*at) || (*at && strchr("_*-+.", *at)))
    at++;
  return at;
}

static const char *after_number(const char *at) {
  for (at++; isalnum((unsigned char)*at) || *at == '.' || *at == '_' || (is_sign(*at) && tolower(at[-1]) == 'e');)
    at++;
  return at;
}

/* Past the closing quote, or NULL. */
static const char *after_text(const char *at) {
  for (at++; *at && *at != '"';)
    at += at[0] == '\\' && at[1] ? 2 : 1;
  return *at ? at + 1 : NULL;
}

/* Past the directive, or NULL when this is none: libconfig wants it first on its line. */
static const char *after_include(const char *begin, const char *at) {
  static const char word[] = "@include";
  const char *left = at;
  while (left > begin && (left[-1] == ' ' || left[-1] == '\t'))
    left--;
  if ((left > begin && left[-1] != '\n') || strncmp(at, word, sizeof word - 1) != 0)
    return NULL;
  const char *name = at + sizeof word - 1;
  size_t blanks = strspn(name, " \t");
  if (blanks == 0 || name[blanks] != '"')
    return NULL;
  const char *close = strpbrk(name + blanks + 1, "\"\n");
  return close && *close == '"' ? close + 1 : NULL;
}

static ew_token_kind kind_at(const char *begin, const char *at) {
  if (*at == '\0')
    return EW_TOKEN_END;
  if (*at == '"')
    return EW_TOKEN_TEXT;
  const char *first = at + is_sign(*at);
  if (isdigit((unsigned char)*first) || *first == '.')
    return EW_TOKEN_NUMBER;
  if (starts_word(*first))
    return EW_TOKEN_WORD;
  return *at == '@' && after_include(begin, at) ? EW_TOKEN_INCLUDE : EW_TOKEN_MARK;
}

static const char *after_token(ew_token_kind kind, const char *begin, const char *at) {
  switch (kind) {
  case EW_TOKEN_WORD:
    return after_word(at);
  case EW_TOKEN_NUMBER:
    return after_number(at);
  case EW_TOKEN_TEXT:
    return after_text(at);
  case EW_TOKEN_INCLUDE:
    return after_include(begin, at);
  case EW_TOKEN_MARK:
    return at + 1;
  default:
    return at;
  }
}

ew_scan ew_scan_start(const char *text) {
  return (ew_scan){text, text, 1};
}

ew_token ew_scan_next(ew_scan *scan) {
  const char *end = after_blank(scan->next);
  for (; end && end != scan->next; end = after_blank(scan->next))
    move_to(scan, end);
  ew_token token = {.kind = EW_TOKEN_UNCLOSED, .start = scan->next, .line = scan->line};
  if (end) {
    token.kind = kind_at(scan->begin, token.start);
    end = after_token(token.kind, scan->begin, token.start);
  }
  if (!end) {
    token.kind = EW_TOKEN_UNCLOSED;
    end = token.start + strlen(token.start);
  }
  token.length = (size_t)(end - token.start);
  move_to(scan, end);
  return token;
}

bool ew_token_is_mark(const ew_token *token, char mark) {
  return token->kind == EW_TOKEN_MARK && *token->start == mark;
}

bool ew_token_is_whole(const ew_token *token) {
  const char *at = token->start, *end = token->start + token->length;
  at += token->length > 0 && is_sign(*at);
  size_t digits = strspn(at, "0123456789");
  size_t suffix = strspn(at + digits, "L");
  return token->kind == EW_TOKEN_NUMBER && digits > 0 && suffix <= 2 && at + digits + suffix == end;
}

/* -------------------------------------------------------------------------------------------------------- faults */

/* A whole number that is too large without an L is read as a real one. */
static const char *whole_fault(const ew_token *token) {
  errno = 0;
  (void)strtoll(token->start, NULL, 10);
  return errno == ERANGE && token->start[token->length - 1] == 'L' ? "too large for a whole number" : NULL;
}

static const char *number_fault(const ew_token *token) {
  if (ew_token_is_whole(token))
    return whole_fault(token);
  const char *digits = token->start + is_sign(*token->start);
  if (digits[0] == '0' && tolower(digits[1]) == 'x')
    return "hexadecimal numbers are not accepted, write it in decimals";
  char *end;
  double value = strtod(token->start, &end);
  if (end != token->start + token->length)
    return "not a number";
  return isfinite(value) ? NULL : "too large for a number";
}

static bool says(const ew_token *token, const char *word) {
  size_t sign = is_sign(*token->start);
  return token->length == sign + strlen(word) && strncasecmp(token->start + sign, word, strlen(word)) == 0;
}

bool ew_token_is_not_finite(const ew_token *token) {
  return token->kind == EW_TOKEN_WORD && (says(token, "nan") || says(token, "inf") || says(token, "infinity"));
}

static const char *word_fault(const ew_token *token) {
  if (ew_token_is_not_finite(token))
    return "not a finite number";
  if (!is_sign(*token->start) && (says(token, "true") || says(token, "false")))
    return NULL;
  return "text needs double quotes";
}

/* libconfig drops a NUL and what it can no longer see behind it. */
static const char *text_fault(const ew_token *token) {
  for (size_t i = 1; i + 4 < token->length; i += token->start[i] == '\\' ? 2 : 1)
    if (strncmp(token->start + i, "\\x00", 4) == 0 || strncmp(token->start + i, "\\X00", 4) == 0)
      return "text cannot hold a NUL character";
  return NULL;
}

const char *ew_token_fault(const ew_token *token) {
  switch (token->kind) {
  case EW_TOKEN_NUMBER:
    return number_fault(token);
  case EW_TOKEN_WORD:
    return word_fault(token);
  case EW_TOKEN_TEXT:
    return text_fault(token);
  case EW_TOKEN_UNCLOSED:
    return *token->start == '"' ? "text is never closed" : "comment is never closed";
  default:
    return NULL;
  }
}

/* -------------------------------------------------------------------------------------------------------- places */

static bool is_key(ew_scan after, const ew_token *token) {
  if (token->kind != EW_TOKEN_WORD)
    return false;
  ew_token next = ew_scan_next(&after);
  return ew_token_is_mark(&next, '=') || ew_token_is_mark(&next, ':');
}

ew_place ew_place_start(const char *text) {
  return (ew_place){.scan = ew_scan_start(text)};
}

bool ew_place_at_key(const ew_place *place) {
  return place->key.length > 0 && place->key.start == place->token.start;
}

void ew_place_advance(ew_place *place) {
  const ew_token none = {0};
  place->before = place->token;
  place->token = ew_scan_next(&place->scan);
  if (is_key(place->scan, &place->token)) {
    place->key = place->token;
  } else if (ew_token_is_mark(&place->token, '{')) {
    if (place->depth++ == 0)
      place->group = place->key;
    place->key = none;
  } else if (ew_token_is_mark(&place->token, '}')) {
    if (place->depth > 0 && --place->depth == 0)
      place->group = none;
    place->key = none;
  }
}

ew_excerpt ew_place_name(const ew_place *place) {
  ew_excerpt name;
  const ew_token *group = &place->group, *key = &place->key;
  bool both = group->length > 0 && key->length > 0;
  snprintf(name.text, sizeof name.text, "%.*s%s%.*s", (int)group->length, group->length > 0 ? group->start : "",
           both ? "." : "", (int)key->length, key->length > 0 ? key->start : "");
  return name;
}

ew_excerpt ew_place_value(const ew_place *place) {
  if (place->key.length == 0)
    return (ew_excerpt){""};
  ew_scan scan = ew_scan_start(place->key.start + place->key.length);
  (void)ew_scan_next(&scan); /* the = or : */
  ew_token token = ew_scan_next(&scan);
  const char *start = token.start, *end = start;
  while (token.kind != EW_TOKEN_END && !ew_token_is_mark(&token, ';') && !ew_token_is_mark(&token, '}') &&
         !is_key(scan, &token)) {
    end = token.start + token.length;
    token = ew_scan_next(&scan);
  }
  return ew_excerpt_of(start, (size_t)(end - start));
}
