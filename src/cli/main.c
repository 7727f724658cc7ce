/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The program elfinwood: finds the command, reads its options, lets it act, and turns what came of it into one line on
 * stderr and the exit status. */
#include "cli/cli.h"

#include "core/hdf.h"

#include <errno.h>
#include <string.h>

static const ew_command *const commands[] = {
    &ew_command_run, &ew_command_check, &ew_command_parameters, &ew_command_trees, &ew_command_spectrum,
};
enum { COMMAND_COUNT = sizeof commands / sizeof commands[0] };

/* A write to a closed pipe or beyond the allowed file size fails with a reason instead of killing the program. */
static void ignore_write_signals(void) {
  struct sigaction action = {.sa_handler = SIG_IGN};
  sigemptyset(&action.sa_mask);
  sigaction(SIGPIPE, &action, NULL);
  sigaction(SIGXFSZ, &action, NULL);
}

static void print_usage(FILE *out) {
  fputs("elfinwood COMMAND [PARAMS] [options]\n\n"
        "Semi-analytic dwarf galaxies over merger trees, with their scatter.\n\nCommands:\n",
        out);
  for (size_t i = 0; i < COMMAND_COUNT; i++)
    fprintf(out, "  %-12s %s\n", commands[i]->name, commands[i]->meaning);
  fputs("\nelfinwood COMMAND --help tells more, elfinwood --version the version.\n", out);
}

static const ew_command *find_command(const char *name) {
  for (size_t i = 0; i < COMMAND_COUNT; i++)
    if (strcmp(commands[i]->name, name) == 0)
      return commands[i];
  return NULL;
}

static ew_status refuse_command(const char *name, ew_error *error) {
  const char *names[COMMAND_COUNT];
  for (size_t i = 0; i < COMMAND_COUNT; i++)
    names[i] = commands[i]->name;
  return ew_fail(error, EW_REFUSED, "no command %.100s; did you mean %s? (elfinwood --help lists all)", name,
                 ew_nearest_name(name, names, COMMAND_COUNT));
}

static ew_status act(const ew_command *command, int count, char **words, ew_error *error) {
  ew_options options;
  ew_status status = ew_options_read(&options, command, count, words, error);
  if (status == EW_OK && options.help)
    ew_command_print_help(command, stdout);
  else if (status == EW_OK)
    status = command->act(&options, error);
  ew_options_clear(&options);
  return status;
}

static ew_status dispatch(int count, char **words, ew_error *error) {
  if (count < 2)
    return ew_fail(error, EW_REFUSED, "no command; usage: elfinwood COMMAND [PARAMS] [options] (elfinwood --help)");
  if (strcmp(words[1], "--help") == 0 || strcmp(words[1], "-h") == 0) {
    print_usage(stdout);
    return EW_OK;
  }
  if (strcmp(words[1], "--version") == 0) {
    printf("elfinwood %s\n", ew_version());
    return EW_OK;
  }
  const ew_command *command = find_command(words[1]);
  return command ? act(command, count - 2, words + 2, error) : refuse_command(words[1], error);
}

/* Results that did not reach standard output are a failure, if there was none before. */
static ew_status flush_results(ew_status status, ew_error *error) {
  errno = 0;
  bool lost = fflush(stdout) != 0 || ferror(stdout);
  if (status != EW_OK || !lost)
    return status;
  return ew_fail(error, EW_FAILED, "cannot write to standard output: %s", errno ? strerror(errno) : "write error");
}

int main(int count, char **words) {
  ignore_write_signals();
  ew_core_start();
  ew_hdf_start();
  ew_error error = {0};
  ew_status status = flush_results(dispatch(count, words, &error), &error);
  if (status != EW_OK)
    fprintf(stderr, "elfinwood: %s\n", error.message);
  return status;
}
