/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The program: a table of commands, the options they share, the request made of parameter file and options, and the
 * wish to stop. Commands return the program's exit status; main prints the error, in one line on stderr. */
#ifndef EW_CLI_H
#define EW_CLI_H

#include "elfinwood/elfinwood.h"

#include <signal.h>

/* ---------------------------------------------------------------------------------------------------------- options */

typedef enum {
  EW_OPTION_OUTPUT = 1,
  EW_OPTION_SET = 2,
  EW_OPTION_SEED = 4,
  EW_OPTION_THREADS = 8,
  EW_OPTION_QUIET = 16,
  EW_OPTION_HELP = 32,
  EW_OPTIONS_OF_A_JOB = 63 /* all of them */
} ew_option_flag;

/* Texts are borrowed from the command line. */
typedef struct {
  const char *file;   /* NULL: the command takes none */
  const char *output; /* NULL: named after the file */
  const char *seed;   /* NULL: as the file says */
  const char **sets;  /* [set_count] */
  size_t set_count;
  int threads; /* 0: as many as OpenMP offers */
  bool quiet, help;
} ew_options;

/* A command, its help and what it accepts. */
typedef struct {
  const char *name;
  const char *meaning; /* one line */
  const char *help;    /* more, with line ends */
  unsigned options;    /* ew_option_flag */
  bool takes_file;
  ew_status (*act)(const ew_options *options, ew_error *error);
} ew_command;

extern const ew_command ew_command_run;
extern const ew_command ew_command_check;
extern const ew_command ew_command_parameters;
extern const ew_command ew_command_trees;
extern const ew_command ew_command_spectrum;

/* Reads the words after the command's name; EW_REFUSED with the word at fault. Release with ew_options_clear. */
EW_CHECKED ew_status ew_options_read(ew_options *options, const ew_command *command, int count, char **words,
                                     ew_error *error);
void ew_options_clear(ew_options *options);

void ew_command_print_help(const ew_command *command, FILE *out);

/* Of `count` names the one that is fewest edits away. */
const char *ew_nearest_name(const char *given, const char *const *names, size_t count);

/* ---------------------------------------------------------------------------------------------------------- request */

/* What is asked for: the parameters as resolved from file, --set and dedicated options, and where the result goes. */
typedef struct {
  ew_settings settings;
  ew_parameter_values values; /* its target is `settings` */
  char *parameter_text;       /* resolved, runs again */
  char *output;               /* NULL: none */
} ew_request;

/* Validates everything. `ending` makes the output's name from the file's (".h5"); NULL: only -o names an output. The
 * output is probed, not opened. Release with ew_request_close, also after a failure; it must not be moved. */
EW_CHECKED ew_status ew_request_open(ew_request *request, const ew_options *options, const char *ending,
                                     ew_error *error);
void ew_request_close(ew_request *request);

/* ------------------------------------------------------------------------------------------------------------- stop */

/* From now on the first SIGINT or SIGTERM sets the flag, a second one kills. */
void ew_stop_on_signals(void);
const volatile sig_atomic_t *ew_stop_flag(void);

/* What is told of a job that did not finish: the failure, or that it was interrupted, and what PATH.partial holds. */
ew_status ew_fail_unfinished(const ew_error *failure, const char *output, uint64_t kept, uint64_t total,
                             ew_error *error);

#endif
