/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Each linker is a small pattern around one atom.  Two rules keep chains from
 * being taken for ends: a ring sulfur is never a linker, and a sulfur or NH
 * between two groups counts only where exactly one of them leads to a pi
 * system (Ar-S-CH3 is a linker, Ar-S-Ar is not).
 */
#include "molecule/linker.h"

#include <stdlib.h>
#include <string.h>

#include "molecule/element.h"

static const struct {
  const char *name;
  double coupling_ev;
} linker_table[] = {
#define LINKER_ROW(code, name, coupling) {name, coupling},
    MHO_LINKER_LIST(LINKER_ROW)
#undef LINKER_ROW
    {"other", 0.5},
};

const char *mho_linker_name(mho_linker_kind kind)
{
  return linker_table[kind].name;
}

double mho_linker_coupling_ev(mho_linker_kind kind)
{
  return linker_table[kind].coupling_ev;
}

typedef struct {
  const mho_graph *graph;
  mho_linkers *found;
  int *queue; /* [atoms] of the walk */
  int *seen;  /* [atoms] its stamps */
  int walk;
} finder;

/* Neighbour i of an atom (from graph->start) with its bond. */
#define EACH_LINK(g, a, i) \
  (int i = (g)->start[a]; i < (g)->start[(a) + 1]; i++)

static int element_of(const mho_graph *g, int atom)
{
  return g->atom[atom].element;
}

static bool is_unsaturated(const mho_graph *g, int atom)
{
  for EACH_LINK(g, atom, i)
    if (g->bond[g->link[i].bond].order > 1) return true;
  return false;
}

static bool in_ring(const mho_graph *g, int atom)
{
  for EACH_LINK(g, atom, i)
    if (g->bond[g->link[i].bond].ring) return true;
  return false;
}

/* Neighbours other than hydrogen and gold. */
static int bonded(const mho_graph *g, int atom)
{
  int count = 0;
  for EACH_LINK(g, atom, i) {
    int element = element_of(g, g->link[i].atom);
    count += element != ELEMENT_H && element != ELEMENT_AU;
  }
  return count;
}

/* Carbon that carries a multiple bond to N, O or S outside a ring. */
static bool is_acyl(const mho_graph *g, int atom)
{
  for EACH_LINK(g, atom, i) {
    const mho_graph_bond *b = &g->bond[g->link[i].bond];
    int element = element_of(g, g->link[i].atom);
    if (b->order > 1 && !b->ring &&
        (element == ELEMENT_N || element == ELEMENT_O || element == ELEMENT_S))
      return true;
  }
  return false;
}

/* The atom bonded to `atom` with this order and element, or -1. */
static int partner(const mho_graph *g, int atom, int order, int element)
{
  for EACH_LINK(g, atom, i)
    if (g->bond[g->link[i].bond].order == order &&
        element_of(g, g->link[i].atom) == element)
      return g->link[i].atom;
  return -1;
}

static bool touches_gold(const mho_graph *g, int atom)
{
  return partner(g, atom, 1, ELEMENT_AU) >= 0;
}

/* Does the branch that begins at `from`, seen from `back`, hold a pi bond? */
static bool leads_to_pi(finder *f, int from, int back)
{
  const mho_graph *g = f->graph;
  int head = 0, tail = 0;
  f->walk++;
  f->seen[back] = f->seen[from] = f->walk;
  f->queue[tail++] = from;
  while (head < tail) {
    int atom = f->queue[head++];
    if (is_unsaturated(g, atom)) return true;
    for EACH_LINK(g, atom, i) {
      int next = g->link[i].atom;
      if (f->seen[next] == f->walk) continue;
      f->seen[next] = f->walk;
      f->queue[tail++] = next;
    }
  }
  return false;
}

/* A sulfur or nitrogen at an end: its neighbours are carbons, none acyl, and
 * of two of them one leads to a pi system. */
static bool is_terminal(finder *f, int atom)
{
  const mho_graph *g = f->graph;
  int carbons = 0, leading = 0;
  for EACH_LINK(g, atom, i) {
    int next = g->link[i].atom;
    if (element_of(g, next) == ELEMENT_H || element_of(g, next) == ELEMENT_AU) continue;
    if (element_of(g, next) != ELEMENT_C || is_acyl(g, next)) return false;
    carbons++;
    leading += leads_to_pi(f, next, atom);
  }
  return carbons == 1 || (carbons == 2 && leading == 1);
}

/* Acetyl carbon bonded to a sulfur, or -1. */
static int acetyl_of(const mho_graph *g, int sulfur)
{
  for EACH_LINK(g, sulfur, i) {
    int carbon = g->link[i].atom;
    if (element_of(g, carbon) != ELEMENT_C || bonded(g, carbon) != 3) continue;
    int methyl = partner(g, carbon, 1, ELEMENT_C);
    if (partner(g, carbon, 2, ELEMENT_O) >= 0 && methyl >= 0 &&
        mho_graph_hydrogens(g, methyl) == 3)
      return carbon;
  }
  return -1;
}

