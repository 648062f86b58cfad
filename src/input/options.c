/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "input/options.h"

#include <errno.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

const mho_option *mho_option_find(const mho_option *table, size_t count, const char *name)
{
  for (size_t i = 0; i < count; i++)
    if (!strcmp(table[i].name, name)) return &table[i];
  return NULL;
}

static mho_status read_value(const mho_option *o, const char *text, double *value, char *reason,
                             size_t size)
{
  mho_status status = mho_quantity_read(text, o->dimension, value, reason, size);
  if (status != MHO_OK || (*value >= o->low && *value <= o->high)) return status;
  const char *unit = mho_dimension_base_unit(o->dimension);
  snprintf(reason, size, "'%.40s' is out of range; allowed are %g %s to %g %s", text, o->low, unit,
           o->high, unit);
  return MHO_ERR_RANGE;
}

static mho_status read_count(const mho_option *o, const char *text, mho_option_count *count,
                             char *reason, size_t size)
{
  char *end;
  errno = 0;
  count->value = strtol(text, &end, 10);
  count->given = true;
  if (!errno && !*end && end != text && count->value >= (long)o->low && count->value <= (long)o->high)
    return MHO_OK;
  snprintf(reason, size, "'%.40s' is not allowed; a whole number from %ld to %ld is", text,
           (long)o->low, (long)o->high);
  return MHO_ERR_RANGE;
}

static mho_status read_range(const mho_option *o, const char *text, mho_option_range *range,
                             char *reason, size_t size)
{
  char first[64];
  const char *comma = strchr(text, ',');
  if (!comma || strchr(comma + 1, ',') || (size_t)(comma - text) >= sizeof first) {
    snprintf(reason, size, "'%.60s' is not a range; write '%s'", text, o->example);
    return MHO_ERR_SYNTAX;
  }
  snprintf(first, sizeof first, "%.*s", (int)(comma - text), text);
  mho_status status = read_value(o, first, &range->low, reason, size);
  if (status == MHO_OK) status = read_value(o, comma + 1, &range->high, reason, size);
  range->given = status == MHO_OK;
  if (status != MHO_OK || range->low < range->high) return status;
  snprintf(reason, size, "'%.60s' runs downwards; the lower end comes first", text);
  return MHO_ERR_RANGE;
}

static mho_status keep_text(const char *text, char *copy, size_t room, char *reason, size_t size)
{
  if ((size_t)snprintf(copy, room, "%s", text) < room && *text) return MHO_OK;
  snprintf(reason, size, *text ? "it is too long; up to %zu characters are allowed" : "it is empty",
           room - 1);
  return MHO_ERR_LIMIT;
}

static mho_status add_word(const char *text, mho_option_list *list, char *reason, size_t size)
{
  if (list->count < MHO_OPTION_LIST_MAX)
    return keep_text(text, list->text[list->count++], MHO_OPTION_WORD_SIZE, reason, size);
  snprintf(reason, size, "at most %d are allowed; all stands for every one", MHO_OPTION_LIST_MAX);
  return MHO_ERR_LIMIT;
}

mho_status mho_option_read(const mho_option *o, const char *text, void *options, char *reason,
                           size_t size)
{
  void *member = (char *)options + o->offset;
  mho_option_quantity *quantity = member;
  switch (o->kind) {
  case MHO_OPTION_FLAG: *(bool *)member = true; return MHO_OK;
  case MHO_OPTION_QUANTITY:
    quantity->given = true;
    return read_value(o, text, &quantity->value, reason, size);
  case MHO_OPTION_RANGE: return read_range(o, text, member, reason, size);
  case MHO_OPTION_COUNT: return read_count(o, text, member, reason, size);
  case MHO_OPTION_TEXT:
    return keep_text(text, ((mho_option_text *)member)->text, MHO_OPTION_TEXT_SIZE, reason, size);
  case MHO_OPTION_LIST: return add_word(text, member, reason, size);
  }
  return MHO_ERR_KEY;
}

static void get_range(const mho_yaml *y, const mho_yaml_node *node, const mho_option *o,
                      mho_option_range *range)
{
  if (!mho_yaml_is(y, node, MHO_YAML_LIST, o->name)) return;
  if (node->count != 2) {
    mho_yaml_fail(y, node, MHO_ERR_SYNTAX, o->name, "%s: two are needed, such as [%s]", o->name,
                  o->example);
    return;
  }
  bool low = mho_yaml_get_quantity(y, node->item[0], o->name, o->dimension, o->low, o->high,
                                   &range->low);
  range->given = mho_yaml_get_quantity(y, node->item[1], o->name, o->dimension, o->low, o->high,
                                       &range->high) && low;
  if (range->given && !(range->low < range->high))
    mho_yaml_fail(y, node, MHO_ERR_RANGE, o->name,
                  "%s: the range runs downwards; the lower end comes first", o->name);
}

/* One text of a node; a reason becomes a cause at it. */
static void get_text(const mho_yaml *y, const mho_yaml_node *node, const mho_option *o,
                     void *options)
{
  char text[MHO_OPTION_TEXT_SIZE], reason[320];
  if (o->kind == MHO_OPTION_TEXT) {
    if (!mho_yaml_get_joined(y, node, o->name, text, sizeof text)) return;
  } else if (!mho_yaml_is(y, node, MHO_YAML_TEXT, o->name)) return;
  mho_status status = mho_option_read(o, o->kind == MHO_OPTION_TEXT ? text : node->text, options,
                                      reason, sizeof reason);
  if (status != MHO_OK) mho_yaml_fail(y, node, status, o->name, "%s: %s", o->name, reason);
}

void mho_yaml_get_options(const mho_yaml *y, const mho_yaml_node *mapping, const mho_option *table,
                          size_t count, void *options)
{
  for (size_t i = 0; i < count; i++) {
    const mho_option *o = &table[i];
    const mho_yaml_node *node = mho_yaml_find(mapping, o->name);
    void *member = (char *)options + o->offset;
    if (!node) continue;
    if (o->kind == MHO_OPTION_FLAG) mho_yaml_get_flag(y, node, o->name, member);
    else if (o->kind == MHO_OPTION_RANGE) get_range(y, node, o, member);
    else if (o->kind == MHO_OPTION_LIST && node->kind == MHO_YAML_LIST)
      for (size_t k = 0; k < node->count; k++) get_text(y, node->item[k], o, options);
    else get_text(y, node, o, options);
  }
}
