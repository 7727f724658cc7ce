/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Filling a struct from its table: defaults, files, and single assignments. */
#include "core/parameters_internal.h"

#include <ctype.h>
#include <errno.h>
#include <stdlib.h>
#include <string.h>

/* --------------------------------------------------------------------------------------------------------- parse */

/* Whole numbers get an L; those beyond 64 bits become reals. Each token grows by two characters at most. */
static char *widen(const char *text) {
  char *wide = malloc(3 * strlen(text) + 1);
  if (!wide)
    return NULL;
  char *to = wide;
  const char *from = text;
  ew_scan scan = ew_scan_start(text);
  for (ew_token token = ew_scan_next(&scan); token.kind != EW_TOKEN_END; token = ew_scan_next(&scan)) {
    const char *end = token.start + token.length;
    if (!ew_token_is_whole(&token) || end[-1] == 'L')
      continue;
    errno = 0;
    (void)strtoll(token.start, NULL, 10);
    const char *suffix = errno == ERANGE ? ".0" : "L";
    memcpy(to, from, (size_t)(end - from));
    to += end - from;
    memcpy(to, suffix, strlen(suffix));
    to += strlen(suffix);
    from = end;
  }
  strcpy(to, from);
  return wide;
}

ew_status ew_parse_text(config_t *config, const char *text, bool *parsed, ew_error *error) {
  char *wide = widen(text);
  if (!wide)
    return ew_fail_memory(error, "a parameter text");
  *parsed = config_read_string(config, wide) == CONFIG_TRUE;
  free(wide);
  return EW_OK;
}

static bool is_plain_value(const char *text) {
  ew_scan scan = ew_scan_start(text);
  for (ew_token token = ew_scan_next(&scan); token.kind != EW_TOKEN_END; token = ew_scan_next(&scan))
    if (ew_token_fault(&token) || token.kind == EW_TOKEN_INCLUDE)
      return false;
  return true;
}

/* Inside a list, so that nothing behind the value can go unnoticed: a second value makes a second element, and a
 * comment hides the closing bracket. A second setting would need a name, which is no plain value. */
ew_status ew_parse_value(config_t *config, const char *text, const config_setting_t **setting, ew_error *error) {
  static const char shape[] = "value = (%s);";
  *setting = NULL;
  if (!is_plain_value(text))
    return EW_OK;
  size_t size = strlen(text) + sizeof shape;
  char *whole = malloc(size);
  if (!whole)
    return ew_fail_memory(error, "a parameter");
  snprintf(whole, size, shape, text);
  bool parsed = false;
  ew_status status = ew_parse_text(config, whole, &parsed, error);
  free(whole);
  if (!parsed)
    return status;
  const config_setting_t *list = config_setting_get_elem(config_root_setting(config), 0);
  if (config_setting_length(list) == 1)
    *setting = config_setting_get_elem(list, 0);
  return status;
}

/* ------------------------------------------------------------------------------------------------------ defaults */

static ew_status set_default(ew_parameter_values *values, size_t index, ew_error *error) {
  const ew_parameter *row = ew_parameters_row(values->table, index);
  const ew_complaint about = {values->table, EW_FAILED, "default", row->name, row->standard};
  size_t first = index;
  if (strcspn(row->name, ".") == strlen(row->name) || !ew_parameters_find(values->table, row->name, &first) ||
      first != index)
    return ew_fail(error, EW_FAILED, "default: %s: not a name of the form group.key, or not the only one", row->name);
  config_t config;
  config_init(&config);
  const config_setting_t *setting;
  ew_status status = ew_parse_value(&config, row->standard, &setting, error);
  void *field = ew_parameters_field(values->table, values->target, index);
  if (status == EW_OK)
    status = setting ? ew_value_store(row, setting, field, &about, error)
                     : ew_complain(&about, error, "not a libconfig value");
  config_destroy(&config);
  snprintf(values->origin[index].text, sizeof values->origin[index].text, "default");
  return status;
}

