/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * One value: what its row allows, checking it, storing it, and writing it back. */
#include "core/parameters_internal.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

/* 1e+08 to 1e8 */
static void shorten_exponent(char *text) {
  char *exponent = strchr(text, 'e');
  if (!exponent)
    return;
  char *to = exponent + 1 + (exponent[1] == '-'), *from = exponent + 2;
  from += strspn(from, "0");
  memmove(to, from, strlen(from) + 1);
}

void ew_number_text(double value, char text[EW_NUMBER_SIZE]) {
  for (int digits = 6; digits <= 17; digits++) {
    snprintf(text, EW_NUMBER_SIZE, "%.*g", digits, value);
    if (strtod(text, NULL) == value)
      break;
  }
  shorten_exponent(text);
}

/* ------------------------------------------------------------------------------------------------------- allowed */

/* Appends within `size`; what does not fit is cut off. */
static void add(char *text, size_t size, const char *more) {
  size_t used = strlen(text);
  snprintf(text + used, size - used, "%s", more);
}

static void add_number(char *text, size_t size, double value) {
  char number[EW_NUMBER_SIZE];
  ew_number_text(value, number);
  add(text, size, number);
}

static void add_range(const ew_parameter *row, char *text, size_t size) {
  bool low = isfinite(row->low), high = isfinite(row->high);
  if (low)
    add(text, size, high ? " from " : " of at least ");
  if (low)
    add_number(text, size, row->low);
  if (high)
    add(text, size, low ? " to " : " of at most ");
  if (high)
    add_number(text, size, row->high);
  if (strlen(row->unit) > 0 && strcmp(row->unit, "1") != 0) {
    add(text, size, low || high ? " " : " in ");
    add(text, size, row->unit);
  }
}

static void add_choices(const ew_parameter *row, char *text, size_t size) {
  for (const ew_choice *choice = row->choices; choice->name; choice++) {
    add(text, size, choice == row->choices ? "\"" : (choice[1].name ? ", \"" : " or \""));
    add(text, size, choice->name);
    add(text, size, "\"");
  }
}

void ew_allowed_text(const ew_parameter *row, char *text, size_t size) {
  static const char *const opening[] = {
      [EW_REAL] = "a number", [EW_INTEGER] = "a whole number", [EW_FLAG] = "true or false", [EW_CHOICE] = "",
      [EW_TEXT] = "",         [EW_INTERVAL] = "[low, high]"};
  snprintf(text, size, "%s", opening[row->type]);
  if (row->type == EW_CHOICE)
    add_choices(row, text, size);
  else if (row->type == EW_TEXT)
    snprintf(text, size, "text, at most %d bytes", EW_TEXT_SIZE - 1);
  else if (row->type != EW_FLAG)
    add_range(row, text, size);
}

/* --------------------------------------------------------------------------------------------------------- store */

static ew_status wrong_type(const config_setting_t *setting, const ew_complaint *about, ew_error *error) {
  static const char *const found[] = {[CONFIG_TYPE_NONE] = "nothing",
                                      [CONFIG_TYPE_GROUP] = "a group",
                                      [CONFIG_TYPE_INT] = "a whole number",
                                      [CONFIG_TYPE_INT64] = "a whole number",
                                      [CONFIG_TYPE_FLOAT] = "a number with a point or an exponent",
                                      [CONFIG_TYPE_STRING] = "text",
                                      [CONFIG_TYPE_BOOL] = "true or false",
                                      [CONFIG_TYPE_ARRAY] = "an array",
                                      [CONFIG_TYPE_LIST] = "a list"};
  return ew_complain(about, error, "wrong type, this is %s", found[config_setting_type(setting)]);
}

static bool is_whole(const config_setting_t *setting) {
  int type = config_setting_type(setting);
  return type == CONFIG_TYPE_INT || type == CONFIG_TYPE_INT64;
}

/* Not libconfig's own conversion, which gives 0 for an integer unless told otherwise. */
static double number_of(const config_setting_t *setting) {
  return is_whole(setting) ? (double)config_setting_get_int64(setting) : config_setting_get_float(setting);
}

static ew_status check_number(const ew_parameter *row, double value, const ew_complaint *about, ew_error *error) {
  if (!isfinite(value))
    return ew_complain(about, error, "not a finite number");
  if (!(value >= row->low && value <= row->high))
    return ew_complain(about, error, "out of range");
  return EW_OK;
}

static ew_status store_real(const ew_parameter *row, const config_setting_t *setting, double *field,
                            const ew_complaint *about, ew_error *error) {
  if (!config_setting_is_number(setting))
    return wrong_type(setting, about, error);
  double value = number_of(setting);
  ew_status status = check_number(row, value, about, error);
  if (status == EW_OK)
    *field = value;
  return status;
}

