/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The files of core/hdf.h: HDF5 calls with their failures made readable, columns, and the commit that is all or
 * nothing. */
#include "core/hdf.h"

#include "core/output.h"

#include <errno.h>
#include <fcntl.h>
#include <hdf5.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <time.h>
#include <unistd.h>

#define COMMIT_INTERVAL 2.0 /* s */

enum {
  COMMIT_BYTES = 1 << 18, /* that wait before they are committed */
  VALUE_SIZE = 8          /* of every type */
};

struct ew_hdf_column {
  ew_hdf_file *file;
  hid_t dataset;
  hid_t memory_type;
  int rank;
  size_t width, chunk;
  uint64_t rows;  /* committed */
  size_t waiting; /* rows in `values` */
  size_t sealed;  /* of these */
  size_t room;    /* rows */
  unsigned char *values;
};

struct ew_hdf_file {
  ew_output output;
  hid_t handle;
  ew_hdf_column **columns;
  size_t column_count;
  uint64_t text_bytes; /* in attributes */
  double committed_at; /* ew_clock */
  bool begun, spoilt, finished;
  char fault[256]; /* of the HDF5 call that failed */
};

/* --------------------------------------------------------------------------------------------------------- failures */

/* HDF5 is kept from printing while one of our calls runs; its own setting is put back afterwards. */
typedef struct {
  H5E_auto2_t report;
  void *context;
} error_report;

static error_report hush(void) {
  error_report before = {NULL, NULL};
  H5Eget_auto2(H5E_DEFAULT, &before.report, &before.context);
  H5Eset_auto2(H5E_DEFAULT, NULL, NULL);
  return before;
}

static void unhush(error_report before) {
  H5Eset_auto2(H5E_DEFAULT, before.report, before.context);
}

/* The innermost record with a number of errno tells what the system said; else the innermost record is kept. */
static herr_t read_fault(unsigned depth, const H5E_error2_t *record, void *context) {
  ew_hdf_file *file = context;
  const char *number = strstr(record->desc, "errno = ");
  int code = number ? (int)strtol(number + strlen("errno = "), NULL, 10) : 0;
  if (code != 0)
    snprintf(file->fault, sizeof file->fault, "%s", strerror(code));
  else if (depth == 0)
    snprintf(file->fault, sizeof file->fault, "%s (HDF5)", record->desc);
  return code != 0;
}

/* For what HDF5 calls return: identifiers, sizes and statuses are negative when they failed. */
static bool good(ew_hdf_file *file, int64_t returned) {
  if (returned < 0 && file->fault[0] == '\0')
    H5Ewalk2(H5E_DEFAULT, H5E_WALK_UPWARD, read_fault, file);
  return returned >= 0;
}

static ew_status fail(ew_hdf_file *file, ew_error *error) {
  const char *reason = file->fault[0] ? file->fault : "HDF5 gave no reason";
  return ew_output_fail(file->output.partial, reason, error);
}

/* ------------------------------------------------------------------------------------------------------------- room */

static int descriptor_of(ew_hdf_file *file) {
  void *descriptor = NULL;
  return good(file, H5Fget_vfd_handle(file->handle, H5P_DEFAULT, &descriptor)) ? *(int *)descriptor : -1;
}

/* Cuts the file to what HDF5 uses of it; room that stays at its end does no harm. */
static void give_back_room(ew_hdf_file *file) {
  haddr_t end;
  int descriptor = descriptor_of(file);
  if (descriptor >= 0 && good(file, H5Fget_eoa(file->handle, &end)))
    (void)!ftruncate(descriptor, (off_t)end);
}

/* Everything that HDF5 holds is in the file afterwards. */
static bool flush(ew_hdf_file *file) {
  bool done = good(file, H5Fflush(file->handle, H5F_SCOPE_GLOBAL));
  give_back_room(file);
  return done;
}

static int allocate(int descriptor, off_t from, off_t to) {
  int fault;
  do
    fault = posix_fallocate(descriptor, from, to - from);
  while (fault == EINTR);
  bool unable = fault == EINVAL || fault == EOPNOTSUPP || fault == ENOSYS; /* the file system, not the disk */
  return unable ? 0 : fault;
}