ew_status ew_parameters_open(ew_parameter_values *values, const ew_parameter_table *table, void *target,
                             ew_error *error) {
  size_t count = ew_parameters_count(table);
  *values = (ew_parameter_values){table, target, calloc(count + 1, sizeof(ew_origin))};
  if (!values->origin)
    return ew_fail_memory(error, "the origins of parameters");
  for (size_t i = 0; i < count; i++) {
    ew_status status = set_default(values, i, error);
    if (status != EW_OK) {
      ew_parameters_close(values);
      return status;
    }
  }
  return EW_OK;
}

void ew_parameters_close(ew_parameter_values *values) {
  free(values->origin);
  *values = (ew_parameter_values){0};
}

/* --------------------------------------------------------------------------------------------------------- files */

static ew_status read_setting(ew_parameter_values *values, const ew_source *source, const config_setting_t *group,
                              const config_setting_t *setting, ew_error *error) {
  char name[256];
  bool inside = config_setting_type(group) == CONFIG_TYPE_GROUP && !config_setting_is_root(group);
  snprintf(name, sizeof name, "%s%s%s", inside ? config_setting_name(group) : "", inside ? "." : "",
           config_setting_name(setting));
  ew_origin where = ew_source_where(source, config_setting_source_line(setting));
  ew_excerpt value = ew_source_value(source, name);
  const ew_complaint about = {values->table, EW_REFUSED, where.text, name, value.text};
  size_t index;
  const ew_parameter *row = ew_parameters_find(values->table, name, &index);
  if (!row)
    return ew_complain(&about, error, inside ? "no parameter of that name" : "stands outside any group");
  void *field = ew_parameters_field(values->table, values->target, index);
  ew_status status = ew_value_store(row, setting, field, &about, error);
  if (status == EW_OK)
    values->origin[index] = where;
  return status;
}

static bool is_prefix(const ew_parameter_table *table, const char *name) {
  size_t length = strlen(name), count = ew_parameters_count(table);
  for (size_t i = 0; i < count; i++) {
    const char *known = ew_parameters_row(table, i)->name;
    if (strncmp(known, name, length) == 0 && known[length] == '.')
      return true;
  }
  return false;
}

static ew_status read_group(ew_parameter_values *values, const ew_source *source, const config_setting_t *group,
                            ew_error *error) {
  int length = config_setting_length(group);
  const char *name = config_setting_name(group);
  ew_origin where = ew_source_where(source, config_setting_source_line(group));
  if (length == 0 && !is_prefix(values->table, name))
    return ew_complain(&(ew_complaint){values->table, EW_REFUSED, where.text, name, NULL}, error,
                       "no group of that name");
  for (int i = 0; i < length; i++) {
    ew_status status = read_setting(values, source, group, config_setting_get_elem(group, (unsigned)i), error);
    if (status != EW_OK)
      return status;
  }
  return EW_OK;
}

static ew_status read_tree(ew_parameter_values *values, const ew_source *source, const config_setting_t *root,
                           ew_error *error) {
  ew_status status = EW_OK;
  for (int i = 0; i < config_setting_length(root) && status == EW_OK; i++) {
    const config_setting_t *member = config_setting_get_elem(root, (unsigned)i);
    status = config_setting_is_group(member) ? read_group(values, source, member, error)
                                             : read_setting(values, source, root, member, error);
  }
  return status;
}

static ew_status read_source(ew_parameter_values *values, const ew_source *source, ew_error *error) {
  ew_status status = ew_source_check(source, values->table, error);
  if (status != EW_OK)
    return status;
  config_t config;
  config_init(&config);
  bool parsed = false;
  status = ew_parse_text(&config, source->text, &parsed, error);
  if (status == EW_OK)
    status = parsed ? read_tree(values, source, config_root_setting(&config), error)
                    : ew_source_explain(source, values->table, &config, error);
  config_destroy(&config);
  return status;
}

