/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The options, declared once: read from the command line and shown by --help. */
#include "cli/cli.h"

#include "core/edit_distance.h"

#include <errno.h>
#include <stdlib.h>
#include <string.h>

typedef struct {
  const char *name, *letter; /* as written, "" if none */
  ew_option_flag flag;
  const char *argument; /* NULL: takes none */
  const char *meaning;
} option;

static const option options_known[] = {
    {"--output", "-o", EW_OPTION_OUTPUT, "FILE", "where the result goes"},
    {"--set", "", EW_OPTION_SET, "KEY=VALUE", "sets one parameter, over the file; may be repeated"},
    {"--seed", "", EW_OPTION_SEED, "N", "seed of all random streams, over file and --set"},
    {"--threads", "", EW_OPTION_THREADS, "N", "number of threads (results do not depend on it)"},
    {"--quiet", "", EW_OPTION_QUIET, NULL, "prints nothing but errors"},
    {"--help", "-h", EW_OPTION_HELP, NULL, "prints this"},
};
enum { OPTION_COUNT = sizeof options_known / sizeof options_known[0], MOST_THREADS = 1024 };

const char *ew_nearest_name(const char *given, const char *const *names, size_t count) {
  const char *nearest = NULL;
  size_t nearest_distance = SIZE_MAX;
  for (size_t i = 0; i < count; i++) {
    size_t distance = ew_edit_distance(given, strlen(given), names[i], strlen(names[i]));
    if (distance < nearest_distance) {
      nearest_distance = distance;
      nearest = names[i];
    }
  }
  return nearest;
}

/* ------------------------------------------------------------------------------------------------------------- read */

/* The words that are left. */
typedef struct {
  const ew_command *command;
  int count;
  char **word;
} reader;

/* Length of the option's name in the word, "=VALUE" left out. */
static size_t name_length(const char *word) {
  return strncmp(word, "--", 2) == 0 ? strcspn(word, "=") : strlen(word);
}

static bool is_named(const char *word, size_t length, const char *name) {
  return strlen(name) == length && strncmp(word, name, length) == 0;
}

static const option *find_option(const ew_command *command, const char *word) {
  size_t length = name_length(word);
  for (size_t i = 0; i < OPTION_COUNT; i++) {
    const option *known = &options_known[i];
    bool meant = is_named(word, length, known->name) || is_named(word, length, known->letter);
    if (meant && (command->options & known->flag))
      return known;
  }
  return NULL;
}

static ew_status refuse_option(const ew_command *command, const char *word, ew_error *error) {
  const char *names[OPTION_COUNT];
  size_t count = 0;
  for (size_t i = 0; i < OPTION_COUNT; i++)
    if (command->options & options_known[i].flag)
      names[count++] = options_known[i].name;
  char name[64];
  snprintf(name, sizeof name, "%.*s", (int)name_length(word), word);
  return ew_fail(error, EW_REFUSED, "%s: no option %s; did you mean %s?", command->name, name,
                 ew_nearest_name(name, names, count));
}

/* "--name=value", or the next word. */
static ew_status read_argument(reader *words, const option *known, const char *word, const char **argument,
                               ew_error *error) {
  *argument = NULL;
  const char *equals = name_length(word) < strlen(word) ? word + name_length(word) + 1 : NULL;
  if (!known->argument)
    return equals ? ew_fail(error, EW_REFUSED, "%s: %s takes no value", words->command->name, known->name) : EW_OK;
  if (!equals && words->count == 0)
    return ew_fail(error, EW_REFUSED, "%s: %s needs %s", words->command->name, word, known->argument);
  *argument = equals;
  if (!equals) {
    *argument = *words->word++;
    words->count--;
  }
  return EW_OK;
}

static ew_status read_threads(ew_options *options, const char *text, ew_error *error) {
  char *end;
  errno = 0;
  long threads = strtol(text, &end, 10);
  if (errno != 0 || end == text || *end != '\0' || !(threads >= 1 && threads <= MOST_THREADS))
    return ew_fail(error, EW_REFUSED, "--threads = %s: not possible; allowed: a whole number from 1 to %d", text,
                   MOST_THREADS);
  options->threads = (int)threads;
  return EW_OK;
}

static ew_status store(ew_options *options, ew_option_flag flag, const char *argument, ew_error *error) {
  switch (flag) {
  case EW_OPTION_OUTPUT:
    options->output = argument;
    return EW_OK;
  case EW_OPTION_SET:
    options->sets[options->set_count++] = argument;
    return EW_OK;
  case EW_OPTION_SEED:
    options->seed = argument;
    return EW_OK;
  case EW_OPTION_THREADS:
    return read_threads(options, argument, error);
  case EW_OPTION_QUIET:
    options->quiet = true;
    return EW_OK;
  default:
    options->help = true;
    return EW_OK;
  }
}

static ew_status read_option(ew_options *options, reader *words, const char *word, ew_error *error) {
  const option *known = find_option(words->command, word);
  if (!known)
    return refuse_option(words->command, word, error);
  const char *argument;
  ew_status status = read_argument(words, known, word, &argument, error);
  return status == EW_OK ? store(options, known->flag, argument, error) : status;
}

static ew_status read_file_name(ew_options *options, const ew_command *command, const char *word, ew_error *error) {
  if (!command->takes_file)
    return ew_fail(error, EW_REFUSED, "%s: takes no file, but was given %s", command->name, word);
  if (options->file)
    return ew_fail(error, EW_REFUSED, "%s: takes one parameter file, but was given %s and %s", command->name,
                   options->file, word);
  options->file = word;
  return EW_OK;
}

ew_status ew_options_read(ew_options *options, const ew_command *command, int count, char **words, ew_error *error) {
  *options = (ew_options){.sets = calloc((size_t)count + 1, sizeof(char *))};
  if (!options->sets)
    return ew_fail_memory(error, "the command line");
  reader left = {command, count, words};
  bool files_only = false;
  ew_status status = EW_OK;
  while (left.count > 0 && status == EW_OK && !options->help) {
    const char *word = *left.word++;
    left.count--;
    if (!files_only && strcmp(word, "--") == 0)
      files_only = true;
    else if (!files_only && word[0] == '-' && word[1] != '\0')
      status = read_option(options, &left, word, error);
    else
      status = read_file_name(options, command, word, error);
  }
  if (status == EW_OK && command->takes_file && !options->file && !options->help)
    status = ew_fail(error, EW_REFUSED, "%s: no parameter file given; usage: elfinwood %s PARAMS [options]",
                     command->name, command->name);
  return status;
}

void ew_options_clear(ew_options *options) {
  free(options->sets);
  *options = (ew_options){0};
}

/* ------------------------------------------------------------------------------------------------------------- help */

void ew_command_print_help(const ew_command *command, FILE *out) {
  fprintf(out, "elfinwood %s%s [options]\n\n%s\n\nOptions:\n", command->name, command->takes_file ? " PARAMS" : "",
          command->help);
  for (size_t i = 0; i < OPTION_COUNT; i++) {
    const option *known = &options_known[i];
    if (!(command->options & known->flag))
      continue;
    char name[64];
    snprintf(name, sizeof name, "%s%s%s %s", known->letter, *known->letter ? ", " : "", known->name,
             known->argument ? known->argument : "");
    fprintf(out, "  %-20s %s\n", name, known->meaning);
  }
}