/* Takes room for that many bytes beyond what HDF5 uses, so that the flush to come cannot meet a full disk. */
static bool take_room(ew_hdf_file *file, uint64_t bytes) {
  haddr_t end;
  struct stat now;
  int descriptor = descriptor_of(file);
  if (descriptor < 0 || !good(file, H5Fget_eoa(file->handle, &end)))
    return false;
  int fault = fstat(descriptor, &now) == 0 ? allocate(descriptor, now.st_size, (off_t)(end + bytes)) : errno;
  if (fault == 0)
    return true;
  snprintf(file->fault, sizeof file->fault, "%s", strerror(fault));
  (void)!ftruncate(descriptor, now.st_size);
  return false;
}

/* ------------------------------------------------------------------------------------------------------- attributes */

typedef struct {
  const char *name;
  hid_t file_type, memory_type;
  const void *value;
} attribute;

/* Creates it, or overwrites one of the same type. */
static bool put(ew_hdf_file *file, hid_t object, const attribute *wanted) {
  htri_t exists = H5Aexists(object, wanted->name);
  hid_t space = exists == 0 ? H5Screate(H5S_SCALAR) : H5I_INVALID_HID;
  hid_t made = exists > 0 ? H5Aopen(object, wanted->name, H5P_DEFAULT)
                          : H5Acreate2(object, wanted->name, wanted->file_type, space, H5P_DEFAULT, H5P_DEFAULT);
  bool done = good(file, made) && good(file, H5Awrite(made, wanted->memory_type, wanted->value));
  if (made >= 0)
    done = good(file, H5Aclose(made)) && done;
  if (space >= 0)
    H5Sclose(space);
  return done;
}

static bool put_text(ew_hdf_file *file, hid_t object, const char *name, const char *text) {
  size_t size = strlen(text) + 1;
  hid_t type = H5Tcopy(H5T_C_S1);
  bool done = good(file, type) && good(file, H5Tset_size(type, size)) && good(file, H5Tset_cset(type, H5T_CSET_UTF8)) &&
              put(file, object, &(attribute){name, type, type, text});
  if (type >= 0)
    H5Tclose(type);
  file->text_bytes += size;
  return done;
}

static ew_status put_on_file(ew_hdf_file *file, const attribute *wanted, ew_error *error) {
  error_report before = hush();
  bool done = put(file, file->handle, wanted);
  unhush(before);
  return done ? EW_OK : fail(file, error);
}

ew_status ew_hdf_put_text(ew_hdf_file *file, const char *name, const char *text, ew_error *error) {
  error_report before = hush();
  bool done = put_text(file, file->handle, name, text);
  unhush(before);
  return done ? EW_OK : fail(file, error);
}

ew_status ew_hdf_put_real(ew_hdf_file *file, const char *name, double value, ew_error *error) {
  return put_on_file(file, &(attribute){name, H5T_IEEE_F64LE, H5T_NATIVE_DOUBLE, &value}, error);
}

ew_status ew_hdf_put_integer(ew_hdf_file *file, const char *name, int64_t value, ew_error *error) {
  return put_on_file(file, &(attribute){name, H5T_STD_I64LE, H5T_NATIVE_INT64, &value}, error);
}

ew_status ew_hdf_put_key(ew_hdf_file *file, const char *name, uint64_t value, ew_error *error) {
  return put_on_file(file, &(attribute){name, H5T_STD_U64LE, H5T_NATIVE_UINT64, &value}, error);
}

static bool put_written(ew_hdf_file *file) {
  char text[sizeof "2000-01-01T00:00:00Z"] = "";
  time_t now = time(NULL);
  struct tm utc;
  if (gmtime_r(&now, &utc))
    strftime(text, sizeof text, "%Y-%m-%dT%H:%M:%SZ", &utc);
  return put_text(file, file->handle, "written", text);
}

