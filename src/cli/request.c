/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * From a parameter file and options to what is asked for. Nothing is written here, so a request that is refused harms
 * nothing. */
#include "cli/cli.h"

#include "core/output.h"

#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>

/* ------------------------------------------------------------------------------------------------------- parameters */

static ew_status assign_seed(ew_request *request, const char *seed, ew_error *error) {
  static const char key[] = "random.seed=";
  size_t size = strlen(seed) + sizeof key;
  char *assignment = malloc(size);
  if (!assignment)
    return ew_fail_memory(error, "the seed");
  snprintf(assignment, size, "%s%s", key, seed);
  ew_status status = ew_parameters_assign(&request->values, assignment, "--seed", error);
  free(assignment);
  return status;
}

/* The file, then --set in the order given, then the options that have a name of their own. */
static ew_status read_parameters(ew_request *request, const ew_options *options, ew_error *error) {
  ew_status status = ew_parameters_open(&request->values, ew_settings_table(), &request->settings, error);
  if (status == EW_OK)
    status = ew_parameters_read(&request->values, options->file, error);
  for (size_t i = 0; i < options->set_count && status == EW_OK; i++)
    status = ew_parameters_assign(&request->values, options->sets[i], "--set", error);
  if (status == EW_OK && options->seed)
    status = assign_seed(request, options->seed, error);
  if (status == EW_OK)
    status = ew_settings_check(&request->values, error);
  if (status != EW_OK)
    return status;
  request->parameter_text = ew_parameters_echo(&request->values);
  return request->parameter_text ? EW_OK : ew_fail_memory(error, "the parameters");
}

/* ----------------------------------------------------------------------------------------------------------- output */

/* NAME.h5 for FOLDER/NAME.cfg; NULL when memory is short. */
static char *name_after(const char *file, const char *ending) {
  const char *slash = strrchr(file, '/'), *base = slash ? slash + 1 : file;
  const char *dot = strrchr(base, '.');
  size_t length = dot && dot != base ? (size_t)(dot - base) : strlen(base);
  size_t size = length + strlen(ending) + 1;
  char *name = malloc(size);
  if (name)
    snprintf(name, size, "%.*s%s", (int)length, base, ending);
  return name;
}

static bool is_same_file(const char *a, const char *b) {
  struct stat found_a, found_b;
  return stat(a, &found_a) == 0 && stat(b, &found_b) == 0 && found_a.st_dev == found_b.st_dev &&
         found_a.st_ino == found_b.st_ino;
}

/* The output replaces PATH, and PATH.partial too. */
static ew_status spare_the_file(const char *file, const char *output, ew_error *error) {
  static const char ending[] = ".partial";
  size_t size = strlen(output) + sizeof ending;
  char *partial = malloc(size);
  if (!partial)
    return ew_fail_memory(error, "a file name");
  snprintf(partial, size, "%s%s", output, ending);
  bool same = is_same_file(file, output) || is_same_file(file, partial);
  free(partial);
  if (same)
    return ew_fail(error, EW_REFUSED, "the output %s would replace the parameter file %s", output, file);
  return EW_OK;
}

static ew_status name_output(ew_request *request, const ew_options *options, const char *ending, ew_error *error) {
  if (!options->output && !ending)
    return EW_OK;
  if (options->output && options->output[0] == '\0')
    return ew_fail(error, EW_REFUSED, "-o: the name of the output is empty");
  request->output = options->output ? strdup(options->output) : name_after(options->file, ending);
  if (!request->output)
    return ew_fail_memory(error, "a file name");
  ew_status status = spare_the_file(options->file, request->output, error);
  return status == EW_OK ? ew_output_probe(request->output, error) : status;
}

/* ---------------------------------------------------------------------------------------------------------- request */

ew_status ew_request_open(ew_request *request, const ew_options *options, const char *ending, ew_error *error) {
  *request = (ew_request){0};
  ew_status status = read_parameters(request, options, error);
  return status == EW_OK ? name_output(request, options, ending, error) : status;
}

void ew_request_close(ew_request *request) {
  ew_parameters_close(&request->values);
  free(request->parameter_text);
  free(request->output);
  *request = (ew_request){0};
}
