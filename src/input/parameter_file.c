/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * A parameter set of the user's own.
 */
#include <mho/molecule_file.h>

#include "input/yaml.h"

#define H_LIMIT 20.0
#define K_LIMIT 10.0

static void read_row(const mho_yaml *yaml, const mho_yaml_node *node, mho_parameter_set *set)
{
  static const char *const keys[] = {"element", "h", "k", "electrons"};
  const char *name;
  double h, k;
  long electrons;
  if (!mho_yaml_is(yaml, node, MHO_YAML_MAPPING, "a row")) return;
  mho_yaml_check_keys(yaml, node, keys, 4);
  bool good = mho_yaml_get_text(yaml, mho_yaml_require(yaml, node, "element"), "element", &name);
  good &= mho_yaml_get_number(yaml, mho_yaml_require(yaml, node, "h"), "h", -H_LIMIT, H_LIMIT, &h);
  good &= mho_yaml_get_number(yaml, mho_yaml_require(yaml, node, "k"), "k", -K_LIMIT, K_LIMIT, &k);
  good &= mho_yaml_get_integer(yaml, mho_yaml_require(yaml, node, "electrons"), "electrons", 0, 2,
                               &electrons);
  mho_error own;
  mho_error_init(&own);
  if (good && mho_parameters_put_row(set, name, h, (int)electrons, k, &own) != MHO_OK)
    mho_yaml_fail(yaml, node, own.cause[0].status, "rows", "%s", own.cause[0].message);
}

static void read_pair(const mho_yaml *yaml, const mho_yaml_node *node, mho_parameter_set *set)
{
  static const char *const keys[] = {"between", "k"};
  double k;
  const char *name[2];
  if (!mho_yaml_is(yaml, node, MHO_YAML_MAPPING, "a pair")) return;
  mho_yaml_check_keys(yaml, node, keys, 2);
  const mho_yaml_node *between = mho_yaml_require(yaml, node, "between");
  bool good = mho_yaml_get_number(yaml, mho_yaml_require(yaml, node, "k"), "k", -K_LIMIT,
                                  K_LIMIT, &k);
  if (!mho_yaml_is(yaml, between, MHO_YAML_LIST, "between")) return;
  if (between->count != 2) {
    mho_yaml_fail(yaml, between, MHO_ERR_SYNTAX, "between",
                  "between: a pair names two rows, such as [C, N+]");
    return;
  }
  for (int i = 0; i < 2; i++)
    good &= mho_yaml_get_text(yaml, between->item[i], "between", &name[i]);
  mho_error own;
  mho_error_init(&own);
  if (good && mho_parameters_put_k(set, name[0], name[1], k, &own) != MHO_OK)
    mho_yaml_fail(yaml, node, own.cause[0].status, "pairs", "%s", own.cause[0].message);
}

static void read_list(const mho_yaml *yaml, const char *key, mho_parameter_set *set,
                      void (*read)(const mho_yaml *, const mho_yaml_node *, mho_parameter_set *))
{
  const mho_yaml_node *list = mho_yaml_find(yaml->root, key);
  if (!mho_yaml_is(yaml, list, MHO_YAML_LIST, key)) return;
  for (size_t i = 0; i < list->count; i++) read(yaml, list->item[i], set);
}

static mho_parameter_set *read_set(const mho_yaml *yaml)
{
  static const char *const keys[] = {"name", "source", "base", "rows", "pairs"};
  const char *name, *source;
  size_t base = 0, count;
  const char *const *known = mho_parameters_names(&count);
  mho_yaml_check_keys(yaml, yaml->root, keys, 5);
  bool good = mho_yaml_get_text(yaml, mho_yaml_require(yaml, yaml->root, "name"), "name", &name);
  good &= mho_yaml_get_text(yaml, mho_yaml_require(yaml, yaml->root, "source"), "source", &source);
  mho_yaml_get_choice(yaml, mho_yaml_find(yaml->root, "base"), "base", known, count, &base);
  if (!good) return NULL;
  mho_parameter_set *set =
      mho_parameters_copy(mho_parameters_builtin(known[base]), name, source);
  if (!set) {
    mho_fail_at(yaml->error, MHO_ERR_MEMORY, "input", yaml->file, 0, 0, NULL, "out of memory");
    return NULL;
  }
  read_list(yaml, "rows", set, read_row);
  read_list(yaml, "pairs", set, read_pair);
  return set;
}

mho_status mho_parameters_read(const char *path, mho_parameter_set **set, mho_error *error)
{
  mho_error own;
  if (!error) {
    mho_error_init(&own);
    error = &own;
  }
  *set = NULL;
  int before = error->count;
  mho_yaml document;
  mho_status status = mho_yaml_read(path, &document, error);
  if (status == MHO_OK) *set = read_set(&document);
  mho_yaml_clear(&document);
  if (status == MHO_OK && error->count > before) status = error->cause[before].status;
  if (status == MHO_OK) return MHO_OK;
  mho_parameters_free(*set);
  *set = NULL;
  return status;
}