static bool put_complete(ew_hdf_file *file, int64_t complete) {
  return put(file, file->handle, &(attribute){"complete", H5T_STD_I64LE, H5T_NATIVE_INT64, &complete});
}

/* ----------------------------------------------------------------------------------------------------------- create */

void ew_hdf_start(void) {
  H5dont_atexit();
}

/* Closing the file closes what is open in it, whatever else failed. */
static bool open_partial(ew_hdf_file *file) {
  hid_t access = H5Pcreate(H5P_FILE_ACCESS);
  bool ready = good(file, access) && good(file, H5Pset_fclose_degree(access, H5F_CLOSE_STRONG)) &&
               good(file, H5Pset_fapl_sec2(access));
  file->handle = ready ? H5Fcreate(file->output.partial, H5F_ACC_EXCL, H5P_DEFAULT, access) : H5I_INVALID_HID;
  ready = ready && good(file, file->handle);
  if (access >= 0)
    H5Pclose(access);
  return ready;
}

static ew_status open_file(ew_hdf_file *file, ew_error *error) {
  error_report before = hush();
  bool done = open_partial(file) && put_text(file, file->handle, "version", ew_version()) && put_complete(file, 0) &&
              put_written(file);
  unhush(before);
  return done ? EW_OK : fail(file, error);
}

ew_status ew_hdf_create(ew_hdf_file **file, const char *path, ew_error *error) {
  *file = NULL;
  ew_hdf_file *made = calloc(1, sizeof *made);
  if (!made)
    return ew_fail_memory(error, "a file");
  made->handle = H5I_INVALID_HID;
  ew_status status = ew_output_open(&made->output, path, error);
  if (status == EW_OK)
    status = open_file(made, error);
  if (status != EW_OK) {
    ew_hdf_close(made);
    return status;
  }
  *file = made;
  return EW_OK;
}

/* ---------------------------------------------------------------------------------------------------------- columns */

static hid_t file_type_of(ew_hdf_type type) {
  return type == EW_HDF_REAL ? H5T_IEEE_F64LE : type == EW_HDF_INTEGER ? H5T_STD_I64LE : H5T_STD_U64LE;
}

static hid_t memory_type_of(ew_hdf_type type) {
  return type == EW_HDF_REAL ? H5T_NATIVE_DOUBLE : type == EW_HDF_INTEGER ? H5T_NATIVE_INT64 : H5T_NATIVE_UINT64;
}

/* Time stamps of datasets are off, so that equal runs make equal files but for `written`. Chunks are not compressed:
 * one that is would be written to another place whenever it grows, over what the last commit left free, and a kill in
 * the middle of a commit would take rows with it that had been safe. */
static bool make_dataset(ew_hdf_column *column, const ew_hdf_column_header *header) {
  ew_hdf_file *file = column->file;
  hsize_t none[2] = {0, header->width}, most[2] = {H5S_UNLIMITED, header->width};
  hsize_t chunk[2] = {header->chunk, header->width};
  hid_t space = H5Screate_simple(column->rank, none, most);
  hid_t links = H5Pcreate(H5P_LINK_CREATE), layout = H5Pcreate(H5P_DATASET_CREATE);
  bool ready = good(file, space) && good(file, links) && good(file, layout) &&
               good(file, H5Pset_create_intermediate_group(links, 1)) &&
               good(file, H5Pset_obj_track_times(layout, false)) &&
               good(file, H5Pset_chunk(layout, column->rank, chunk));
  if (ready)
    column->dataset =
        H5Dcreate2(file->handle, header->name, file_type_of(header->type), space, links, layout, H5P_DEFAULT);
  ready = ready && good(file, column->dataset);
  if (space >= 0)
    H5Sclose(space);
  if (links >= 0)
    H5Pclose(links);
  if (layout >= 0)
    H5Pclose(layout);
  return ready;
}

