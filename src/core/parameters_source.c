/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Parameter text from files. Included files are spliced in here rather than by libconfig, so that each is found beside
 * the file that names it, an unreadable one is refused in our words, and a message can quote any line. */
#include "core/parameters_internal.h"

#include <errno.h>
#include <stdlib.h>
#include <string.h>

enum { LARGEST_SOURCE = 1 << 20, MOST_FILES = 1000, DEEPEST_INCLUDE = 10, LONGEST_PATH = 300 };

/* -------------------------------------------------------------------------------------------------- growing text */

static bool make_room(ew_source *source, size_t size) {
  if (source->size + size < source->capacity)
    return true;
  size_t capacity = 2 * (source->size + size) + 1;
  char *text = realloc(source->text, capacity);
  if (!text) {
    source->short_of_memory = true;
    return false;
  }
  source->text = text;
  source->capacity = capacity;
  return true;
}

static void add_line(ew_source *source, size_t file, size_t number) {
  if (source->line_count == source->line_capacity) {
    size_t capacity = 2 * source->line_capacity + 64;
    ew_source_line *lines = realloc(source->lines, capacity * sizeof *lines);
    if (!lines) {
      source->short_of_memory = true;
      return;
    }
    source->lines = lines;
    source->line_capacity = capacity;
  }
  source->lines[source->line_count++] = (ew_source_line){file, number};
}

static void append(ew_source *source, const char *start, size_t length) {
  if (source->short_of_memory || !make_room(source, length))
    return;
  memcpy(source->text + source->size, start, length);
  source->size += length;
  source->text[source->size] = '\0';
  for (size_t i = 0; i < length; i++) {
    ew_source_line last = source->lines[source->line_count - 1];
    if (start[i] == '\n')
      add_line(source, last.file, last.number + 1);
  }
}

static void end_line(ew_source *source) {
  if (source->size == 0 || source->text[source->size - 1] != '\n')
    append(source, "\n", 1);
}

/* What is appended from here on is line `number` of `file`. */
static void begin_line(ew_source *source, size_t file, size_t number) {
  if (source->size > 0)
    end_line(source);
  if (source->line_count == 0)
    add_line(source, file, number);
  else
    source->lines[source->line_count - 1] = (ew_source_line){file, number};
}

/* Takes `name` over. */
static size_t add_file(ew_source *source, char *name) {
  char **files = name ? realloc(source->files, (source->file_count + 1) * sizeof *files) : NULL;
  if (!files) {
    free(name);
    source->short_of_memory = true;
    return 0;
  }
  source->files = files;
  source->files[source->file_count] = name;
  return source->file_count++;
}

/* --------------------------------------------------------------------------------------------------------- files */

/* The text of a file, or NULL with the reason, or with none when memory is short. */
static char *read_stream(FILE *stream, const char **reason) {
  char *text = malloc(LARGEST_SOURCE + 1);
  if (!text)
    return NULL;
  size_t size = fread(text, 1, LARGEST_SOURCE, stream);
  if (ferror(stream))
    *reason = strerror(errno);
  else if (size == LARGEST_SOURCE)
    *reason = "too large for a parameter file";
  else if (memchr(text, '\0', size))
    *reason = "not a text file";
  if (*reason) {
    free(text);
    return NULL;
  }
  text[size] = '\0';
  return text;
}

/* A long path keeps its end, which holds the file's name. */
static ew_origin shown_path(const char *path) {
  ew_origin shown;
  size_t length = strlen(path);
  bool cut = length > LONGEST_PATH;
  snprintf(shown.text, sizeof shown.text, "%s%s", cut ? "..." : "", cut ? path + length - LONGEST_PATH : path);
  return shown;
}

static char *read_file(const char *path, const char **reason) {
  FILE *stream = fopen(path, "r");
  if (!stream) {
    *reason = strerror(errno);
    return NULL;
  }
  char *text = read_stream(stream, reason);
  fclose(stream);
  return text;
}

/* `name` as seen from the folder of `from`; NULL when memory is short. */
static char *beside(const char *from, const char *name, size_t length) {
  const char *slash = strrchr(from, '/');
  size_t folder = slash && *name != '/' ? (size_t)(slash - from) + 1 : 0;
  char *path = malloc(folder + length + 1);
  if (!path)
    return NULL;
  memcpy(path, from, folder);
  memcpy(path + folder, name, length);
  path[folder + length] = '\0';
  return path;
}

static const char byte_order_mark[] = "\xef\xbb\xbf";

static ew_status splice(ew_source *source, const char *text, size_t file, size_t depth, ew_error *error);

