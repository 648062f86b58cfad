/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * From an aromatic spelling to one Kekule structure, and from bonds to
 * hydrogens.  An aromatic atom whose usual valence exceeds its sigma bonds
 * needs one double bond in the ring; all of them must be paired by a perfect
 * matching over aromatic ring bonds.  What cannot be paired is an error: a
 * ring is never saturated to make it fit.
 */
#include "molecule/graph.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "molecule/element.h"
#include "molecule/matching.h"

enum { NAME_SIZE = 16 };

/* Bond orders, written hydrogens and radicals at an atom. */
static int used_valence(const mho_graph *graph, int atom)
{
  int used = graph->atom[atom].hydrogens + graph->atom[atom].radical;
  for (int i = graph->start[atom]; i < graph->start[atom + 1]; i++)
    used += graph->bond[graph->link[i].bond].order;
  return used;
}

/* Usual valence of an atom for its bonds.  Five bonds at a neutral nitrogen
 * are how some write a nitro group, an N-oxide, an azide or a diazo group;
 * without N=O or N#N they are a mistake. */
static int valence_of(const mho_graph *graph, int atom, int used)
{
  const mho_graph_atom *a = &graph->atom[atom];
  if (a->element == ELEMENT_N && a->charge == 0 && used > 3) {
    bool five = false;
    for (int i = graph->start[atom]; i < graph->start[atom + 1]; i++) {
      int order = graph->bond[graph->link[i].bond].order;
      int element = graph->atom[graph->link[i].atom].element;
      five |= (order == 2 && element == ELEMENT_O) || (order == 3 && element == ELEMENT_N);
    }
    if (!five || a->hydrogens) return -1;
  }
  return mho_element_valence(a->element, a->charge, used);
}

static mho_status fail_valence(const mho_graph *graph, int atom, int used,
                               const mho_place *place, mho_error *error)
{
  char name[NAME_SIZE];
  mho_graph_atom_name(graph, atom, name, sizeof name);
  const mho_graph_atom *a = &graph->atom[atom];
  int most = 0;
  for (int v = 0; v <= used; v++)
    if (valence_of(graph, atom, v) > most) most = valence_of(graph, atom, v);
  return mho_fail_atom(error, MHO_ERR_SYNTAX, place, graph, atom,
                         "%s has %d bonds; %s with charge %+d forms at most %d",
                         name, used, mho_element_symbol(a->element), a->charge,
                         most);
}

/* Bonds that an atom marked aromatic still has to form; -1 where it has too
 * many already. */
static int open_valence(const mho_graph *graph, int atom)
{
  int used = used_valence(graph, atom);
  int valence = valence_of(graph, atom, used);
  return valence < 0 ? -1 : valence - used;
}

static mho_status fail_kekule(const mho_graph *graph, int atom,
                              const mho_place *place, mho_error *error)
{
  char name[NAME_SIZE], nitrogen[NAME_SIZE] = "";
  mho_graph_atom_name(graph, atom, name, sizeof name);
  for (int a = 0; a < graph->atom_count && !nitrogen[0]; a++)
    if (graph->atom[a].aromatic && graph->atom[a].element == ELEMENT_N &&
        !graph->atom[a].bracket && mho_graph_degree(graph, a) == 2)
      mho_graph_atom_name(graph, a, nitrogen, sizeof nitrogen);
  return mho_fail_atom(
      error, MHO_ERR_SYNTAX, place, graph, atom,
      "no Kekule structure: the aromatic atom %s finds no partner for a double "
      "bond%s%s%s",
      name, nitrogen[0] ? "; a ring nitrogen that bears a hydrogen (" : "",
      nitrogen,
      !nitrogen[0]              ? ""
      : place && place->record ? "?) needs it as an atom, or single and double bonds"
                                : "?) is written [nH]");
}