static ew_hdf_column *list_column(ew_hdf_file *file, const ew_hdf_column_header *header) {
  ew_hdf_column **longer = realloc(file->columns, (file->column_count + 1) * sizeof(ew_hdf_column *));
  if (!longer)
    return NULL;
  file->columns = longer;
  ew_hdf_column *column = calloc(1, sizeof *column);
  if (!column)
    return NULL;
  *column = (ew_hdf_column){.file = file,
                            .dataset = H5I_INVALID_HID,
                            .memory_type = memory_type_of(header->type),
                            .rank = header->width > 1 ? 2 : 1,
                            .width = header->width,
                            .chunk = header->chunk};
  file->columns[file->column_count++] = column;
  return column;
}

ew_status ew_hdf_add_column(ew_hdf_column **column, ew_hdf_file *file, const ew_hdf_column_header *header,
                            ew_error *error) {
  error_report before = hush();
  *column = list_column(file, header);
  bool done = *column && make_dataset(*column, header) && put_text(file, (*column)->dataset, "unit", header->unit) &&
              put_text(file, (*column)->dataset, "meaning", header->meaning);
  unhush(before);
  if (!*column)
    return ew_fail_memory(error, "a column");
  return done ? EW_OK : fail(file, error);
}

static ew_status make_room_in_memory(ew_hdf_column *column, size_t rows, ew_error *error) {
  if (rows <= column->room)
    return EW_OK;
  size_t room = rows > 2 * column->room ? rows : 2 * column->room;
  unsigned char *larger = realloc(column->values, room * column->width * VALUE_SIZE);
  if (!larger)
    return ew_fail_memory(error, "rows of a file");
  column->values = larger;
  column->room = room;
  return EW_OK;
}

ew_status ew_hdf_push(ew_hdf_column *column, const void *values, size_t rows, ew_error *error) {
  ew_status status = make_room_in_memory(column, column->waiting + rows, error);
  if (status != EW_OK || rows == 0)
    return status;
  size_t row_size = column->width * VALUE_SIZE;
  memcpy(column->values + column->waiting * row_size, values, rows * row_size);
  column->waiting += rows;
  return EW_OK;
}

/* ----------------------------------------------------------------------------------------------------------- commit */

/* No less than what the sealed rows can take: whole chunks, and HDF5's B-tree nodes of 2 kB for up to 64 of them. */
static uint64_t room_for(const ew_hdf_column *column) {
  enum { TREE_NODE = 4096, PER_CHUNK = 256 };
  uint64_t chunks = (column->rows % column->chunk + column->sealed) / column->chunk + 1;
  return chunks * (column->chunk * column->width * VALUE_SIZE + PER_CHUNK) + TREE_NODE;
}

static bool append_sealed(ew_hdf_column *column) {
  ew_hdf_file *file = column->file;
  hsize_t start[2] = {column->rows, 0}, count[2] = {column->sealed, column->width};
  hsize_t extent[2] = {column->rows + column->sealed, column->width};
  if (!good(file, H5Dset_extent(column->dataset, extent)))
    return false;
  hid_t target = H5Dget_space(column->dataset), source = H5Screate_simple(column->rank, count, NULL);
  bool done = good(file, target) && good(file, source) &&
              good(file, H5Sselect_hyperslab(target, H5S_SELECT_SET, start, NULL, count, NULL)) &&
              good(file, H5Dwrite(column->dataset, column->memory_type, source, target, H5P_DEFAULT, column->values));
  if (target >= 0)
    H5Sclose(target);
  if (source >= 0)
    H5Sclose(source);
  return done;
}

static void drop_sealed(ew_hdf_column *column) {
  if (column->sealed == 0)
    return;
  size_t row_size = column->width * VALUE_SIZE;
  memmove(column->values, column->values + column->sealed * row_size, (column->waiting - column->sealed) * row_size);
  column->rows += column->sealed;
  column->waiting -= column->sealed;
  column->sealed = 0;
}

/* Back to the last commit as well as HDF5 can: reached only if it fails although the room was there. */
static void roll_back(ew_hdf_file *file) {
  for (size_t i = 0; i < file->column_count; i++) {
    hsize_t extent[2] = {file->columns[i]->rows, file->columns[i]->width};
    H5Dset_extent(file->columns[i]->dataset, extent);
  }
  (void)flush(file);
}

