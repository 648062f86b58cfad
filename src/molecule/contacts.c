/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <stdio.h>
#include <stdlib.h>

#include "molecule/graph.h"
#include "molecule/linker.h"

/* Linker that an atom belongs to. */
static mho_linker_kind kind_at(const mho_linkers *linkers, int atom)
{
  for (int i = 0; i < linkers->count; i++)
    for (int j = 0; j < linkers->linker[i].atom_count; j++)
      if (linkers->linker[i].atom[j] == atom) return linkers->linker[i].kind;
  return MHO_LINKER_KINDS;
}

/* `amine N1, pyridine N5`, or `none`; as much as fits. */
static const char *list_linkers(const mho_graph *graph,
                                const mho_linkers *linkers, char *buffer,
                                size_t size)
{
  size_t used = 0;
  snprintf(buffer, size, "none");
  for (int i = 0; i < linkers->count && used + 40 < size; i++) {
    char name[24];
    const mho_linker *linker = &linkers->linker[i];
    mho_graph_atom_name(graph, linker->atom[0], name, sizeof name);
    used += (size_t)snprintf(buffer + used, size - used, "%s%s %s", i ? ", " : "",
                             mho_linker_name(linker->kind), name);
    if (linker->atom_count == 2) {
      mho_graph_atom_name(graph, linker->atom[1], name, sizeof name);
      used += (size_t)snprintf(buffer + used, size - used, "+%s", name);
    }
  }
  return buffer;
}

static mho_status out_of_memory(mho_error *error)
{
  return mho_fail(error, MHO_ERR_MEMORY, MOLECULE_STAGE, NULL, "out of memory");
}

static mho_status from_classes(const mho_graph *graph,
                               const mho_linkers *linkers,
                               const mho_place *place,
                               mho_contact_atoms contact[2], mho_error *error)
{
  for (int side = 0; side < 2; side++) {
    contact[side].atom = malloc(((size_t)graph->atom_count + 1) * sizeof(int));
    if (!contact[side].atom) return out_of_memory(error);
  }
  for (int a = 0; a < graph->atom_count; a++) {
    int mark = graph->atom[a].atom_class;
    if (mark == 0) continue;
    if (mark > 2)
      return mho_fail_atom(error, MHO_ERR_CONTACTS, place, graph, a,
                             "atom class %d; 1 marks the left contact, 2 the "
                             "right one", mark);
    mho_contact_atoms *c = &contact[mark - 1];
    if (c->count == 0) c->kind = kind_at(linkers, a);
    c->atom[c->count++] = a;
  }
  for (int side = 0; side < 2; side++)
    if (contact[side].count == 0)
      return mho_fail_column(error, MHO_ERR_CONTACTS, place, 1,
                             "no atom has class %d (%s contact), but class %d "
                             "is used; mark both or none", side + 1,
                             side ? "right" : "left", 2 - side);
  return MHO_OK;
}

/* The two linkers that serve as contacts; false if there are not two. */
static bool pick_two(const mho_linkers *linkers, int chosen[2])
{
  for (int with_rings = 0; with_rings < 2; with_rings++) {
    int count = 0;
    for (int i = 0; i < linkers->count; i++) {
      if (!with_rings && linkers->linker[i].kind == MHO_LINKER_PYRIDINE) continue;
      if (count < 2) chosen[count] = i;
      count++;
    }
    if (count >= 2) return count == 2;
  }
  return false;
}

mho_status mho_contacts_choose(const mho_graph *graph,
                               const mho_linkers *linkers, bool optional,
                               const mho_place *place,
                               mho_contact_atoms contact[2], mho_error *error)
{
  contact[0] = contact[1] = (mho_contact_atoms){.kind = MHO_LINKER_KINDS};
  for (int a = 0; a < graph->atom_count; a++)
    if (graph->atom[a].atom_class)
      return from_classes(graph, linkers, place, contact, error);
  int chosen[2] = {-1, -1};
  if (!pick_two(linkers, chosen)) {
    char found[300];
    if (optional) return MHO_OK;
    return mho_fail_column(
        error, MHO_ERR_CONTACTS, place, 1,
        "two linkers are needed as contacts, found: %s; mark the contacts with "
        "atom classes, e.g. [SH:1] and [NH2:2]",
        list_linkers(graph, linkers, found, sizeof found));
  }
  for (int side = 0; side < 2; side++) {
    const mho_linker *linker = &linkers->linker[chosen[side]];
    mho_contact_atoms *c = &contact[side];
    c->atom = malloc(sizeof linker->atom);
    if (!c->atom) return out_of_memory(error);
    c->kind = linker->kind;
    for (c->count = 0; c->count < linker->atom_count; c->count++)
      c->atom[c->count] = linker->atom[c->count];
  }
  return MHO_OK;
}
