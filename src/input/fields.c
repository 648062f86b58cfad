/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Typed values out of a YAML document, with one clear line for each mistake.
 */
#include <errno.h>
#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/text.h"
#include "input/yaml.h"

void mho_yaml_fail(const mho_yaml *document, const mho_yaml_node *node,
                   mho_status status, const char *field, const char *format, ...)
{
  char message[480];
  va_list arguments;
  va_start(arguments, format);
  vsnprintf(message, sizeof message, format, arguments);
  va_end(arguments);
  mho_fail_at(document->error, status, "input", document->file, node->line, node->column,
              field, "%s", message);
}

const mho_yaml_node *mho_yaml_find(const mho_yaml_node *mapping, const char *key)
{
  for (size_t i = 0; i < mapping->count; i++)
    if (!strcmp(mapping->key[i]->text, key)) return mapping->item[i];
  return NULL;
}

const mho_yaml_node *mho_yaml_require(const mho_yaml *document,
                                      const mho_yaml_node *mapping, const char *key)
{
  const mho_yaml_node *node = mho_yaml_find(mapping, key);
  if (!node)
    mho_yaml_fail(document, mapping, MHO_ERR_KEY, key, "key '%s' is missing here", key);
  return node;
}

void mho_yaml_check_keys(const mho_yaml *document, const mho_yaml_node *mapping,
                         const char *const *known, size_t count)
{
  for (size_t i = 0; i < mapping->count; i++) {
    const mho_yaml_node *key = mapping->key[i];
    bool found = false;
    for (size_t k = 0; k < count && !found; k++) found = !strcmp(known[k], key->text);
    if (found) continue;
    const char *nearest = mho_nearest_word(key->text, known, count);
    char list[320];
    if (nearest)
      mho_yaml_fail(document, key, MHO_ERR_KEY, key->text,
                    "key '%.40s' is not known; did you mean '%s'?", key->text, nearest);
    else
      mho_yaml_fail(document, key, MHO_ERR_KEY, key->text,
                    "key '%.40s' is not known; allowed here: %s", key->text,
                    mho_join_words(known, count, list, sizeof list));
  }
}

bool mho_yaml_is(const mho_yaml *document, const mho_yaml_node *node,
                 mho_yaml_kind kind, const char *field)
{
  static const char *const kind_name[] = {"a single value", "a list", "a mapping"};
  static const char *const example[] = {"", " such as [a, b]", " such as {key: value}"};
  if (!node) return false;
  if (node->kind == kind) return true;
  mho_yaml_fail(document, node, MHO_ERR_SYNTAX, field, "%s needs %s%s, not %s", field,
                kind_name[kind], example[kind], kind_name[node->kind]);
  return false;
}

bool mho_yaml_get_text(const mho_yaml *document, const mho_yaml_node *node,
                       const char *field, const char **text)
{
  if (!mho_yaml_is(document, node, MHO_YAML_TEXT, field)) return false;
  if (node->text[0] == '\0') {
    mho_yaml_fail(document, node, MHO_ERR_SYNTAX, field, "%s is empty", field);
    return false;
  }
  *text = node->text;
  return true;
}

bool mho_yaml_get_quantity(const mho_yaml *document, const mho_yaml_node *node,
                           const char *field, mho_dimension dimension, double low,
                           double high, double *value)
{
  if (!mho_yaml_is(document, node, MHO_YAML_TEXT, field)) return false;
  char reason[320];
  double read;
  mho_status status = mho_quantity_read(node->text, dimension, &read, reason, sizeof reason);
  if (status != MHO_OK) {
    mho_yaml_fail(document, node, status, field, "%s: %s", field, reason);
    return false;
  }
  if (!(read >= low && read <= high)) {
    const char *base = mho_dimension_base_unit(dimension);
    mho_yaml_fail(document, node, MHO_ERR_RANGE, field,
                  "%s: '%.40s' is out of range; allowed are %g %s to %g %s", field,
                  node->text, low, base, high, base);
    return false;
  }
  *value = read;
  return true;
}

bool mho_yaml_get_number(const mho_yaml *document, const mho_yaml_node *node,
                         const char *field, double low, double high, double *value)
{
  if (!mho_yaml_is(document, node, MHO_YAML_TEXT, field)) return false;
  const char *end;
  double read;
  if (!mho_number_read(node->text, &end, &read) || *end) {
    mho_yaml_fail(document, node, MHO_ERR_SYNTAX, field, "%s: '%.40s' is not a plain number",
                  field, node->text);
    return false;
  }
  if (!(read >= low && read <= high)) {
    mho_yaml_fail(document, node, MHO_ERR_RANGE, field,
                  "%s: '%.40s' is out of range; allowed are %g to %g", field, node->text, low,
                  high);
    return false;
  }
  *value = read;
  return true;
}

