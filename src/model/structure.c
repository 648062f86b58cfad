/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <mho/structure.h>

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/text.h"
#include "model/alkyl.h"
#include "model/geometry.h"
#include "molecule/element.h"
#include "molecule/fragment.h"
#include "molecule/graph.h"
#include "molecule/linker.h"
#include "molecule/pi.h"
#include "molecule/texts.h"

typedef struct {
  const mho_structure_options *options;
  mho_structure *structure;
  mho_molecule *molecule;
  mho_error *error;
  mho_linkers linkers;
  mho_contact_atoms contact[2];
  mho_pi pi;
} conversion;

void mho_structure_options_init(mho_structure_options *options)
{
  *options = (mho_structure_options){
      .parameters = mho_parameters_builtin("van-catledge"),
      .beta_ev = MHO_DEFAULT_BETA_EV};
}

void mho_structure_init(mho_structure *structure)
{
  memset(structure, 0, sizeof *structure);
}

/* Forgets what was made of the graph. */
static void reset(mho_structure *structure)
{
  free(structure->linker);
  free(structure->site_atom);
  mho_texts_clear(&structure->notes);
  mho_graph graph = structure->graph;
  mho_structure_init(structure);
  structure->graph = graph;
}

void mho_structure_clear(mho_structure *structure)
{
  mho_graph_clear(&structure->graph);
  reset(structure);
}

static mho_status no_memory(mho_error *error)
{
  return mho_fail(error, MHO_ERR_MEMORY, "model", NULL, "out of memory");
}

static const char from_coordinates[] = "from the coordinates";

#define NOTE(c, ...)                                                   \
  ((c)->options->quiet ||                                              \
           mho_texts_add(&(c)->structure->notes, __VA_ARGS__) == MHO_OK \
       ? MHO_OK                                                        \
       : no_memory((c)->error))

static mho_status perceive(conversion *c)
{
  const mho_graph *graph = &c->structure->graph;
  const mho_place *place = &c->options->place;
  mho_texts *notes = c->options->quiet ? NULL : &c->structure->notes;
  if (mho_linkers_find(graph, &c->linkers) != MHO_OK ||
      mho_fragment_choose(graph, &c->linkers, notes) != MHO_OK)
    return no_memory(c->error);
  mho_status status = mho_contacts_choose(graph, &c->linkers,
                                          c->options->contacts_optional, place,
                                          c->contact, c->error);
  if (status != MHO_OK) return status;
  unsigned char *touched = calloc((size_t)graph->atom_count + 1, 1);
  if (!touched) return no_memory(c->error);
  for (int side = 0; side < 2; side++)
    for (int i = 0; i < c->contact[side].count; i++)
      touched[c->contact[side].atom[i]] |= (unsigned char)(1 << side);
  status = mho_pi_perceive(graph, c->linkers.removed, touched, place, &c->pi,
                           notes, c->error);
  free(touched);
  return status == MHO_OK ? mho_pi_find_bonds(graph, &c->pi, c->error) : status;
}

static mho_status fail_row(conversion *c, const mho_pi_site *site)
{
  const mho_parameter_set *set = c->options->parameters;
  const char *rows[32];
  char name[24], list[256];
  size_t count = 0;
  for (int i = 0; i < mho_parameters_count(set) && count < 32; i++)
    rows[count++] = mho_parameters_row_name(set, i);
  mho_graph_atom_name(&c->structure->graph, site->atom, name, sizeof name);
  return mho_fail_atom(
      c->error, MHO_ERR_UNPARAMETERISED, &c->options->place,
      &c->structure->graph, site->atom,
      "%s needs the row '%s', which the parameter set %s does not have; it has %s",
      name, site->row, mho_parameters_name(set),
      mho_join_words(rows, count, list, sizeof list));
}

/* Room for the pi system and for the sites that alkyl groups may add. */
static mho_status allocate(conversion *c)
{
  mho_molecule *m = c->molecule;
  size_t alkyl = c->options->alkyl == MHO_ALKYL_HETEROATOM
                     ? (size_t)c->structure->graph.atom_count
                     : 0;
  size_t bonds = alkyl ? (size_t)c->structure->graph.bond_count : 0;
  size_t sites = (size_t)c->pi.site_count + alkyl;
  free(m->site);
  free(m->bond);
  m->site = calloc(sites + 1, sizeof *m->site);
  m->bond = calloc((size_t)c->pi.bond_count + bonds + 1, sizeof *m->bond);
  c->structure->site_atom = malloc((sites + 1) * sizeof(int));
  return m->site && m->bond && c->structure->site_atom ? MHO_OK
                                                       : no_memory(c->error);
}

