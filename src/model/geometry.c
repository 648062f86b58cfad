/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "model/geometry.h"

#include <mho/molecule.h>
#include <mho/warning.h>

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "molecule/layout.h"

#define DEGREES (180.0 / 3.14159265358979323846)
#define LINEAR_SINE 0.17       /* ten degrees off a straight line */
#define RULE_LENGTH 1.397      /* angstrom, of the rule in mho/structure.h */
#define RULE_DECAY 0.2623
#define BOND_NM 0.14           /* of an idealised geometry */
#define LONG_NM 4.0

/* --- dihedral angles ------------------------------------------------------ */

static double dot(const double *a, const double *b)
{
  return a[0] * b[0] + a[1] * b[1] + a[2] * b[2];
}

/* p axis at an atom, seen along its bond to `toward`; false in a line. */
static bool find_axis(const mho_graph *g, int atom, int toward, double axis[3])
{
  double side[3] = {0, 0, 0}, along[3];
  int found = 0;
  for (int i = g->start[atom]; i < g->start[atom + 1] && found < 2; i++) {
    int next = g->link[i].atom;
    if (next == toward) continue;
    /* One neighbour: the vector to it; two: the vector between them. */
    for (int k = 0; k < 3; k++)
      side[k] = found ? side[k] - (g->position[next][k] - g->position[atom][k])
                      : g->position[next][k] - g->position[atom][k];
    found++;
  }
  for (int k = 0; k < 3; k++) along[k] = g->position[toward][k] - g->position[atom][k];
  for (int k = 0; k < 3; k++)
    axis[k] = side[(k + 1) % 3] * along[(k + 2) % 3] - side[(k + 2) % 3] * along[(k + 1) % 3];
  double sine = sqrt(dot(axis, axis)), product = sqrt(dot(side, side) * dot(along, along));
  return found && product > 1e-6 && sine > LINEAR_SINE * product;
}

/* Goes on from `atom`, away from `from`, along a linear chain to where a p axis
 * is defined; *last is the bond by which it got there (-1: none). */
static bool find_end(const mho_graph *g, int atom, int from, double axis[3], int *last)
{
  *last = -1;
  for (int steps = 0; steps < g->atom_count; steps++) {
    if (find_axis(g, atom, from, axis)) return true;
    int next = -1;
    for (int i = g->start[atom]; i < g->start[atom + 1]; i++) {
      if (g->link[i].atom == from) continue;
      if (next >= 0) return false; /* a branch without a plane */
      next = g->link[i].atom;
      *last = g->link[i].bond;
    }
    if (next < 0) return false;
    from = atom;
    atom = next;
  }
  return false;
}

bool mho_geometry_twist(const mho_graph *graph, int bond, double *angle_deg)
{
  const int *ends = graph->bond[bond].atom;
  double axis[2][3];
  int last[2];
  for (int end = 0; end < 2; end++)
    if (!find_end(graph, ends[end], ends[!end], axis[end], &last[end])) return false;
  bool inner = last[0] >= 0 && last[1] >= 0;
  int far = last[0] >= 0 ? last[0] : last[1];
  if (inner || (far >= 0 && far < bond)) {
    *angle_deg = 0;
    return true;
  }
  double cosine = fabs(dot(axis[0], axis[1])) / sqrt(dot(axis[0], axis[0]) * dot(axis[1], axis[1]));
  *angle_deg = cosine >= 1 ? 0 : acos(cosine) * DEGREES;
  return true;
}

double mho_geometry_strength(const mho_graph *graph, int bond)
{
  double d[3];
  const int *ends = graph->bond[bond].atom;
  for (int k = 0; k < 3; k++) d[k] = graph->position[ends[0]][k] - graph->position[ends[1]][k];
  return exp(-(sqrt(dot(d, d)) - RULE_LENGTH) / RULE_DECAY);
}

/* --- length --------------------------------------------------------------- */

/* Points of the layout: atoms of the structure, or the sites themselves. */
static int point_of(const mho_molecule *m, int site)
{
  return m->graph.atom_count ? m->site_atom[site] : site;
}

static void find_centre(const mho_molecule *m, int side, const double *position, int width,
                        double centre[3])
{
  const mho_contact *c = &m->contact[side];
  centre[0] = centre[1] = centre[2] = 0;
  for (int i = 0; i < c->count; i++)
    for (int k = 0; k < width; k++)
      centre[k] += position[point_of(m, c->site[i]) * width + k] / c->count;
}