/* Marks in `open` the aromatic atoms that need a double bond. */
static mho_status find_open_atoms(const mho_graph *graph, bool *open,
                                  const mho_place *place, mho_error *error)
{
  for (int a = 0; a < graph->atom_count; a++) {
    open[a] = false;
    if (!graph->atom[a].aromatic) continue;
    bool ring = false;
    for (int i = graph->start[a]; i < graph->start[a + 1]; i++)
      ring |= graph->bond[graph->link[i].bond].ring;
    if (!ring)
      return mho_fail_atom(
          error, MHO_ERR_SYNTAX, place, graph, a,
          "an aromatic atom stands outside a ring; write it as a capital "
          "letter");
    int left = open_valence(graph, a);
    if (left < 0)
      return fail_valence(graph, a, used_valence(graph, a), place, error);
    open[a] = left > 0;
  }
  return MHO_OK;
}

static bool is_candidate(const mho_graph *graph, const bool *open, int bond)
{
  const mho_graph_bond *b = &graph->bond[bond];
  return b->aromatic && b->ring && open[b->atom[0]] && open[b->atom[1]];
}

/* Pairs the open atoms; memory [2 * atoms + 1 + 2 * bonds]. */
static mho_status pair_open_atoms(mho_graph *graph, const bool *open,
                                  int *memory, const mho_place *place,
                                  mho_error *error)
{
  int n = graph->atom_count, count = 0;
  int *mate = memory, *start = memory + n, *next = memory + 2 * n + 1;
  for (int a = 0; a < n; a++) {
    start[a] = count;
    mate[a] = -1;
    for (int i = graph->start[a]; i < graph->start[a + 1]; i++)
      if (is_candidate(graph, open, graph->link[i].bond))
        next[count++] = graph->link[i].atom;
  }
  start[n] = count;
  /* Only open atoms take part: closed ones have no candidate bonds and would
   * end the search, so they are given a mate of their own. */
  for (int a = 0; a < n; a++)
    if (!open[a]) mate[a] = a;
  mho_match_graph candidates = {n, start, next};
  if (mho_match_maximum(&candidates, mate, NULL) != MHO_OK)
    return mho_fail(error, MHO_ERR_MEMORY, MOLECULE_STAGE, NULL, "out of memory");
  for (int a = 0; a < n; a++)
    if (mate[a] < 0) return fail_kekule(graph, a, place, error);
  for (int b = 0; b < graph->bond_count; b++)
    if (is_candidate(graph, open, b) &&
        mate[graph->bond[b].atom[0]] == graph->bond[b].atom[1])
      graph->bond[b].order = 2;
  return MHO_OK;
}

/* Hydrogens that a bare symbol implies, valences that a bracket leaves open. */
static mho_status count_hydrogens(mho_graph *graph, const mho_place *place,
                                  mho_error *error)
{
  for (int a = 0; a < graph->atom_count; a++) {
    mho_graph_atom *atom = &graph->atom[a];
    int used = used_valence(graph, a);
    int valence = valence_of(graph, a, used);
    if (valence < 0) return fail_valence(graph, a, used, place, error);
    if (atom->bracket) atom->radical += valence - used;
    else if (!(atom->aromatic && atom->element != ELEMENT_C &&
               atom->element != ELEMENT_B))
      atom->hydrogens = valence - used;
    else
      atom->radical += valence - used;
  }
  return MHO_OK;
}

mho_status mho_graph_kekulise(mho_graph *graph, const mho_place *place,
                              mho_error *error)
{
  size_t n = (size_t)graph->atom_count, m = (size_t)graph->bond_count;
  bool aromatic = false;
  for (size_t a = 0; a < n; a++) aromatic |= graph->atom[a].aromatic;
  mho_status status = MHO_OK;
  if (aromatic) {
    bool *open = malloc(n * sizeof *open);
    int *memory = malloc((2 * n + 1 + 2 * m) * sizeof *memory);
    if (!open || !memory)
      status = mho_fail(error, MHO_ERR_MEMORY, MOLECULE_STAGE, NULL, "out of memory");
    if (status == MHO_OK) status = find_open_atoms(graph, open, place, error);
    if (status == MHO_OK)
      status = pair_open_atoms(graph, open, memory, place, error);
    free(open);
    free(memory);
  }
  return status == MHO_OK ? count_hydrogens(graph, place, error) : status;
}