ew_status ew_parameters_read(ew_parameter_values *values, const char *path, ew_error *error) {
  ew_source source;
  ew_status status = ew_source_load(&source, path, error);
  if (status == EW_OK)
    status = read_source(values, &source, error);
  ew_source_clear(&source);
  return status;
}

ew_status ew_parameters_read_text(ew_parameter_values *values, const char *text, const char *label, ew_error *error) {
  ew_source source;
  ew_status status = ew_source_take_text(&source, text, label, error);
  if (status == EW_OK)
    status = read_source(values, &source, error);
  ew_source_clear(&source);
  return status;
}

/* --------------------------------------------------------------------------------------------------- assignments */

/* A copy without the blanks at either end; NULL when memory is short. */
static char *trimmed(const char *start, size_t length) {
  while (length > 0 && isspace((unsigned char)*start)) {
    start++;
    length--;
  }
  while (length > 0 && isspace((unsigned char)start[length - 1]))
    length--;
  return strndup(start, length);
}

/* What libconfig did not take for a value is text, or a number that went wrong. */
static ew_status store_bare(const ew_parameter *row, const char *value, const config_t *config, void *field,
                            const ew_complaint *about, ew_error *error) {
  if (row->type == EW_TEXT || row->type == EW_CHOICE)
    return ew_value_store_text(row, value, field, about, error);
  const char *reason = config_error_text(config);
  if (reason && strncmp(reason, "mismatched", strlen("mismatched")) == 0)
    return ew_complain(about, error, EW_MIXED_ARRAY);
  ew_scan scan = ew_scan_start(value);
  ew_token token = ew_scan_next(&scan);
  bool is_number = token.kind == EW_TOKEN_NUMBER || ew_token_is_not_finite(&token);
  const char *fault = is_number ? ew_token_fault(&token) : NULL;
  return ew_complain(about, error, "%s", fault ? fault : "wrong type, this is text");
}

static ew_status assign(ew_parameter_values *values, const char *name, const char *value, const char *label,
                        ew_error *error) {
  const ew_complaint about = {values->table, EW_REFUSED, label, name, value};
  size_t index;
  const ew_parameter *row = ew_parameters_find(values->table, name, &index);
  if (!row)
    return ew_complain(&about, error, "no parameter of that name");
  if (*value == '\0')
    return ew_complain(&about, error, "no value%s", row->type == EW_TEXT ? " (\"\" is empty text)" : "");
  config_t config;
  config_init(&config);
  const config_setting_t *setting;
  void *field = ew_parameters_field(values->table, values->target, index);
  ew_status status = ew_parse_value(&config, value, &setting, error);
  if (status == EW_OK)
    status = setting ? ew_value_store(row, setting, field, &about, error)
                     : store_bare(row, value, &config, field, &about, error);
  config_destroy(&config);
  if (status == EW_OK)
    snprintf(values->origin[index].text, sizeof values->origin[index].text, "%s", label);
  return status;
}

ew_status ew_parameters_assign(ew_parameter_values *values, const char *assignment, const char *label,
                               ew_error *error) {
  const char *equals = strchr(assignment, '=');
  if (!equals)
    return ew_fail(error, EW_REFUSED, "%s: %s: no = in it; allowed: group.key=value", label,
                   ew_excerpt_of(assignment, strlen(assignment)).text);
  char *name = trimmed(assignment, (size_t)(equals - assignment));
  char *value = trimmed(equals + 1, strlen(equals + 1));
  ew_status status;
  if (!name || !value)
    status = ew_fail_memory(error, "a parameter");
  else if (*name == '\0')
    status = ew_fail(error, EW_REFUSED, "%s: %s: no name before the =; allowed: group.key=value", label,
                     ew_excerpt_of(assignment, strlen(assignment)).text);
  else
    status = assign(values, name, value, label, error);
  free(name);
  free(value);
  return status;
}