static bool write_sealed(ew_hdf_file *file) {
  for (size_t i = 0; i < file->column_count; i++)
    if (file->columns[i]->sealed > 0 && !append_sealed(file->columns[i]))
      return false;
  return flush(file);
}

static bool commit(ew_hdf_file *file) {
  uint64_t wanted = 0;
  for (size_t i = 0; i < file->column_count; i++)
    wanted += file->columns[i]->sealed > 0 ? room_for(file->columns[i]) : 0;
  file->committed_at = ew_clock();
  if (wanted == 0)
    return true;
  if (!take_room(file, wanted))
    return false;
  if (!write_sealed(file)) {
    roll_back(file);
    return false;
  }
  for (size_t i = 0; i < file->column_count; i++)
    drop_sealed(file->columns[i]);
  return true;
}

static bool commit_unless_spoilt(ew_hdf_file *file) {
  error_report before = hush();
  file->spoilt = file->spoilt || !commit(file);
  unhush(before);
  return !file->spoilt;
}

ew_status ew_hdf_commit(ew_hdf_file *file, ew_error *error) {
  return commit_unless_spoilt(file) ? EW_OK : fail(file, error);
}

uint64_t ew_hdf_kept_rows(ew_hdf_column *column) {
  if (!column->file->finished)
    (void)commit_unless_spoilt(column->file);
  return column->rows;
}

ew_status ew_hdf_seal(ew_hdf_file *file, ew_error *error) {
  size_t bytes = 0;
  for (size_t i = 0; i < file->column_count; i++) {
    ew_hdf_column *column = file->columns[i];
    column->sealed = column->waiting;
    bytes += column->sealed * column->width * VALUE_SIZE;
  }
  bool due = bytes >= COMMIT_BYTES || ew_clock() - file->committed_at >= COMMIT_INTERVAL;
  return due ? ew_hdf_commit(file, error) : EW_OK;
}

ew_status ew_hdf_begin(ew_hdf_file *file, ew_error *error) {
  enum { PER_COLUMN = 1024, PER_FILE = 1 << 14 }; /* object headers, groups */
  uint64_t wanted = PER_FILE + file->text_bytes + PER_COLUMN * (uint64_t)file->column_count;
  error_report before = hush();
  file->begun = take_room(file, wanted) && flush(file);
  unhush(before);
  file->committed_at = ew_clock();
  return file->begun ? EW_OK : fail(file, error);
}

/* ------------------------------------------------------------------------------------------------------------ close */

static bool close_handle(ew_hdf_file *file) {
  hid_t handle = file->handle;
  file->handle = H5I_INVALID_HID;
  return handle < 0 || good(file, H5Fclose(handle));
}

static bool seal_file(ew_hdf_file *file) {
  enum { ATTRIBUTE_ROOM = 4096 };
  return take_room(file, ATTRIBUTE_ROOM) && put_written(file) && put_complete(file, 1) && flush(file) &&
         close_handle(file);
}

ew_status ew_hdf_finish(ew_hdf_file *file, ew_error *error) {
  ew_status status = ew_hdf_commit(file, error);
  if (status != EW_OK)
    return status;
  error_report before = hush();
  bool done = seal_file(file);
  unhush(before);
  status = done ? ew_output_publish(&file->output, error) : fail(file, error);
  file->finished = status == EW_OK;
  file->spoilt = !file->finished;
  return status;
}

static void close_unfinished(ew_hdf_file *file) {
  if (file->begun)
    (void)commit_unless_spoilt(file);
  error_report before = hush();
  (void)close_handle(file);
  unhush(before);
  if (!file->begun && file->output.partial)
    unlink(file->output.partial);
}

void ew_hdf_close(ew_hdf_file *file) {
  if (!file)
    return;
  if (!file->finished)
    close_unfinished(file);
  for (size_t i = 0; i < file->column_count; i++) {
    free(file->columns[i]->values);
    free(file->columns[i]);
  }
  free(file->columns);
  ew_output_clear(&file->output);
  free(file);
}