bool mho_yaml_get_integer(const mho_yaml *document, const mho_yaml_node *node,
                          const char *field, long low, long high, long *value)
{
  if (!mho_yaml_is(document, node, MHO_YAML_TEXT, field)) return false;
  char *end;
  errno = 0;
  long read = strtol(node->text, &end, 10);
  bool number = node->text[0] && strspn(node->text, "+-0123456789") == strlen(node->text);
  if (!number || *end || errno || read < low || read > high) {
    mho_yaml_fail(document, node, MHO_ERR_RANGE, field,
                  "%s: '%.40s' is not allowed; a whole number from %ld to %ld is", field,
                  node->text, low, high);
    return false;
  }
  *value = read;
  return true;
}

bool mho_yaml_get_choice(const mho_yaml *document, const mho_yaml_node *node,
                         const char *field, const char *const *choices,
                         size_t count, size_t *index)
{
  if (!mho_yaml_is(document, node, MHO_YAML_TEXT, field)) return false;
  for (size_t i = 0; i < count; i++)
    if (!strcmp(choices[i], node->text)) {
      *index = i;
      return true;
    }
  const char *nearest = mho_nearest_word(node->text, choices, count);
  char list[320];
  if (nearest)
    mho_yaml_fail(document, node, MHO_ERR_REFERENCE, field,
                  "%s: '%.40s' is not known; did you mean '%s'?", field, node->text, nearest);
  else
    mho_yaml_fail(document, node, MHO_ERR_REFERENCE, field,
                  "%s: '%.40s' is not known; allowed are %s", field, node->text,
                  mho_join_words(choices, count, list, sizeof list));
  return false;
}

bool mho_yaml_get_flag(const mho_yaml *document, const mho_yaml_node *node,
                       const char *field, bool *value)
{
  static const char *const words[] = {"false", "true"};
  size_t index;
  if (!mho_yaml_get_choice(document, node, field, words, 2, &index)) return false;
  *value = index == 1;
  return true;
}

bool mho_yaml_get_joined(const mho_yaml *document, const mho_yaml_node *node,
                         const char *field, char *buffer, size_t size)
{
  const char *text;
  size_t used = 0;
  buffer[0] = '\0';
  if (node->kind == MHO_YAML_TEXT) {
    if (!mho_yaml_get_text(document, node, field, &text)) return false;
    used = (size_t)snprintf(buffer, size, "%s", text);
  }
  for (size_t i = 0; node->kind != MHO_YAML_TEXT && i < node->count && used < size; i++) {
    bool pair = node->kind == MHO_YAML_MAPPING;
    if (!mho_yaml_get_text(document, node->item[i], field, &text)) return false;
    used += (size_t)snprintf(buffer + used, size - used, "%s%s%s%s", i ? ", " : "",
                             pair ? node->key[i]->text : "", pair ? " = " : "", text);
  }
  if (used > 0 && used < size) return true;
  mho_yaml_fail(document, node, MHO_ERR_LIMIT, field, used ? "%s is too long; up to %zu characters "
                "are allowed" : "%s is empty", field, size - 1);
  return false;
}

void mho_yaml_get_settings(const mho_yaml *document, const mho_yaml_node *mapping,
                           mho_settings *settings)
{
  size_t count;
  const char *const *name = mho_settings_names(&count);
  for (size_t i = 0; i < count; i++) {
    const mho_yaml_node *node = mho_yaml_find(mapping, name[i]);
    if (!mho_yaml_is(document, node, MHO_YAML_TEXT, name[i])) continue;
    char reason[320];
    mho_status status =
        mho_settings_read(settings, name[i], node->text, document->file, reason, sizeof reason,
                          document->error);
    if (status != MHO_OK) {
      mho_yaml_fail(document, node, status, name[i], "%s: %s", name[i], reason);
    } else if (!strcmp(name[i], "fermi")) {
      settings->fermi.line = node->line;
      settings->fermi.column = node->column;
    }
  }
}

void mho_yaml_get_twists(const mho_yaml *document, const mho_yaml_node *list,
                         mho_settings *settings)
{
  static const char *const keys[] = {"bond", "angle"};
  if (!mho_yaml_is(document, list, MHO_YAML_LIST, "twist")) return;
  for (size_t i = 0; i < list->count; i++) {
    const mho_yaml_node *item = list->item[i];
    const char *bond, *angle;
    char reason[320];
    if (!mho_yaml_is(document, item, MHO_YAML_MAPPING, "a twist")) continue;
    mho_yaml_check_keys(document, item, keys, 2);
    const mho_yaml_node *bond_node = mho_yaml_require(document, item, "bond");
    const mho_yaml_node *angle_node = mho_yaml_require(document, item, "angle");
    if (!mho_yaml_get_text(document, bond_node, "bond", &bond) ||
        !mho_yaml_get_text(document, angle_node, "angle", &angle))
      continue;
    mho_status status = mho_settings_read_twist(settings, bond, angle, reason, sizeof reason);
    if (status != MHO_OK) mho_yaml_fail(document, item, status, "twist", "twist: %s", reason);
  }
}
