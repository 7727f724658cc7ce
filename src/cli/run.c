/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The main job: parameters to catalogue. */
#include "cli/cli.h"

/* What the rows of a run go to. */
typedef struct {
  ew_row_sink file;
  ew_summary *summary;
  uint64_t galaxies;
} audience;

static ew_status take(void *context, const ew_tree_row *tree, const ew_galaxy_row *rows, size_t count,
                      ew_error *error) {
  audience *to = context;
  ew_status status = to->file.take(to->file.context, tree, rows, count, error);
  if (status != EW_OK)
    return status;
  ew_summary_add(to->summary, rows, count);
  to->galaxies += count;
  return EW_OK;
}

static ew_status fill(ew_catalogue *catalogue, const ew_laboratory *laboratory, const ew_options *options, audience *to,
                      ew_error *error) {
  const ew_plan plan = {.laboratory = laboratory,
                        .models = &laboratory->settings.model,
                        .model_count = 1,
                        .tree_count = (uint64_t)laboratory->settings.roots.count,
                        .threads = options->threads,
                        .progress = !options->quiet,
                        .stop = ew_stop_flag()};
  const ew_row_sink sink = {take, to};
  uint64_t done = 0;
  ew_status status = ew_run(&plan, &sink, &done, error);
  return status == EW_OK ? ew_catalogue_finish(catalogue, error) : status;
}

static ew_status write_catalogue(const ew_request *request, const ew_laboratory *laboratory, const ew_options *options,
                                 audience *to, ew_error *error) {
  const ew_catalogue_header header = {request->parameter_text, (uint64_t)request->settings.random.seed};
  ew_catalogue *catalogue;
  ew_status status = ew_catalogue_create(&catalogue, request->output, &header, error);
  if (status != EW_OK)
    return status;
  ew_error failure = {0};
  to->file = ew_catalogue_sink(catalogue);
  status = fill(catalogue, laboratory, options, to, &failure);
  if (status != EW_OK)
    status = ew_fail_unfinished(&failure, request->output, ew_catalogue_kept(catalogue),
                                (uint64_t)request->settings.roots.count, error);
  ew_catalogue_close(catalogue);
  return status;
}

static ew_status run_and_tell(const ew_request *request, const ew_options *options, audience *to, ew_error *error) {
  double started = ew_clock();
  ew_laboratory *laboratory;
  ew_status status = ew_laboratory_new(&laboratory, &request->settings, error);
  if (status != EW_OK)
    return status;
  status = write_catalogue(request, laboratory, options, to, error);
  ew_laboratory_free(laboratory);
  if (status != EW_OK || options->quiet)
    return status;
  ew_summary_print(to->summary, stdout);
  printf("\nwrote %s (%llu galaxies of %lld trees, %.1f s)\n", request->output, (unsigned long long)to->galaxies,
         (long long)request->settings.roots.count, ew_clock() - started);
  return EW_OK;
}

static ew_status act(const ew_options *options, ew_error *error) {
  ew_request request;
  audience to = {.summary = ew_summary_new()};
  ew_stop_on_signals();
  ew_status status = ew_request_open(&request, options, ".h5", error);
  if (status == EW_OK)
    status = to.summary ? run_and_tell(&request, options, &to, error) : ew_fail_memory(error, "the summary");
  ew_request_close(&request);
  ew_summary_free(to.summary);
  return status;
}

const ew_command ew_command_run = {
    .name = "run",
    .meaning = "grows the trees of a parameter file, evolves their galaxies and writes the catalogue",
    .help = "Grows the merger trees that PARAMS asks for, evolves the galaxies of each, writes the catalogue\n"
            "(HDF5: /galaxies, /trees) and prints a summary. Without -o the catalogue of NAME.cfg is NAME.h5\n"
            "in the current folder. It grows as FILE.partial and gets its name when it is whole; an\n"
            "interrupted run leaves FILE.partial with the trees done so far.",
    .options = EW_OPTIONS_OF_A_JOB,
    .takes_file = true,
    .act = act,
};