static ew_status refuse_include(const ew_source *source, const ew_token *directive, const char *reason,
                                ew_error *error) {
  size_t line = source->line_count > 0 ? source->line_count : 1;
  return ew_fail(error, EW_REFUSED, "%s: %s: %s", ew_source_where(source, line).text,
                 ew_excerpt_of(directive->start, directive->length).text, reason);
}

static const char *include_fault(const ew_source *source, size_t depth) {
  if (!source->may_include)
    return "only a file can include another";
  if (depth == DEEPEST_INCLUDE)
    return "more than ten files deep, does a file include itself?";
  if (source->size > LARGEST_SOURCE || source->file_count >= MOST_FILES)
    return "too large for a parameter file";
  return NULL;
}

static ew_status include(ew_source *source, const ew_token *directive, size_t file, size_t depth, ew_error *error) {
  const char *reason = include_fault(source, depth);
  if (reason)
    return refuse_include(source, directive, reason, error);
  const char *name = (const char *)memchr(directive->start, '"', directive->length) + 1;
  const char *close = directive->start + directive->length - 1;
  char *path = beside(source->files[file], name, (size_t)(close - name));
  char *text = path ? read_file(path, &reason) : NULL;
  if (!text) {
    free(path);
    source->short_of_memory = !reason;
    return reason ? refuse_include(source, directive, reason, error) : EW_OK;
  }
  size_t included = add_file(source, path);
  ew_status status = source->short_of_memory ? EW_OK : splice(source, text, included, depth + 1, error);
  free(text);
  return status;
}

static ew_status splice(ew_source *source, const char *text, size_t file, size_t depth, ew_error *error) {
  if (strncmp(text, byte_order_mark, sizeof byte_order_mark - 1) == 0)
    text += sizeof byte_order_mark - 1;
  begin_line(source, file, 1);
  ew_scan scan = ew_scan_start(text);
  const char *copied = text;
  ew_status status = EW_OK;
  for (ew_token token = ew_scan_next(&scan); token.kind != EW_TOKEN_END && status == EW_OK;
       token = ew_scan_next(&scan)) {
    if (token.kind != EW_TOKEN_INCLUDE)
      continue;
    append(source, copied, (size_t)(token.start - copied));
    copied = token.start + token.length;
    status = include(source, &token, file, depth, error);
    begin_line(source, file, token.line);
  }
  append(source, copied, strlen(copied));
  return status;
}

/* Takes `name` over. */
static ew_status take(ew_source *source, const char *text, char *name, ew_error *error) {
  size_t file = add_file(source, name);
  ew_status status = source->short_of_memory ? EW_OK : splice(source, text, file, 0, error);
  end_line(source);
  if (status == EW_OK && source->short_of_memory)
    return ew_fail_memory(error, "a parameter file");
  return status;
}

ew_status ew_source_load(ew_source *source, const char *path, ew_error *error) {
  *source = (ew_source){.may_include = true};
  const char *reason = NULL;
  char *text = read_file(path, &reason);
  if (!text && !reason)
    return ew_fail_memory(error, "a parameter file");
  if (!text)
    return ew_fail(error, EW_REFUSED, "%s: %s", shown_path(path).text, reason);
  ew_status status = take(source, text, strdup(path), error);
  free(text);
  return status;
}

ew_status ew_source_take_text(ew_source *source, const char *text, const char *label, ew_error *error) {
  *source = (ew_source){0};
  return take(source, text, strdup(label), error);
}

void ew_source_clear(ew_source *source) {
  for (size_t i = 0; i < source->file_count; i++)
    free(source->files[i]);
  free(source->files);
  free(source->lines);
  free(source->text);
  *source = (ew_source){0};
}

/* --------------------------------------------------------------------------------------------------------- lines */

ew_origin ew_source_where(const ew_source *source, size_t line) {
  ew_origin where;
  ew_source_line at = source->lines[(line < source->line_count ? line : source->line_count) - 1];
  ew_origin path = shown_path(source->files[at.file]);
  snprintf(where.text, sizeof where.text, "%.*s:%zu", LONGEST_PATH + 3, path.text, at.number);
  return where;
}

ew_excerpt ew_source_line_text(const ew_source *source, size_t line) {
  const char *start = source->text;
  for (size_t i = 1; i < line && start; i++) {
    start = strchr(start, '\n');
    start += start != NULL;
  }
  if (!start)
    return (ew_excerpt){""};
  start += strspn(start, " \t\r");
  size_t length = strcspn(start, "\n");
  while (length > 0 && strchr(" \t\r", start[length - 1]))
    length--;
  return ew_excerpt_of(start, length);
}
