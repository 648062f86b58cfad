/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Reads SMILES, one a line, and prints what was perceived, one JSON object a
 * line, for the comparison with an outside reference.
 * perceive [alkyl=inductive|heteroatom] [alternation=none]
 *          [parameters=NAME] [levels]
 * perceive records=FILE
 */
#include <mho/structure.h>

#include <jansson.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/lapack.h"
#include "molecule/records.h"

static json_t *texts(const mho_texts *t)
{
  json_t *list = json_array();
  for (int i = 0; i < t->count; i++) json_array_append_new(list, json_string(t->text[i]));
  return list;
}

static json_t *error_text(const mho_error *error)
{
  return json_pack("{s:s, s:s}", "status", mho_status_text(error->cause[0].status),
                   "message", error->cause[0].message);
}

static void put_graph(json_t *out, const mho_graph *g)
{
  char formula[256];
  mho_graph_formula(g, formula, sizeof formula);
  json_t *hydrogens = json_array(), *orders = json_array();
  int ring_bonds = 0;
  for (int a = 0; a < g->atom_count; a++)
    json_array_append_new(hydrogens, json_integer(mho_graph_hydrogens(g, a)));
  for (int b = 0; b < g->bond_count; b++) {
    json_array_append_new(orders, json_integer(g->bond[b].order));
    ring_bonds += g->bond[b].ring;
  }
  json_object_set_new(out, "formula", json_string(formula));
  json_object_set_new(out, "rings", json_integer(mho_graph_rings(g)));
  json_object_set_new(out, "ring_bonds", json_integer(ring_bonds));
  json_object_set_new(out, "hydrogens", hydrogens);
  json_object_set_new(out, "orders", orders);
}

static void put_contacts(json_t *out, const mho_molecule *m)
{
  json_t *contacts = json_array();
  for (int side = 0; side < 2; side++) {
    json_t *sites = json_array();
    for (int i = 0; i < m->contact[side].count; i++)
      json_array_append_new(sites, json_string(m->site[m->contact[side].site[i]].id));
    json_array_append_new(contacts, json_pack("{s:o, s:f}", "sites", sites, "coupling",
                                              m->contact[side].coupling_ev));
  }
  json_object_set_new(out, "contacts", contacts);
}

static void put_levels(json_t *out, const mho_molecule *m)
{
  int n = m->site_count;
  double *h = calloc((size_t)n * (size_t)n, sizeof *h);
  double *level = malloc((size_t)n * sizeof *level);
  for (int i = 0; i < n; i++) h[i * n + i] = mho_molecule_onsite_ev(m, i);
  for (int b = 0; b < m->bond_count; b++) {
    const int *s = m->bond[b].site;
    h[s[0] * n + s[1]] = h[s[1] * n + s[0]] = mho_molecule_hopping_ev(m, b);
  }
  json_t *list = json_array();
  if (mho_eigen_symmetric(n, h, level, NULL) == MHO_OK)
    for (int i = 0; i < n; i++) json_array_append_new(list, json_real(level[i]));
  json_object_set_new(out, "levels", list);
  free(h);
  free(level);
}

static void put_molecule(json_t *out, const mho_molecule *m, const mho_structure *s)
{
  json_t *sites = json_array(), *bonds = json_array(), *linkers = json_array();
  for (int i = 0; i < m->site_count; i++) {
    const char *row = mho_parameters_row_name(m->parameters, m->site[i].row);
    json_array_append_new(
        sites, json_pack("{s:s, s:i, s:s, s:i, s:f}", "id", m->site[i].id, "atom",
                         s->site_atom[i], "row", row ? row : "", "electrons",
                         m->site[i].electrons, "onsite", mho_molecule_onsite_ev(m, i)));
  }
  for (int b = 0; b < m->bond_count; b++) {
    const mho_bond *bond = &m->bond[b];
    json_array_append_new(
        bonds, json_pack("{s:[s,s], s:f, s:f, s:b, s:f}", "between",
                         m->site[bond->site[0]].id, m->site[bond->site[1]].id, "strength",
                         bond->strength, "twist", bond->twist_deg, "rotatable",
                         bond->rotatable, "hopping", mho_molecule_hopping_ev(m, b)));
  }
  for (int i = 0; i < s->linker_count; i++)
    json_array_append_new(linkers, json_pack("{s:s, s:i}", "kind",
                                             mho_linker_name(s->linker[i].kind), "atom",
                                             s->linker[i].atom[0]));
  json_object_set_new(out, "sites", sites);
  json_object_set_new(out, "bonds", bonds);
  json_object_set_new(out, "linkers", linkers);
  json_object_set_new(out, "electrons", json_integer(m->electrons));
  json_object_set_new(out, "charge", json_integer(m->charge));
  json_t *warnings = json_array();
  for (int i = 0; i < MHO_WARNING_COUNT; i++)
    if (s->warnings & (1u << i))
      json_array_append_new(warnings, json_string(mho_warning_word(i)));
  json_object_set_new(out, "warnings", warnings);
  json_object_set_new(out, "notes", texts(&s->notes));
  put_contacts(out, m);
}

