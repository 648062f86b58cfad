/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Counting of pi electrons: A. Streitwieser, Molecular Orbital Theory for
 * Organic Chemists (1961), chapter 5: an atom of a double bond brings one, a
 * lone pair beside a pi system two, an empty p orbital none.
 *
 * Rules for what is written with charges:
 * - N+ bonded to O- (nitro, N-oxide, nitrone), or written N=O with five
 *   bonds, is counted without charges: N brings two (N-pyrrole), each O one
 *   (O-carbonyl).  The number of electrons is the same.
 * - Isonitrile: N and C bring one each, as in the nitrile.
 * - Thiolate, also written with an open valence, is the thiol without its
 *   hydrogen (two electrons, S-thiophene), and a carboxylate the acid.
 * - C+, C- and carbon radicals are carbon with 0, 2 and 1 electrons.
 * - Every other charged atom has a row of its own: `N+`, `O-`, `S+` ...
 */
#include "molecule/orbital.h"

#include <stdio.h>
#include <string.h>

#include "molecule/element.h"

typedef struct {
  int connections; /* sigma neighbours, hydrogens included */
  int valence;     /* sum of bond orders */
  int doubles, triples;
} bonding;

static bonding bonding_of(const mho_graph *g, const bool *removed, int atom)
{
  bonding b = {g->atom[atom].hydrogens, g->atom[atom].hydrogens, 0, 0};
  for (int i = g->start[atom]; i < g->start[atom + 1]; i++) {
    if (removed && removed[g->link[i].atom]) continue;
    int order = g->bond[g->link[i].bond].order;
    b.connections++;
    b.valence += order;
    b.doubles += order == 2;
    b.triples += order >= 3;
  }
  return b;
}

static mho_orbital no_orbital(void)
{
  return (mho_orbital){.kind = ORBITAL_NONE};
}

static mho_orbital row_orbital(mho_orbital_kind kind, int electrons,
                               const char *row)
{
  mho_orbital orbital = {.kind = kind, .electrons = electrons};
  memcpy(orbital.row, row, strlen(row) + 1); /* a literal of this file */
  return orbital;
}

static mho_orbital refused(const char *reason)
{
  return (mho_orbital){.kind = ORBITAL_REFUSED, .reason = reason};
}

/* Row of a charged or further atom: `N+`, `O-`, `Br`. */
static mho_orbital named(const mho_graph *g, int atom, mho_orbital_kind kind,
                         int electrons)
{
  mho_orbital orbital = {.kind = kind, .electrons = electrons};
  int charge = g->atom[atom].charge;
  const char *sign = charge > 1 ? "++" : charge == 1 ? "+" : charge == -1 ? "-" : "--";
  snprintf(orbital.row, sizeof orbital.row, "%s%s",
           mho_element_symbol(g->atom[atom].element), charge ? sign : "");
  return orbital;
}

/* Neighbour of that element and charge, or -1. */
static int charged_neighbour(const mho_graph *g, int atom, int element,
                             int charge)
{
  for (int i = g->start[atom]; i < g->start[atom + 1]; i++) {
    const mho_graph_atom *a = &g->atom[g->link[i].atom];
    if (a->element == element && a->charge == charge) return g->link[i].atom;
  }
  return -1;
}

/* N+ that is bonded to exactly one O- and to nothing else charged, or N with
 * five bonds one of which is N=O. */
static bool is_oxide_nitrogen(const mho_graph *g, int atom)
{
  const mho_graph_atom *a = &g->atom[atom];
  if (a->element != ELEMENT_N) return false;
  int minus = 0, oxo = 0, valence = a->hydrogens, doubles = 0;
  for (int i = g->start[atom]; i < g->start[atom + 1]; i++) {
    const mho_graph_atom *next = &g->atom[g->link[i].atom];
    int order = g->bond[g->link[i].bond].order;
    minus += next->charge == -1 ? (next->element == ELEMENT_O ? 1 : 2) : 0;
    oxo += next->element == ELEMENT_O && order == 2;
    valence += order;
    doubles += order == 2;
  }
  if (a->charge == 1) return minus == 1 && doubles == 1;
  return a->charge == 0 && valence == 5 && oxo >= 1 && doubles == 2;
}