static mho_linker_kind sulfur_kind(finder *f, int atom)
{
  const mho_graph *g = f->graph;
  const mho_graph_atom *a = &g->atom[atom];
  if (in_ring(g, atom) || is_unsaturated(g, atom)) return MHO_LINKER_KINDS;
  int neighbours = bonded(g, atom);
  if (neighbours == 1 && is_terminal(f, atom)) {
    if (a->charge == -1) return MHO_LINKER_THIOLATE;
    return a->charge == 0 ? MHO_LINKER_THIOL : MHO_LINKER_KINDS;
  }
  if (neighbours != 2 || a->charge) return MHO_LINKER_KINDS;
  int acetyl = acetyl_of(g, atom);
  if (acetyl >= 0) {
    int oxygen = partner(g, acetyl, 2, ELEMENT_O);
    f->found->removed[acetyl] = f->found->removed[oxygen] = true;
    f->found->removed[partner(g, acetyl, 1, ELEMENT_C)] = true;
    return MHO_LINKER_THIOACETATE;
  }
  return is_terminal(f, atom) ? MHO_LINKER_THIOETHER : MHO_LINKER_KINDS;
}

static mho_linker_kind nitrogen_kind(finder *f, int atom)
{
  const mho_graph *g = f->graph;
  if (g->atom[atom].charge || g->atom[atom].radical) return MHO_LINKER_KINDS;
  int hydrogens = mho_graph_hydrogens(g, atom);
  if (!is_unsaturated(g, atom))
    return hydrogens && !in_ring(g, atom) && is_terminal(f, atom)
               ? MHO_LINKER_AMINE
               : MHO_LINKER_KINDS;
  if (hydrogens == 0 && bonded(g, atom) == 2 && in_ring(g, atom) &&
      partner(g, atom, 1, ELEMENT_AU) < 0)
    return MHO_LINKER_PYRIDINE;
  int carbon = partner(g, atom, 3, ELEMENT_C);
  return bonded(g, atom) == 1 && carbon >= 0 && bonded(g, carbon) == 2
             ? MHO_LINKER_NITRILE
             : MHO_LINKER_KINDS;
}

static mho_linker_kind carbon_kind(finder *f, int atom)
{
  const mho_graph *g = f->graph;
  const mho_graph_atom *a = &g->atom[atom];
  if (touches_gold(g, atom)) return MHO_LINKER_GOLD_CARBON;
  if (bonded(g, atom) != 1) return MHO_LINKER_KINDS;
  int nitrogen = partner(g, atom, 3, ELEMENT_N);
  if (a->charge == -1 && nitrogen >= 0 && g->atom[nitrogen].charge == 1)
    return MHO_LINKER_ISONITRILE;
  int carbon = partner(g, atom, 3, ELEMENT_C);
  return a->charge == 0 && carbon >= 0 && bonded(g, carbon) == 2
             ? MHO_LINKER_ETHYNYL
             : MHO_LINKER_KINDS;
}

/* Carboxyl and nitro: two oxygens that end at the centre, one of them doubly
 * bonded; fills linker->atom. */
static mho_linker_kind oxygen_pair_kind(const mho_graph *g, int centre,
                                        mho_linker *linker)
{
  int count = 0, doubles = 0, others = 0;
  for EACH_LINK(g, centre, i) {
    int next = g->link[i].atom;
    if (element_of(g, next) == ELEMENT_H) continue;
    if (element_of(g, next) != ELEMENT_O || bonded(g, next) != 1) {
      others += element_of(g, next) == ELEMENT_C ? 1 : 2;
      continue;
    }
    if (count < 2) linker->atom[count] = next;
    count++;
    doubles += g->bond[g->link[i].bond].order == 2;
  }
  if (count != 2 || others != 1) return MHO_LINKER_KINDS;
  linker->atom_count = 2;
  const mho_graph_atom *a = &g->atom[centre];
  if (a->element == ELEMENT_C) return doubles == 1 ? MHO_LINKER_CARBOXYL : MHO_LINKER_KINDS;
  return (doubles == 1 && a->charge == 1) || (doubles == 2 && a->charge == 0)
             ? MHO_LINKER_NITRO
             : MHO_LINKER_KINDS;
}

static mho_linker_kind kind_of(finder *f, int atom, mho_linker *linker)
{
  mho_linker_kind kind = MHO_LINKER_KINDS;
  *linker = (mho_linker){.atom_count = 1, .atom = {atom, -1}};
  switch (element_of(f->graph, atom)) {
    case ELEMENT_S: return sulfur_kind(f, atom);
    case ELEMENT_N: kind = nitrogen_kind(f, atom); break;
    case ELEMENT_C: kind = carbon_kind(f, atom); break;
    default: return kind;
  }
  return kind == MHO_LINKER_KINDS ? oxygen_pair_kind(f->graph, atom, linker)
                                  : kind;
}

mho_status mho_linkers_find(const mho_graph *graph, mho_linkers *linkers)
{
  size_t n = (size_t)graph->atom_count;
  *linkers = (mho_linkers){0};
  linkers->removed = calloc(n + 1, sizeof *linkers->removed);
  linkers->linker = malloc((n + 1) * sizeof *linkers->linker);
  int *memory = calloc(2 * n + 1, sizeof *memory);
  finder f = {graph, linkers, memory, memory ? memory + n : NULL, 0};
  bool ready = linkers->removed && linkers->linker && memory;
  for (int a = 0; ready && a < graph->atom_count; a++) {
    if (element_of(graph, a) == ELEMENT_AU) linkers->removed[a] = true;
    mho_linker *next = &linkers->linker[linkers->count];
    next->kind = kind_of(&f, a, next);
    linkers->count += next->kind != MHO_LINKER_KINDS;
  }
  free(memory);
  if (!ready) mho_linkers_clear(linkers);
  return ready ? MHO_OK : MHO_ERR_MEMORY;
}

void mho_linkers_clear(mho_linkers *linkers)
{
  free(linkers->linker);
  free(linkers->removed);
  *linkers = (mho_linkers){0};
}