static mho_status fill_sites(conversion *c)
{
  mho_molecule *m = c->molecule;
  mho_status status = MHO_OK;
  for (int s = 0; s < c->pi.site_count; s++) {
    const mho_pi_site *from = &c->pi.site[s];
    mho_site *to = &m->site[s];
    int length = mho_graph_atom_name(&c->structure->graph, from->atom, to->id, sizeof to->id);
    if (from->orbital) snprintf(to->id + length, sizeof to->id - (size_t)length, "b");
    to->electrons = from->electrons;
    to->row = mho_parameters_find(c->options->parameters, from->row);
    c->structure->site_atom[s] = from->atom;
    if (to->row < 0) status = fail_row(c, from);
  }
  m->site_count = c->pi.site_count;
  return status;
}

static void fill_bonds(conversion *c)
{
  mho_molecule *m = c->molecule;
  bool formal = c->options->alternation == MHO_ALTERNATION_FORMAL;
  for (int b = 0; b < c->pi.bond_count; b++) {
    const mho_pi_bond *from = &c->pi.bond[b];
    m->bond[b] = (mho_bond){.site = {from->site[0], from->site[1]},
                            .strength = formal ? from->strength : 1.0,
                            .twist_deg = from->twist_deg,
                            .rotatable = from->rotatable,
                            .torsion = from->kind};
  }
  m->bond_count = c->pi.bond_count;
}

/* Dihedral angles and, where asked for, hoppings from the coordinates. */
static mho_status use_coordinates(conversion *c)
{
  mho_molecule *m = c->molecule;
  const mho_graph *graph = &c->structure->graph;
  bool lengths = c->options->hopping == MHO_HOPPING_BOND_LENGTH;
  int counted = 0;
  if (lengths && !graph->is_3d)
    return mho_fail_column(c->error, MHO_ERR_REFERENCE, &c->options->place, 1,
                           "hopping: bond-length needs coordinates in space, from a molfile "
                           "or an XYZ file; there are none");
  for (int b = 0; b < c->pi.bond_count && graph->is_3d; b++) {
    mho_pi_bond *from = &c->pi.bond[b];
    const int *ends = graph->bond[from->bond].atom;
    if (from->rotatable && mho_geometry_twist(graph, from->bond, &m->bond[b].twist_deg))
      from->reason = from_coordinates;
    if (!lengths || graph->atom[ends[0]].element != ELEMENT_C ||
        graph->atom[ends[1]].element != ELEMENT_C)
      continue;
    m->bond[b].strength = mho_geometry_strength(graph, from->bond);
    counted++;
  }
  if (!lengths) return MHO_OK;
  return NOTE(c, "the hoppings of %d C-C bonds follow from their lengths, beta(r) = beta "
              "exp[-(r - 1.397 A)/0.2623 A]; others from the parameter set", counted);
}

/* Pairs of rows whose k is a product, each once. */
static mho_status note_products(conversion *c)
{
  const mho_molecule *m = c->molecule;
  const mho_parameter_set *set = c->options->parameters;
  int rows = mho_parameters_count(set);
  bool *told = calloc((size_t)rows * (size_t)rows, sizeof *told);
  mho_status status = told ? MHO_OK : no_memory(c->error);
  for (int b = 0; b < m->bond_count && status == MHO_OK; b++) {
    int i = m->site[m->bond[b].site[0]].row, j = m->site[m->bond[b].site[1]].row;
    int low = i < j ? i : j, high = i < j ? j : i;
    bool *seen = &told[low * rows + high];
    if (*seen || !mho_parameters_k_is_product(set, i, j)) continue;
    *seen = true;
    status = NOTE(c, "k of %s and %s is %g, the product of their k to carbon: "
                  "the set %s gives none", mho_parameters_row_name(set, low),
                  mho_parameters_row_name(set, high),
                  mho_parameters_k(set, i, j), mho_parameters_name(set));
  }
  free(told);
  return status;
}

static int find_bond(const mho_molecule *m, int first, int second)
{
  for (int b = 0; b < m->bond_count; b++) {
    const int *s = m->bond[b].site;
    if ((s[0] == first && s[1] == second) || (s[0] == second && s[1] == first)) return b;
  }
  return -1;
}

static mho_status fail_twist(conversion *c, const mho_twist_setting *twist)
{
  char list[300] = "";
  size_t used = 0;
  const mho_molecule *m = c->molecule;
  for (int b = 0; b < m->bond_count && used + 60 < sizeof list; b++)
    if (m->bond[b].rotatable)
      used += (size_t)snprintf(list + used, sizeof list - used, "%s%s-%s",
                               used ? ", " : "", m->site[m->bond[b].site[0]].id,
                               m->site[m->bond[b].site[1]].id);
  return mho_fail_at(c->error, MHO_ERR_REFERENCE, "model", c->options->place.file,
                     c->options->place.line, c->options->place.column, "twist",
                     "twist: the pi system has no bond %.20s-%.20s; its "
                     "rotatable bonds: %s", twist->atom[0], twist->atom[1],
                     used ? list : "none");
}

