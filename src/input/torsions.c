/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The key `torsion` of a molecule.
 */
#include <stdlib.h>
#include <string.h>

#include "base/text.h"
#include "input/molecule_node.h"

enum { POTENTIAL_SIZE = 400 };

static void add_potential(const mho_yaml *y, const mho_yaml_node *node, mho_molecule *m, int bond)
{
  char text[POTENTIAL_SIZE];
  mho_torsion potential;
  mho_error own;
  mho_error_init(&own);
  if (!mho_yaml_get_joined(y, node, "potential", text, sizeof text)) return;
  mho_status status = mho_torsion_read(text, y->file, &potential, &own);
  for (int i = 0; i < own.count; i++) {
    const mho_cause *cause = &own.cause[i];
    if (cause->line > 0) /* in a table of its own */
      mho_fail_at(y->error, cause->status, "input", cause->file, cause->line, cause->column,
                  "torsion", "%s", cause->message);
    else
      mho_yaml_fail(y, node, cause->status, "torsion", "%s%s%s%s", cause->file[0] ? "torsion: " : "",
                    cause->file, cause->file[0] ? " " : "", cause->message);
  }
  if (status != MHO_OK) return;
  mho_bond_torsion *larger =
      realloc(m->torsion, (size_t)(m->torsion_count + 1) * sizeof *larger);
  char *name = mho_copy_text(text);
  if (larger) m->torsion = larger;
  if (larger && name) {
    m->torsion[m->torsion_count++] = (mho_bond_torsion){bond, name, potential};
    return;
  }
  free(name);
  mho_yaml_fail(y, node, MHO_ERR_MEMORY, "torsion", "out of memory");
}

static void read_bond(const mho_yaml *y, const mho_yaml_node *item, mho_molecule *m)
{
  static const char *const keys[] = {"bond", "potential"};
  const char *text;
  mho_yaml_check_keys(y, item, keys, 2);
  const mho_yaml_node *name = mho_yaml_require(y, item, "bond");
  const mho_yaml_node *potential = mho_yaml_require(y, item, "potential");
  if (!mho_yaml_get_text(y, name, "bond", &text) || !potential) return;
  int bond = mho_molecule_find_bond(m, text);
  if (bond < 0) {
    mho_yaml_fail(y, name, MHO_ERR_REFERENCE, "bond",
                  "bond: there is no bond '%.80s' between sites of the pi system; write two that "
                  "are bonded, such as C5-C8", text);
    return;
  }
  for (int i = 0; i < m->torsion_count; i++)
    if (m->torsion[i].bond == bond) {
      mho_yaml_fail(y, name, MHO_ERR_KEY, "bond", "bond: '%.80s' is given twice", text);
      return;
    }
  add_potential(y, potential, m, bond);
}

void mho_yaml_get_torsions(const mho_yaml *y, const mho_yaml_node *node, mho_molecule *m)
{
  static const char *const keys[] = {"potential", "frozen"};
  if (!node) return;
  bool by_bond = node->kind == MHO_YAML_LIST && node->count > 0;
  for (size_t i = 0; by_bond && i < node->count; i++)
    by_bond = node->item[i]->kind == MHO_YAML_MAPPING;
  if (by_bond) {
    for (size_t i = 0; i < node->count; i++) read_bond(y, node->item[i], m);
  } else if (node->kind == MHO_YAML_MAPPING &&
             !(node->count && node->key[0]->text[0] == 'v')) { /* terms: v2 ... */
    mho_yaml_check_keys(y, node, keys, 2);
    mho_yaml_get_flag(y, mho_yaml_find(node, "frozen"), "frozen", &m->frozen);
    const mho_yaml_node *potential = mho_yaml_find(node, "potential");
    if (potential) add_potential(y, potential, m, -1);
  } else if (node->kind == MHO_YAML_TEXT && !strcmp(node->text, "frozen")) {
    m->frozen = true;
  } else if (node->kind != MHO_YAML_TEXT || strcmp(node->text, "by-kind")) {
    add_potential(y, node, m, -1);
  }
}