static mho_orbital carbon(const mho_graph *g, int atom, bonding b)
{
  const mho_graph_atom *a = &g->atom[atom];
  if (b.doubles || b.triples) {
    mho_orbital orbital = row_orbital(ORBITAL_OWN, 1, "C");
    orbital.sp = b.triples || b.doubles == 2;
    return orbital;
  }
  if (a->charge == 0 && a->radical == 0) return no_orbital();
  if (a->charge == 0 && a->radical == 1) return row_orbital(ORBITAL_OWN, 1, "C");
  if (a->charge == 1 && a->radical == 0) return row_orbital(ORBITAL_OWN, 0, "C");
  if (a->charge == -1 && a->radical == 0) return row_orbital(ORBITAL_OWN, 2, "C");
  return refused("a carbon with several open valences");
}

static mho_orbital nitrogen(const mho_graph *g, int atom, bonding b)
{
  const mho_graph_atom *a = &g->atom[atom];
  if (is_oxide_nitrogen(g, atom)) {
    mho_orbital orbital = row_orbital(ORBITAL_OWN, 2, "N-pyrrole");
    orbital.oxide = true;
    return orbital;
  }
  bool unsaturated = b.doubles || b.triples;
  mho_orbital orbital = no_orbital();
  if (a->charge == 0 && b.valence <= 3) {
    if (unsaturated || a->radical == 1)
      orbital = row_orbital(ORBITAL_OWN, 1, "N-pyridine");
    else if (a->radical == 0)
      orbital = row_orbital(ORBITAL_LENT, 2, "N-pyrrole");
    else
      orbital = refused("a nitrogen with several open valences");
  } else if (a->charge == 0) {
    orbital = refused("a nitrogen with five bonds");
  } else if (a->charge == 1 && b.triples &&
             charged_neighbour(g, atom, ELEMENT_C, -1) >= 0) {
    orbital = row_orbital(ORBITAL_OWN, 1, "N-pyridine");
    orbital.bound = true;
  } else if (a->charge == 1 && !unsaturated && a->radical == 0) {
    return orbital; /* ammonium */
  } else if (a->charge == 1) {
    orbital = named(g, atom, ORBITAL_OWN, 1);
  } else {
    orbital = named(g, atom, unsaturated ? ORBITAL_OWN : ORBITAL_LENT,
                    unsaturated ? 1 : 2);
  }
  orbital.sp = b.triples || b.doubles == 2;
  return orbital;
}

/* Oxygen of a nitro group or an N-oxide: all its bonds go to such a nitrogen. */
static bool is_oxide_oxygen(const mho_graph *g, int oxygen)
{
  return g->start[oxygen + 1] == g->start[oxygen] + 1 &&
         is_oxide_nitrogen(g, g->link[g->start[oxygen]].atom) &&
         (g->atom[oxygen].charge == -1 || g->bond[g->link[g->start[oxygen]].bond].order == 2);
}

/* O- of a carboxylate: its carbon carries a doubly bonded oxygen. */
static bool is_carboxylate(const mho_graph *g, int oxygen)
{
  int carbon = g->link[g->start[oxygen]].atom;
  if (g->atom[carbon].element != ELEMENT_C) return false;
  for (int i = g->start[carbon]; i < g->start[carbon + 1]; i++)
    if (g->atom[g->link[i].atom].element == ELEMENT_O &&
        g->bond[g->link[i].bond].order == 2)
      return true;
  return false;
}

/* The oxygen of a sulfone, a phosphine oxide, a perchlorate: its second bond
 * is drawn, but no pi bond between p orbitals. */
static bool is_hypervalent_oxo(const mho_graph *g, int oxygen)
{
  for (int i = g->start[oxygen]; i < g->start[oxygen + 1]; i++) {
    int next = g->link[i].atom;
    const mho_graph_atom *a = &g->atom[next];
    if (g->bond[g->link[i].bond].order == 2 && a->element > ELEMENT_F &&
        bonding_of(g, NULL, next).valence >
            mho_element_valence(a->element, a->charge, 0))
      return true;
  }
  return false;
}