static double distance(const mho_molecule *m, const double *position, int width)
{
  double centre[2][3], d[3];
  for (int side = 0; side < 2; side++) find_centre(m, side, position, width, centre[side]);
  for (int k = 0; k < 3; k++) d[k] = centre[0][k] - centre[1][k];
  return sqrt(dot(d, d));
}

static mho_status make_graph(const mho_molecule *m, mho_layout_graph *graph, int (**bond)[2],
                             int **order)
{
  const mho_graph *g = &m->graph;
  bool structure = g->atom_count > 0;
  graph->points = structure ? g->atom_count : m->site_count;
  graph->bonds = structure ? g->bond_count : m->bond_count;
  *bond = malloc(((size_t)graph->bonds + 1) * sizeof **bond);
  *order = malloc(((size_t)graph->bonds + 1) * sizeof **order);
  if (!*bond || !*order) return MHO_ERR_MEMORY;
  for (int b = 0; b < graph->bonds; b++) {
    memcpy((*bond)[b], structure ? g->bond[b].atom : m->bond[b].site, sizeof **bond);
    (*order)[b] = structure ? g->bond[b].order : 1;
  }
  graph->bond = (const int(*)[2]) * bond;
  graph->order = *order;
  return MHO_OK;
}

/* Bonds on the shortest way between the contacts, -1 where there is none;
 * rounds over all bonds, as many as the way is long. */
static int count_steps(const mho_molecule *m, const mho_layout_graph *graph, int *depth)
{
  for (int v = 0; v < graph->points; v++) depth[v] = -1;
  for (int i = 0; i < m->contact[MHO_LEFT].count; i++)
    depth[point_of(m, m->contact[MHO_LEFT].site[i])] = 0;
  for (int step = 0;; step++) {
    for (int i = 0; i < m->contact[MHO_RIGHT].count; i++)
      if (depth[point_of(m, m->contact[MHO_RIGHT].site[i])] >= 0) return step;
    bool grown = false;
    for (int b = 0; b < graph->bonds; b++)
      for (int end = 0; end < 2; end++)
        if (depth[graph->bond[b][end]] == step && depth[graph->bond[b][!end]] < 0) {
          depth[graph->bond[b][!end]] = step + 1;
          grown = true;
        }
    if (!grown) return -1;
  }
}

/* `above`: only a length beyond that matters; others may be given as 0. */
static mho_status find_length(const mho_molecule *m, double above, double *length_nm,
                              mho_length_kind *kind)
{
  *length_nm = 0;
  *kind = MHO_LENGTH_NONE;
  if (!m->contact[MHO_LEFT].count || !m->contact[MHO_RIGHT].count) return MHO_OK;
  if (m->graph.is_3d) {
    *kind = MHO_LENGTH_COORDINATES;
    *length_nm = distance(m, m->graph.position[0], 3) / 10;
    return MHO_OK;
  }
  mho_layout_graph graph;
  int(*bond)[2], *order;
  mho_status status = make_graph(m, &graph, &bond, &order);
  int *depth = malloc(((size_t)graph.points + 1) * sizeof *depth);
  double(*position)[2] = malloc(((size_t)graph.points + 1) * sizeof *position);
  if (!depth || !position) status = MHO_ERR_MEMORY;
  int steps = status == MHO_OK ? count_steps(m, &graph, depth) : -1;
  if (steps > 0) *kind = MHO_LENGTH_IDEALISED;
  if (steps * BOND_NM > above) {
    mho_layout_kind how;
    status = mho_layout(&graph, position, &how);
    if (status == MHO_OK) *length_nm = distance(m, position[0], 2) * BOND_NM;
    if (how == MHO_LAYOUT_CIRCLE) { /* no geometry */
      *kind = MHO_LENGTH_NONE;
      *length_nm = 0;
    }
  }
  free(bond);
  free(order);
  free(depth);
  free(position);
  return status;
}

mho_status mho_molecule_length(const mho_molecule *molecule, double *length_nm,
                               mho_length_kind *kind)
{
  return find_length(molecule, 0, length_nm, kind);
}

mho_status mho_molecule_warn_length(mho_molecule *molecule)
{
  double length;
  mho_length_kind kind;
  mho_status status = find_length(molecule, LONG_NM, &length, &kind);
  if (status == MHO_OK && length > LONG_NM) molecule->warnings |= MHO_WARN_LONG;
  return status;
}