static mho_status set_twists(conversion *c)
{
  mho_molecule *m = c->molecule;
  for (int i = 0; i < c->options->twist_count; i++) {
    const mho_twist_setting *twist = &c->options->twist[i];
    int first = mho_molecule_find_site(m, twist->atom[0]);
    int second = mho_molecule_find_site(m, twist->atom[1]);
    int bond = first < 0 || second < 0 ? -1 : find_bond(m, first, second);
    if (bond < 0) return fail_twist(c, twist);
    m->bond[bond].twist_deg = twist->angle_deg;
    c->pi.bond[bond].reason = NULL;
  }
  for (int b = 0; b < c->pi.bond_count; b++) {
    if (!m->bond[b].rotatable || !c->pi.bond[b].reason) continue;
    bool exact = c->pi.bond[b].reason == from_coordinates;
    if (NOTE(c, "twist %s-%s: %g deg, %s%s%s",
             m->site[m->bond[b].site[0]].id, m->site[m->bond[b].site[1]].id,
             m->bond[b].twist_deg, exact ? "" : "an estimate (",
             c->pi.bond[b].reason, exact ? "" : ")") != MHO_OK)
      return MHO_ERR_MEMORY;
  }
  return MHO_OK;
}

static mho_status fail_contact(conversion *c, int side, int atom)
{
  char name[24];
  mho_graph_atom_name(&c->structure->graph, atom, name, sizeof name);
  return mho_fail_atom(c->error, MHO_ERR_CONTACTS, &c->options->place,
                       &c->structure->graph, atom,
                       "the %s contact %s carries no p orbital; mark an atom "
                         "of the pi system", side ? "right" : "left", name);
}

/* Every orbital of the contact's atoms, with one coupling. */
static mho_status fill_contact(conversion *c, int side)
{
  const mho_contact_atoms *from = &c->contact[side];
  mho_contact *to = &c->molecule->contact[side];
  size_t room = 2 * (size_t)from->count + 1;
  free(to->site);
  free(to->amplitude);
  to->site = malloc(room * sizeof *to->site);
  to->amplitude = malloc(room * sizeof *to->amplitude);
  if (!to->site || !to->amplitude) return no_memory(c->error);
  to->channels = MHO_CHANNELS_INDEPENDENT;
  to->coupling_ev = c->options->coupling_ev > 0 ? c->options->coupling_ev
                                                : mho_linker_coupling_ev(from->kind);
  to->count = 0;
  for (int i = 0; i < from->count; i++) {
    int site = c->pi.site_of[from->atom[i]];
    if (site < 0) return fail_contact(c, side, from->atom[i]);
    for (; site < c->pi.site_count && c->pi.site[site].atom == from->atom[i]; site++) {
      to->site[to->count] = site;
      to->amplitude[to->count++] = 1.0;
    }
  }
  return MHO_OK;
}

/* Marks the sites that bonds join to a contact; reached[site_count]. */
static void reach(const mho_molecule *m, int side, bool *reached)
{
  memset(reached, 0, (size_t)m->site_count * sizeof *reached);
  for (int i = 0; i < m->contact[side].count; i++) reached[m->contact[side].site[i]] = true;
  for (bool grown = true; grown;) {
    grown = false;
    for (int direction = 0; direction < 2; direction++)
      for (int k = 0; k < m->bond_count; k++) {
        const int *s = m->bond[direction ? m->bond_count - 1 - k : k].site;
        if (reached[s[0]] == reached[s[1]]) continue;
        reached[s[0]] = reached[s[1]] = grown = true;
      }
  }
}

static mho_status warn(conversion *c)
{
  const mho_molecule *m = c->molecule;
  const mho_graph *graph = &c->structure->graph;
  unsigned *warnings = &c->structure->warnings;
  for (int a = 0; a < graph->atom_count; a++)
    if (mho_element_is_metal(graph->atom[a].element) &&
        graph->atom[a].element != ELEMENT_AU)
      *warnings |= MHO_WARN_METAL;
  if (!m->contact[MHO_LEFT].count) return MHO_OK;
  bool *reached = malloc((size_t)m->site_count * sizeof *reached);
  if (!reached) return no_memory(c->error);
  reach(m, MHO_LEFT, reached);
  bool joined = false;
  for (int i = 0; i < m->contact[MHO_RIGHT].count; i++)
    joined |= reached[m->contact[MHO_RIGHT].site[i]];
  if (!joined) *warnings |= MHO_WARN_NO_PI_PATH | MHO_WARN_DIFFERENT_FRAGMENTS;
  if (c->options->alternation == MHO_ALTERNATION_NONE &&
      c->options->hopping == MHO_HOPPING_TABLE)
    for (int b = 0; b < c->pi.bond_count; b++)
      if (c->pi.bond[b].strength != 1.0 && reached[c->pi.bond[b].site[0]])
        *warnings |= MHO_WARN_UNIFORM_BONDS;
  free(reached);
  return MHO_OK;
}

