/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * A temporary folder for all tests of a program: group set-up and tear-down. With FOLDER_FILE and FOLDER_TEXT defined,
 * that file lies in it from the start. */
#ifndef EW_TESTS_FOLDER_H
#define EW_TESTS_FOLDER_H

#include "look.h"

static look_path folder;

static int make_folder(void **state) {
  (void)state;
  folder = look_make_folder();
#ifdef FOLDER_FILE
  look_write_text(look_join(folder, FOLDER_FILE), FOLDER_TEXT);
#endif
  return 0;
}

static int remove_folder(void **state) {
  (void)state;
  look_remove_folder(folder);
  return 0;
}

#endif
