/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Formal alternation and rotatable bonds of a pi system.
 *
 * A bond outside the rings is formally double (or single) when every Kekule
 * structure makes it so.  Kekule structures are the maximum matchings of the
 * atoms that share pi bonds.  No alternating cycle runs through a bridge, so
 * another matching can change it only along an alternating path that ends at
 * a free atom; by the theorem of Gallai and Edmonds (L. Lovasz, M. D.
 * Plummer, Matching Theory, 1986, chapter 3) that is the case exactly if one
 * of its atoms is missed by some maximum matching.
 */
#include <stdlib.h>
#include <string.h>

#include "molecule/element.h"
#include "molecule/graph.h"
#include "molecule/matching.h"
#include "molecule/pi.h"

#define SINGLE_STRENGTH 0.9
#define DOUBLE_STRENGTH 1.1

enum { RING_SIZE_LIMIT = 8, RING_WALK_LIMIT = 512 };

typedef enum { ORDER_OPEN, ORDER_SINGLE, ORDER_DOUBLE } formal_order;

typedef struct {
  const mho_graph *graph;
  mho_pi *pi;
  int *mate, *start, *next;
  char *order; /* [bonds] formal_order */
  int *part;   /* union-find: atoms that turn as one */
  int *size;   /* sites of a part, at its root */
  int *joints; /* single bonds that leave a part, at its root */
  bool *shares; /* the site shares pi bonds */
  bool *missed;
} bond_finder;

/* Carbon, or an atom with a multiple bond.  The nitrogen of a nitro group or
 * an N-oxide counts by its other double bond, its oxygens not at all. */
static bool shares_pi_bonds(const mho_graph *g, const mho_pi_site *site)
{
  if (g->atom[site->atom].element == ELEMENT_C) return true;
  if (site->electrons != (site->oxide ? 2 : 1)) return false;
  for (int i = g->start[site->atom]; i < g->start[site->atom + 1]; i++)
    if (g->bond[g->link[i].bond].order > 1 &&
        !(site->oxide && g->atom[g->link[i].atom].element == ELEMENT_O))
      return true;
  return false;
}

static mho_status match_sites(bond_finder *f)
{
  mho_pi *pi = f->pi;
  int n = pi->site_count;
  memset(f->start, 0, ((size_t)n + 1) * sizeof *f->start);
  for (int s = 0; s < n; s++) {
    f->shares[s] = shares_pi_bonds(f->graph, &pi->site[s]);
    f->mate[s] = -1;
  }
  for (int b = 0; b < pi->bond_count; b++) {
    const int *s = pi->bond[b].site;
    if (!f->shares[s[0]] || !f->shares[s[1]]) continue;
    f->start[s[0]]++;
    f->start[s[1]]++;
  }
  for (int s = 1; s <= n; s++) f->start[s] += f->start[s - 1];
  for (int b = 0; b < pi->bond_count; b++) {
    const int *s = pi->bond[b].site;
    if (!f->shares[s[0]] || !f->shares[s[1]]) continue;
    f->next[--f->start[s[0]]] = s[1];
    f->next[--f->start[s[1]]] = s[0];
    /* The Kekule structure at hand is the start. */
    if (f->graph->bond[pi->bond[b].bond].order > 1 && f->mate[s[0]] < 0 && f->mate[s[1]] < 0) {
      f->mate[s[0]] = s[1];
      f->mate[s[1]] = s[0];
    }
  }
  mho_match_graph sites = {n, f->start, f->next};
  return mho_match_maximum(&sites, f->mate, f->missed);
}

/* Order that a bond has in every Kekule structure; open in rings and in the
 * N-O pairs of nitro groups and N-oxides. */
static formal_order order_of(const bond_finder *f, const mho_pi_bond *bond)
{
  const int *s = bond->site;
  if (f->graph->bond[bond->bond].ring) return ORDER_OPEN;
  if (!f->shares[s[0]] || !f->shares[s[1]]) {
    const mho_pi_site *first = &f->pi->site[s[0]], *second = &f->pi->site[s[1]];
    bool lone_pair = first->electrons != 1 || second->electrons != 1;
    bool pair = first->oxide && second->oxide;
    return lone_pair && !pair ? ORDER_SINGLE : ORDER_OPEN;
  }
  if (f->missed[s[0]] || f->missed[s[1]]) return ORDER_OPEN;
  return f->mate[s[0]] == s[1] ? ORDER_DOUBLE : ORDER_SINGLE;
}