static void perceive(const char *text, const mho_structure_options *options, bool levels)
{
  mho_molecule molecule;
  mho_structure structure;
  mho_error error;
  mho_molecule_init(&molecule);
  mho_structure_init(&structure);
  mho_error_init(&error);
  json_t *out = json_object();
  if (mho_smiles_read(text, NULL, &structure.graph, &error) != MHO_OK) {
    json_object_set_new(out, "error", error_text(&error));
  } else {
    put_graph(out, &structure.graph);
    if (mho_molecule_from_graph(&structure, options, &molecule, &error) != MHO_OK) {
      json_object_set_new(out, "refused", error_text(&error));
    } else {
      put_molecule(out, &molecule, &structure);
      if (levels) put_levels(out, &molecule);
    }
  }
  json_dumpf(out, stdout, JSON_COMPACT);
  putchar('\n');
  json_decref(out);
  mho_structure_clear(&structure);
  mho_molecule_clear(&molecule);
}

/* The graphs of a file of structures. */
static int perceive_records(const char *path)
{
  mho_records *records;
  mho_record record = {.number = 1};
  if (mho_records_open(path, &records, NULL) != MHO_OK) return 2;
  while (record.number) {
    mho_graph graph;
    mho_error error;
    mho_graph_init(&graph);
    mho_error_init(&error);
    json_t *out = json_object();
    if (mho_records_next(records, &graph, &record, NULL, &error) != MHO_OK)
      json_object_set_new(out, "error", error_text(&error));
    else if (record.number)
      put_graph(out, &graph);
    if (record.number) {
      json_dumpf(out, stdout, JSON_COMPACT);
      putchar('\n');
    }
    json_decref(out);
    mho_graph_clear(&graph);
  }
  mho_records_close(records);
  return 0;
}

int main(int count, char **argument)
{
  if (count == 2 && !strncmp(argument[1], "records=", 8)) return perceive_records(argument[1] + 8);
  mho_structure_options options;
  mho_structure_options_init(&options);
  options.contacts_optional = true;
  bool levels = false;
  for (int i = 1; i < count; i++) {
    if (!strcmp(argument[i], "levels")) levels = true;
    else if (!strcmp(argument[i], "contacts")) options.contacts_optional = false;
    else if (!strcmp(argument[i], "alkyl=inductive")) options.alkyl = MHO_ALKYL_INDUCTIVE;
    else if (!strcmp(argument[i], "alkyl=heteroatom")) options.alkyl = MHO_ALKYL_HETEROATOM;
    else if (!strcmp(argument[i], "alternation=none")) options.alternation = MHO_ALTERNATION_NONE;
    else if (!strncmp(argument[i], "parameters=", 11))
      options.parameters = mho_parameters_builtin(argument[i] + 11);
    else return 2;
    if (!options.parameters) return 2;
  }
  char *line = NULL;
  size_t room = 0;
  ssize_t length;
  while ((length = getline(&line, &room, stdin)) >= 0) {
    while (length && (line[length - 1] == '\n' || line[length - 1] == '\r')) line[--length] = 0;
    perceive(line, &options, levels);
  }
  free(line);
  return 0;
}
