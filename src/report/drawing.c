/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * From a molecule to points and bonds in the plane; skeleton.c writes them.
 */
#include "report/drawing.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "molecule/element.h"
#include "molecule/layout.h"

static mho_status no_memory(mho_error *error)
{
  return mho_fail(error, MHO_ERR_MEMORY, "report", NULL, "out of memory");
}

/* A hydrogen at an end says nothing about a pi system. */
static bool is_shown(const mho_graph *g, int atom)
{
  return g->atom[atom].element != ELEMENT_H || g->start[atom + 1] - g->start[atom] != 1 ||
         g->atom[g->link[g->start[atom]].atom].element == ELEMENT_H;
}

static mho_status reserve(mho_drawing *d, int points, int bonds)
{
  size_t n = (size_t)points + 1, m = (size_t)bonds + 1;
  d->position = calloc(n, sizeof *d->position);
  d->point_atom = malloc(n * sizeof *d->point_atom);
  d->point_site = malloc(n * sizeof *d->point_site);
  d->site_point = malloc(((size_t)d->molecule->site_count + 1) * sizeof *d->site_point);
  d->bond = malloc(m * sizeof *d->bond);
  d->bond_order = malloc(m * sizeof *d->bond_order);
  d->bond_of = malloc(m * sizeof *d->bond_of);
  return d->position && d->point_atom && d->point_site && d->site_point && d->bond &&
                 d->bond_order && d->bond_of
             ? MHO_OK
             : MHO_ERR_MEMORY;
}

static void add_bond(mho_drawing *d, int first, int second, int order)
{
  d->bond[d->bonds][0] = first;
  d->bond[d->bonds][1] = second;
  d->bond_order[d->bonds++] = order;
}

/* Points and bonds of the structure; point[atoms] is scratch. */
static void from_structure(mho_drawing *d, int *point)
{
  const mho_graph *g = &d->molecule->graph;
  for (int a = 0; a < g->atom_count; a++) {
    point[a] = is_shown(g, a) ? d->points : -1;
    if (point[a] >= 0) d->point_atom[d->points++] = a;
  }
  for (int b = 0; b < g->bond_count; b++) {
    int first = point[g->bond[b].atom[0]], second = point[g->bond[b].atom[1]];
    if (first >= 0 && second >= 0) add_bond(d, first, second, g->bond[b].order);
  }
  for (int s = 0; s < d->molecule->site_count; s++)
    d->site_point[s] = point[d->molecule->site_atom[s]];
}

static void from_sites(mho_drawing *d)
{
  const mho_molecule *m = d->molecule;
  d->points = m->site_count;
  for (int s = 0; s < m->site_count; s++) {
    d->point_atom[s] = -1;
    d->site_point[s] = s;
  }
  for (int b = 0; b < m->bond_count; b++) add_bond(d, m->bond[b].site[0], m->bond[b].site[1], 1);
}

/* Which bond of the molecule each drawn bond is; the first of two. */
static void match_bonds(mho_drawing *d)
{
  const mho_molecule *m = d->molecule;
  for (int b = 0; b < d->bonds; b++) d->bond_of[b] = -1;
  for (int k = m->bond_count - 1; k >= 0; k--) {
    int first = d->site_point[m->bond[k].site[0]], second = d->site_point[m->bond[k].site[1]];
    for (int b = 0; b < d->bonds; b++)
      if ((d->bond[b][0] == first && d->bond[b][1] == second) ||
          (d->bond[b][0] == second && d->bond[b][1] == first))
        d->bond_of[b] = k;
  }
}

static bool contact_centre(const mho_drawing *d, int side, double centre[2])
{
  const mho_contact *c = &d->molecule->contact[side];
  centre[0] = centre[1] = 0;
  for (int i = 0; i < c->count; i++)
    for (int k = 0; k < 2; k++) centre[k] += d->position[d->site_point[c->site[i]]][k] / c->count;
  return c->count > 0;
}

/* The line from the left contact to the right one lies along x. */
static void orient(mho_drawing *d)
{
  double left[2], right[2];
  if (!contact_centre(d, MHO_LEFT, left) || !contact_centre(d, MHO_RIGHT, right)) return;
  double dx = right[0] - left[0], dy = right[1] - left[1], length = sqrt(dx * dx + dy * dy);
  if (length < 0.5) return;
  /* Contacts on one side of a molecule: only their order matters. */
  double c = dx / length, s = -dy / length;
  for (int i = 0; i < d->points; i++) {
    double x = d->position[i][0], y = d->position[i][1];
    d->position[i][0] = c * x - s * y;
    d->position[i][1] = s * x + c * y;
  }
}

mho_status mho_drawing_make(const mho_molecule *molecule, mho_drawing *drawing,
                            mho_error *error)
{
  const mho_graph *g = &molecule->graph;
  bool structure = g->atom_count > 0;
  int atoms = structure ? g->atom_count : molecule->site_count;
  *drawing = (mho_drawing){.molecule = molecule};
  mho_status status = reserve(drawing, atoms, structure ? g->bond_count : molecule->bond_count);
  int *point = malloc(((size_t)atoms + 1) * sizeof *point);
  if (!point) status = MHO_ERR_MEMORY;
  if (status == MHO_OK) {
    if (structure) from_structure(drawing, point);
    else from_sites(drawing);
    for (int i = 0; i < drawing->points; i++) drawing->point_site[i] = -1;
    for (int s = molecule->site_count - 1; s >= 0; s--)
      drawing->point_site[drawing->site_point[s]] = s;
    match_bonds(drawing);
    mho_layout_graph graph = {drawing->points, drawing->bonds,
                              (const int(*)[2])drawing->bond, drawing->bond_order};
    status = mho_layout(&graph, drawing->position, NULL);
  }
  free(point);
  if (status != MHO_OK) return no_memory(error);
  orient(drawing);
  for (int i = 0; i < drawing->points; i++) /* the same on every machine, no -0 */
    for (int k = 0; k < 2; k++)
      drawing->position[i][k] = round(drawing->position[i][k] * 1e6) / 1e6 + 0.0;
  return MHO_OK;
}

void mho_drawing_clear(mho_drawing *d)
{
  free(d->position);
  free(d->point_atom);
  free(d->point_site);
  free(d->site_point);
  free(d->bond);
  free(d->bond_order);
  free(d->bond_of);
  *d = (mho_drawing){0};
}