static mho_orbital oxygen(const mho_graph *g, int atom, bonding b)
{
  const mho_graph_atom *a = &g->atom[atom];
  if (b.doubles && is_hypervalent_oxo(g, atom)) return no_orbital();
  if (is_oxide_oxygen(g, atom)) {
    mho_orbital orbital = row_orbital(ORBITAL_OWN, 1, "O-carbonyl");
    orbital.oxide = true;
    return orbital;
  }
  if (a->charge == 0) {
    if (b.doubles || a->radical == 1) return row_orbital(ORBITAL_OWN, 1, "O-carbonyl");
    return b.connections || a->hydrogens ? row_orbital(ORBITAL_LENT, 2, "O-furan")
                                         : no_orbital();
  }
  if (a->charge == -1 && b.connections == 1 && a->hydrogens == 0 &&
      is_carboxylate(g, atom)) {
    mho_orbital orbital = row_orbital(ORBITAL_LENT, 2, "O-furan");
    orbital.bound = true;
    return orbital;
  }
  return named(g, atom, b.doubles ? ORBITAL_OWN : ORBITAL_LENT, b.doubles ? 1 : 2);
}

static mho_orbital sulfur(const mho_graph *g, int atom, bonding b)
{
  const mho_graph_atom *a = &g->atom[atom];
  if (b.valence > 2 && a->charge == 0) return refused("a sulfur with more than two bonds");
  if (a->charge > 0 || (a->charge < 0 && b.connections != 1))
    return named(g, atom, b.doubles ? ORBITAL_OWN : ORBITAL_LENT, b.doubles ? 1 : 2);
  if (b.doubles) return row_orbital(ORBITAL_OWN, 1, "S-thione");
  mho_orbital orbital = row_orbital(ORBITAL_LENT, 2, "S-thiophene");
  orbital.bound = a->charge == -1 || a->radical;
  return orbital;
}

static mho_orbital boron(const mho_graph *g, int atom, bonding b)
{
  const mho_graph_atom *a = &g->atom[atom];
  if (a->charge == 0)
    return row_orbital(b.doubles ? ORBITAL_OWN : ORBITAL_LENT, b.doubles != 0, "B");
  if (b.doubles) return named(g, atom, ORBITAL_OWN, 1);
  return no_orbital(); /* borate */
}

static mho_orbital phosphorus(const mho_graph *g, int atom, bonding b)
{
  const mho_graph_atom *a = &g->atom[atom];
  if (a->charge == 1 && !b.doubles) return no_orbital();
  if (a->charge) return named(g, atom, b.doubles ? ORBITAL_OWN : ORBITAL_LENT, b.doubles ? 1 : 2);
  if (b.valence > 3) return refused("a phosphorus with five bonds");
  return b.doubles || a->radical ? row_orbital(ORBITAL_OWN, 1, "P-pyridine")
                                 : row_orbital(ORBITAL_LENT, 2, "P-pyrrole");
}

/* Elements of group 14 below carbon and those without a rule of their own:
 * a double bond brings one electron, a lone pair two. */
static mho_orbital other(const mho_graph *g, int atom, bonding b)
{
  const mho_graph_atom *a = &g->atom[atom];
  if (mho_element_is_metal(a->element) || b.connections == 0)
    return no_orbital();
  if (a->element == ELEMENT_SI && a->charge == 0 && (b.doubles || a->radical))
    return row_orbital(ORBITAL_OWN, 1, "Si");
  if (a->element == ELEMENT_SI || a->element == 32)
    return b.doubles ? named(g, atom, ORBITAL_OWN, 1) : no_orbital();
  if (mho_element_valence(a->element, a->charge, 0) < b.valence)
    return refused("an atom with more bonds than usual");
  return named(g, atom, b.doubles ? ORBITAL_OWN : ORBITAL_LENT, b.doubles ? 1 : 2);
}

mho_orbital mho_orbital_of(const mho_graph *graph, const bool *removed,
                           int atom)
{
  bonding b = bonding_of(graph, removed, atom);
  switch (graph->atom[atom].element) {
    case 0: return refused("the wildcard '*'");
    case ELEMENT_H: return no_orbital();
    case ELEMENT_B: return boron(graph, atom, b);
    case ELEMENT_C: return carbon(graph, atom, b);
    case ELEMENT_N: return nitrogen(graph, atom, b);
    case ELEMENT_O: return oxygen(graph, atom, b);
    case ELEMENT_P: return phosphorus(graph, atom, b);
    case ELEMENT_S: return sulfur(graph, atom, b);
    default: return other(graph, atom, b);
  }
}
