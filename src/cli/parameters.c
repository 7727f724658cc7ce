/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The table of all parameters, for people. */
#include "cli/cli.h"

static ew_status act(const ew_options *options, ew_error *error) {
  (void)options;
  (void)error;
  ew_parameters_print(ew_settings_table(), stdout);
  return EW_OK;
}

const ew_command ew_command_parameters = {
    .name = "parameters",
    .meaning = "prints every parameter: name, unit, default, range, meaning, source",
    .help = "Prints every parameter: name, unit, default, range or choices, meaning, source.",
    .options = EW_OPTION_HELP,
    .takes_file = false,
    .act = act,
};