static mho_status count_electrons(conversion *c)
{
  mho_molecule *m = c->molecule;
  m->explicit_electrons = true;
  m->electrons = -c->options->charge;
  m->charge = c->pi.charge + c->options->charge;
  for (int s = 0; s < m->site_count; s++) m->electrons += m->site[s].electrons;
  if (m->electrons >= 0 && m->electrons <= 2 * m->site_count) return MHO_OK;
  return mho_fail(c->error, MHO_ERR_RANGE, "model", "charge",
                  "the charge %+d leaves %d pi electrons; %d sites hold 0 to %d",
                  c->options->charge, m->electrons, m->site_count, 2 * m->site_count);
}

static mho_status fill_contacts(conversion *c)
{
  if (!c->contact[0].count) {
    int found = c->linkers.count;
    return found ? NOTE(c, "no contacts: two linkers are needed, %d found", found)
                 : NOTE(c, "no contacts: two linkers are needed, none is found");
  }
  for (int side = 0; side < 2; side++) {
    mho_status status = fill_contact(c, side);
    if (status != MHO_OK) return status;
    int count = c->molecule->contact[side].count;
    if (count > 1 &&
        NOTE(c, "the %s contact binds by %d sites, each a channel of its own",
             side ? "right" : "left", count) != MHO_OK)
      return MHO_ERR_MEMORY;
  }
  return MHO_OK;
}

static mho_status convert(conversion *c)
{
  mho_status status = perceive(c);
  if (status == MHO_OK && c->pi.site_count == 0)
    return mho_fail_column(c->error, MHO_ERR_RANGE, &c->options->place, 1,
                           "no atom carries a p orbital; the model needs a pi "
                           "system");
  if (status == MHO_OK && c->pi.site_count > MHO_SITE_LIMIT)
    return mho_fail_column(c->error, MHO_ERR_LIMIT, &c->options->place, 1,
                           "%d sites; at most %d are allowed", c->pi.site_count,
                           MHO_SITE_LIMIT);
  if (status == MHO_OK) status = allocate(c);
  if (status == MHO_OK) status = fill_sites(c);
  if (status == MHO_OK) {
    fill_bonds(c);
    status = use_coordinates(c);
  }
  if (status == MHO_OK) status = note_products(c);
  if (status == MHO_OK) status = set_twists(c);
  if (status == MHO_OK)
    status = mho_alkyl_apply(&c->pi, c->linkers.removed, c->options, c->molecule,
                             c->structure, c->error);
  if (status == MHO_OK) status = fill_contacts(c);
  if (status == MHO_OK) status = count_electrons(c);
  return status == MHO_OK ? warn(c) : status;
}

mho_status mho_molecule_from_graph(mho_structure *structure,
                                   const mho_structure_options *options,
                                   mho_molecule *molecule, mho_error *error)
{
  mho_structure_options defaults;
  mho_structure_options_init(&defaults);
  conversion c = {.options = options ? options : &defaults,
                  .structure = structure, .molecule = molecule, .error = error};
  molecule->parameters = c.options->parameters;
  molecule->beta_ev = c.options->beta_ev;
  reset(structure);
  mho_status status = convert(&c);
  structure->linker = c.linkers.linker;
  structure->linker_count = c.linkers.count;
  c.linkers.linker = NULL;
  mho_linkers_clear(&c.linkers);
  mho_pi_clear(&c.pi);
  for (int side = 0; side < 2; side++) free(c.contact[side].atom);
  return status;
}

mho_status mho_structure_read_smiles(const char *text,
                                     const mho_structure_options *options,
                                     mho_molecule *molecule,
                                     mho_structure *structure, mho_error *error)
{
  mho_status status = mho_smiles_read(text, options ? &options->place : NULL,
                                      &structure->graph, error);
  if (status != MHO_OK) return status;
  if (!molecule->name) {
    size_t start = strspn(text, " \t\r\n");
    molecule->name = mho_print_text("%.*s", (int)strcspn(text + start, " \t\r\n"), text + start);
    if (!molecule->name) return no_memory(error);
  }
  return mho_molecule_from_graph(structure, options, molecule, error);
}