int mho_pi_ring_size(const mho_graph *graph, const mho_pi *pi, int atom)
{
  int queue[RING_WALK_LIMIT], from[RING_WALK_LIMIT], depth[RING_WALK_LIMIT];
  int head = 0, tail = 1;
  queue[0] = atom;
  from[0] = -1;
  depth[0] = 0;
  /* Walks without turning back, shortest first, until one comes home. */
  while (head < tail) {
    int at = head++;
    if (depth[at] == RING_SIZE_LIMIT) return 0;
    for (int i = graph->start[queue[at]]; i < graph->start[queue[at] + 1]; i++) {
      mho_graph_link link = graph->link[i];
      if (!graph->bond[link.bond].ring || link.bond == from[at]) continue;
      if (link.atom == atom) return depth[at] + 1;
      if (pi->site_of[link.atom] < 0 || tail == RING_WALK_LIMIT) continue;
      queue[tail] = link.atom;
      from[tail] = link.bond;
      depth[tail++] = depth[at] + 1;
    }
  }
  return 0;
}

static int root_of(int *part, int s)
{
  while (part[s] != s) s = part[s] = part[part[s]];
  return s;
}

/* A part has a plane that can turn: two sites or more, or one atom between
 * others; a linear end (ethynyl, nitrile) has none. */
static bool can_turn(const bond_finder *f, int site)
{
  int root = root_of(f->part, site);
  if (f->size[root] == 1) return f->joints[root] > 1;
  if (f->joints[root] > 1) return true;
  const mho_pi_site *s = &f->pi->site[site];
  for (int i = f->graph->start[s->atom]; i < f->graph->start[s->atom + 1]; i++)
    if (f->graph->bond[f->graph->link[i].bond].order == 3) return false;
  return true;
}

static void find_parts(bond_finder *f)
{
  mho_pi *pi = f->pi;
  for (int s = 0; s < pi->site_count; s++) {
    f->part[s] = s;
    f->size[s] = f->joints[s] = 0;
  }
  for (int b = 0; b < pi->bond_count; b++) {
    const int *s = pi->bond[b].site;
    f->order[b] = (char)order_of(f, &pi->bond[b]);
    if (f->order[b] != ORDER_SINGLE)
      f->part[root_of(f->part, s[0])] = root_of(f->part, s[1]);
  }
  for (int s = 0; s < pi->site_count; s++) f->size[root_of(f->part, s)]++;
  for (int b = 0; b < pi->bond_count; b++)
    for (int end = 0; end < 2; end++)
      if (f->order[b] == ORDER_SINGLE)
        f->joints[root_of(f->part, pi->bond[b].site[end])]++;
}

static double strength_of(const bond_finder *f, const mho_pi_bond *bond,
                          formal_order order)
{
  const int *ends = f->graph->bond[bond->bond].atom;
  for (int end = 0; end < 2; end++)
    if (f->graph->atom[ends[end]].element != ELEMENT_C) return 1.0;
  if (order == ORDER_DOUBLE) return DOUBLE_STRENGTH;
  if (order == ORDER_OPEN) return 1.0;
  bool aryl = mho_pi_ring_size(f->graph, f->pi, ends[0]) &&
              mho_pi_ring_size(f->graph, f->pi, ends[1]);
  return aryl ? 1.0 : SINGLE_STRENGTH;
}

static void describe(bond_finder *f)
{
  for (int b = 0; b < f->pi->bond_count; b++) {
    mho_pi_bond *bond = &f->pi->bond[b];
    if (f->graph->bond[bond->bond].ring) continue;
    formal_order order = (formal_order)f->order[b];
    bond->strength = strength_of(f, bond, order);
    bond->rotatable = order == ORDER_SINGLE && can_turn(f, bond->site[0]) &&
                      can_turn(f, bond->site[1]);
    if (!bond->rotatable) continue;
    const int *atom = f->graph->bond[bond->bond].atom;
    bond->twist_deg = mho_torsion_estimate(f->graph, f->pi, atom, &bond->reason);
    bond->kind = mho_torsion_kind(f->graph, f->pi, atom);
  }
}

mho_status mho_pi_find_bonds(const mho_graph *graph, mho_pi *pi,
                             mho_error *error)
{
  size_t n = (size_t)pi->site_count, m = (size_t)pi->bond_count;
  int *memory = malloc((5 * n + 1 + 2 * m) * sizeof *memory + 1);
  bool *flags = malloc(2 * n + m + 1);
  mho_status status = memory && flags ? MHO_OK : MHO_ERR_MEMORY;
  if (status == MHO_OK) {
    bond_finder f = {.graph = graph, .pi = pi, .mate = memory,
                     .part = memory + n, .size = memory + 2 * n,
                     .joints = memory + 3 * n, .start = memory + 4 * n,
                     .next = memory + 5 * n + 1, .shares = flags,
                     .missed = flags + n, .order = (char *)(flags + 2 * n)};
    status = match_sites(&f);
    if (status == MHO_OK) {
      find_parts(&f);
      describe(&f);
    }
  }
  free(memory);
  free(flags);
  if (status != MHO_OK) mho_fail(error, status, MOLECULE_STAGE, NULL, "out of memory");
  return status;
}
