/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The life of an output file: may it be written, its working name, and the rename when it is whole. */
#include "core/output.h"

#include <errno.h>
#include <fcntl.h>
#include <stdlib.h>
#include <string.h>
#include <sys/file.h>
#include <sys/stat.h>
#include <unistd.h>

#define PARTIAL_SUFFIX ".partial"

enum { LONGEST_SHOWN = 400 };

/* Of a path that would push the reason out of the message only the end is shown. */
static const char *shown(const char *path) {
  size_t length = strlen(path);
  return length > LONGEST_SHOWN ? path + length - LONGEST_SHOWN : path;
}

ew_status ew_output_fail(const char *path, const char *reason, ew_error *error) {
  const char *part = shown(path);
  return ew_fail(error, EW_FAILED, "cannot write %s%s: %s", part == path ? "" : "...", part, reason);
}

/* ------------------------------------------------------------------------------------------------------------ probe */

/* Why what stands at the path may not be replaced; NULL when it may. A link or device would lose its nature by the
 * rename, and who takes away write permission wants to keep the file. */
static const char *fault_of_target(const char *path) {
  struct stat found;
  if (lstat(path, &found) != 0)
    return errno == ENOENT ? NULL : strerror(errno);
  if (S_ISDIR(found.st_mode))
    return "it is a folder";
  if (S_ISLNK(found.st_mode))
    return "it is a symbolic link; give the name that it leads to";
  if (!S_ISREG(found.st_mode))
    return "it is not a regular file";
  return access(path, W_OK) == 0 ? NULL : strerror(errno);
}

/* Why PATH.partial cannot be written; NULL when it can. HDF5 locks the files that it has open by flock. */
static const char *fault_of_partial(const char *partial) {
  struct stat found;
  bool stood = lstat(partial, &found) == 0;
  if (stood && !S_ISREG(found.st_mode))
    return "it is not a regular file";
  int descriptor = open(partial, O_WRONLY | O_CREAT | O_CLOEXEC | O_NOFOLLOW | (stood ? 0 : O_EXCL), 0666);
  if (descriptor < 0)
    return strerror(errno);
  bool held = flock(descriptor, LOCK_EX | LOCK_NB) != 0 && errno == EWOULDBLOCK;
  close(descriptor);
  if (!stood)
    unlink(partial);
  return held ? "another program is writing it" : NULL;
}

static ew_status probe(const ew_output *output, ew_error *error) {
  size_t length = strlen(output->path);
  if (length == 0 || output->path[length - 1] == '/')
    return ew_output_fail(output->path, "it is no file name", error);
  const char *fault = fault_of_target(output->path);
  if (fault)
    return ew_output_fail(output->path, fault, error);
  fault = fault_of_partial(output->partial);
  return fault ? ew_output_fail(output->partial, fault, error) : EW_OK;
}

/* ------------------------------------------------------------------------------------------------------------ names */

static ew_status make_names(ew_output *output, const char *path, ew_error *error) {
  size_t size = strlen(path) + sizeof PARTIAL_SUFFIX;
  *output = (ew_output){strdup(path), malloc(size)};
  if (!output->path || !output->partial) {
    ew_output_clear(output);
    return ew_fail_memory(error, "a file name");
  }
  snprintf(output->partial, size, "%s" PARTIAL_SUFFIX, path);
  return EW_OK;
}

void ew_output_clear(ew_output *output) {
  free(output->path);
  free(output->partial);
  *output = (ew_output){0};
}

ew_status ew_output_probe(const char *path, ew_error *error) {
  ew_output output;
  ew_status status = make_names(&output, path, error);
  if (status == EW_OK)
    status = probe(&output, error);
  ew_output_clear(&output);
  return status;
}

ew_status ew_output_open(ew_output *output, const char *path, ew_error *error) {
  ew_status status = make_names(output, path, error);
  if (status == EW_OK)
    status = probe(output, error);
  if (status == EW_OK && unlink(output->partial) != 0 && errno != ENOENT)
    status = ew_output_fail(output->partial, strerror(errno), error);
  if (status != EW_OK)
    ew_output_clear(output);
  return status;
}

/* ---------------------------------------------------------------------------------------------------------- publish */

/* 0, or the errno for which the data may not have reached the disk; a file system that cannot sync is no failure. */
static int sync_path(const char *path, int flags) {
  int descriptor = open(path, flags | O_CLOEXEC);
  if (descriptor < 0)
    return errno;
  int fault = fsync(descriptor) == 0 || errno == EINVAL || errno == EROFS ? 0 : errno;
  if (close(descriptor) != 0 && fault == 0)
    fault = errno;
  return fault;
}

/* The rename itself stands even if the folder cannot be synced, so that is not told. */
static void sync_folder_of(const char *path) {
  char *folder = strdup(path);
  if (!folder)
    return;
  char *slash = strrchr(folder, '/');
  if (slash)
    slash[slash == folder] = '\0';
  (void)sync_path(slash ? folder : ".", O_RDONLY | O_DIRECTORY);
  free(folder);
}

ew_status ew_output_publish(const ew_output *output, ew_error *error) {
  int fault = sync_path(output->partial, O_WRONLY);
  if (fault != 0)
    return ew_output_fail(output->partial, strerror(fault), error);
  if (rename(output->partial, output->path) != 0)
    return ew_fail(error, EW_FAILED, "cannot rename %s to %s: %s", shown(output->partial), shown(output->path),
                   strerror(errno));
  sync_folder_of(output->path);
  return EW_OK;
}