static ew_status store_integer(const ew_parameter *row, const config_setting_t *setting, int64_t *field,
                               const ew_complaint *about, ew_error *error) {
  if (config_setting_type(setting) == CONFIG_TYPE_FLOAT)
    return ew_complain(about, error, "wrong type, not an integer of up to 64 bits without point or exponent");
  if (!is_whole(setting))
    return wrong_type(setting, about, error);
  int64_t value = config_setting_get_int64(setting);
  ew_status status = check_number(row, (double)value, about, error);
  if (status == EW_OK)
    *field = value;
  return status;
}

static ew_status store_interval(const ew_parameter *row, const config_setting_t *setting, double *field,
                                const ew_complaint *about, ew_error *error) {
  if (!config_setting_is_array(setting) && !config_setting_is_list(setting))
    return wrong_type(setting, about, error);
  int length = config_setting_length(setting);
  if (length != 2)
    return ew_complain(about, error, "two numbers are needed, not %d", length);
  double value[2];
  for (unsigned i = 0; i < 2; i++) {
    ew_status status = store_real(row, config_setting_get_elem(setting, i), &value[i], about, error);
    if (status != EW_OK)
      return status;
  }
  if (value[0] > value[1])
    return ew_complain(about, error, "the first is above the second");
  memcpy(field, value, sizeof value);
  return EW_OK;
}

static ew_status store_flag(const config_setting_t *setting, bool *field, const ew_complaint *about, ew_error *error) {
  if (config_setting_type(setting) != CONFIG_TYPE_BOOL)
    return wrong_type(setting, about, error);
  *field = config_setting_get_bool(setting);
  return EW_OK;
}

ew_status ew_value_store_text(const ew_parameter *row, const char *text, void *field, const ew_complaint *about,
                              ew_error *error) {
  if (row->type == EW_TEXT) {
    size_t length = strlen(text);
    if (length >= EW_TEXT_SIZE)
      return ew_complain(about, error, "too long, %zu bytes", length);
    memcpy(field, text, length + 1);
    return EW_OK;
  }
  if (row->type != EW_CHOICE)
    return ew_complain(about, error, "wrong type, this is text");
  for (int i = 0; row->choices[i].name; i++)
    if (strcmp(row->choices[i].name, text) == 0) {
      *(int *)field = i;
      return EW_OK;
    }
  return ew_complain(about, error, "not one of the choices");
}

ew_status ew_value_store(const ew_parameter *row, const config_setting_t *setting, void *field,
                         const ew_complaint *about, ew_error *error) {
  switch (row->type) {
  case EW_REAL:
    return store_real(row, setting, field, about, error);
  case EW_INTEGER:
    return store_integer(row, setting, field, about, error);
  case EW_FLAG:
    return store_flag(setting, field, about, error);
  case EW_INTERVAL:
    return store_interval(row, setting, field, about, error);
  default:
    if (config_setting_type(setting) != CONFIG_TYPE_STRING)
      return wrong_type(setting, about, error);
    return ew_value_store_text(row, config_setting_get_string(setting), field, about, error);
  }
}

/* --------------------------------------------------------------------------------------------------------- write */

/* With a point or an exponent, so that libconfig reads it as a real number. */
static void write_real(double value, FILE *out) {
  char text[EW_NUMBER_SIZE];
  ew_number_text(value, text);
  fprintf(out, "%s%s", text, strpbrk(text, ".e") ? "" : ".0");
}

static void write_integer(int64_t value, FILE *out) {
  fprintf(out, "%lld%s", (long long)value, value < INT32_MIN || value > INT32_MAX ? "L" : "");
}

static void write_text(const char *text, FILE *out) {
  fputc('"', out);
  for (; *text; text++) {
    unsigned char c = (unsigned char)*text;
    if (c == '"' || c == '\\')
      fprintf(out, "\\%c", c);
    else if (c < 0x20 || c == 0x7f)
      fprintf(out, "\\x%02x", c);
    else
      fputc(c, out);
  }
  fputc('"', out);
}

void ew_value_write(const ew_parameter *row, const void *field, FILE *out) {
  const double *interval = field;
  switch (row->type) {
  case EW_REAL:
    write_real(*(const double *)field, out);
    break;
  case EW_INTEGER:
    write_integer(*(const int64_t *)field, out);
    break;
  case EW_FLAG:
    fputs(*(const bool *)field ? "true" : "false", out);
    break;
  case EW_CHOICE:
    write_text(row->choices[*(const int *)field].name, out);
    break;
  case EW_TEXT:
    write_text(field, out);
    break;
  case EW_INTERVAL:
    fputc('[', out);
    write_real(interval[0], out);
    fputs(", ", out);
    write_real(interval[1], out);
    fputc(']', out);
    break;
  }
}
