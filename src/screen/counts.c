/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "screen/counts.h"

#include <stdlib.h>
#include <string.h>

/* Root of the group that an atom belongs to (path halving). */
static int find_root(int *parent, int atom)
{
  while (parent[atom] != atom) atom = parent[atom] = parent[parent[atom]];
  return atom;
}

/* Joins the ends of the bonds, of those in rings alone where asked; every join
 * of two groups makes one group less. */
static int count_joins(const mho_graph *graph, int *parent, bool ring_bonds)
{
  int joins = 0;
  for (int a = 0; a < graph->atom_count; a++) parent[a] = a;
  for (int b = 0; b < graph->bond_count; b++) {
    if (ring_bonds && !graph->bond[b].ring) continue;
    int first = find_root(parent, graph->bond[b].atom[0]);
    int second = find_root(parent, graph->bond[b].atom[1]);
    if (first == second) continue;
    parent[first] = second;
    joins++;
  }
  return joins;
}

static int count_ring_atoms(const mho_graph *graph)
{
  int atoms = 0;
  for (int a = 0; a < graph->atom_count; a++) {
    bool ring = false;
    for (int k = graph->start[a]; k < graph->start[a + 1]; k++)
      ring |= graph->bond[graph->link[k].bond].ring;
    atoms += ring;
  }
  return atoms;
}

static mho_linker_kind kind_of(const mho_molecule *molecule, int side)
{
  const mho_contact *contact = &molecule->contact[side];
  for (int l = 0; l < molecule->linker_count; l++)
    for (int i = 0; i < contact->count; i++) {
      if (contact->site[i] != molecule->linker[l].site) continue;
      for (int kind = 0; kind < MHO_LINKER_KINDS; kind++)
        if (!strcmp(molecule->linker[l].kind, mho_linker_name((mho_linker_kind)kind)))
          return (mho_linker_kind)kind;
    }
  return MHO_LINKER_KINDS;
}

mho_status mho_screen_count(const mho_molecule *molecule, mho_screen_quantities *out)
{
  const mho_graph *graph = &molecule->graph;
  int turning = 0;
  for (int b = 0; b < molecule->bond_count; b++) turning += molecule->bond[b].rotatable;
  mho_screen_set_value(out, MHO_SCREEN_rotatable_bonds, turning);
  mho_screen_set_value(out, MHO_SCREEN_left_linker, kind_of(molecule, MHO_LEFT));
  mho_screen_set_value(out, MHO_SCREEN_right_linker, kind_of(molecule, MHO_RIGHT));
  if (graph->atom_count == 0) return MHO_OK; /* sites without a structure */
  int *parent = malloc((size_t)graph->atom_count * sizeof *parent), heavy = 0;
  if (!parent) return MHO_ERR_MEMORY;
  for (int a = 0; a < graph->atom_count; a++) heavy += graph->atom[a].element != 1;
  mho_screen_set_value(out, MHO_SCREEN_heavy_atoms, heavy);
  mho_screen_set_value(out, MHO_SCREEN_rings,
                       graph->bond_count - count_joins(graph, parent, false));
  mho_screen_set_value(out, MHO_SCREEN_ring_systems,
                       count_ring_atoms(graph) - count_joins(graph, parent, true));
  free(parent);
  return MHO_OK;
}
