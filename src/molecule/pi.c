/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Which p orbitals form the pi system, and which of them overlap.
 *
 * An sp atom has two orthogonal orbitals.  In an alkyne, a nitrile or a
 * polyyne the first of them joins what stands at the ends of the chain; the
 * second one sees only its like in the chain and is left out, unless both
 * contacts touch the chain, which then conducts by both.  In a cumulene
 * the double bonds lie in the two planes in turn: with an odd number of them
 * the ends share a plane and the second orbitals are again left out; with an
 * even number the ends stand in different planes and both orbitals are sites.
 */
#include "molecule/pi.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "molecule/element.h"
#include "molecule/graph.h"
#include "molecule/orbital.h"
#include "molecule/texts.h"

enum { NAME_SIZE = 24 };

typedef struct {
  const mho_graph *graph;
  const bool *removed;
  const unsigned char *contact;
  const mho_place *place;
  mho_error *error;
  mho_texts *notes;
  mho_orbital *orbital; /* [atoms] */
  int *queue;           /* [atoms] */
  signed char *plane;   /* [bonds] of a cumulene's double bond: 0 or 1 */
  bool *both;           /* [atoms] sp atom whose two orbitals are sites */
} perception;

static bool is_removed(const perception *p, int atom)
{
  return p->removed && p->removed[atom];
}

static mho_status no_memory(mho_error *error)
{
  return mho_fail(error, MHO_ERR_MEMORY, MOLECULE_STAGE, NULL, "out of memory");
}

/* Lends lone pairs to what they touch, from atom to atom; a refused atom that
 * touches the pi system is an error. */
static mho_status spread(perception *p)
{
  const mho_graph *g = p->graph;
  int head = 0, tail = 0;
  for (int a = 0; a < g->atom_count; a++) {
    mho_orbital *o = &p->orbital[a];
    if (is_removed(p, a)) o->kind = ORBITAL_NONE;
    if (o->kind == ORBITAL_LENT && p->contact && p->contact[a]) o->kind = ORBITAL_OWN;
    if (o->kind == ORBITAL_OWN) p->queue[tail++] = a;
  }
  while (head < tail) {
    int a = p->queue[head++];
    for (int i = g->start[a]; i < g->start[a + 1]; i++) {
      int next = g->link[i].atom;
      mho_orbital *o = &p->orbital[next];
      if (o->kind == ORBITAL_REFUSED) {
        char name[NAME_SIZE];
        mho_graph_atom_name(g, next, name, sizeof name);
        return mho_fail_atom(p->error, MHO_ERR_UNPARAMETERISED, p->place,
                               g, next,
                               "%s is %s beside a pi system, for which no "
                               "parameters exist", name, o->reason);
      }
      if (o->kind != ORBITAL_LENT) continue;
      o->kind = ORBITAL_OWN;
      p->queue[tail++] = next;
    }
  }
  return MHO_OK;
}

/* Is this the double bond of a cumulene, seen from an atom with two of them? */
static bool is_cumulated(const perception *p, int atom, int bond)
{
  return p->orbital[atom].sp && p->graph->bond[bond].order == 2;
}

/* The other cumulated bond of an sp atom, or -1. */
static mho_graph_link go_on(const perception *p, int atom, int bond)
{
  const mho_graph *g = p->graph;
  for (int i = g->start[atom]; i < g->start[atom + 1]; i++)
    if (g->link[i].bond != bond && is_cumulated(p, atom, g->link[i].bond))
      return g->link[i];
  return (mho_graph_link){-1, -1};
}

/* Follows a cumulene from one of its ends, numbering the planes of its double
 * bonds 0, 1, 0 ...; plane[] is -1 where no number was given yet. */
static void follow_cumulene(perception *p, int end, mho_graph_link link)
{
  int count = 0, last = end;
  mho_graph_link step = link;
  while (step.bond >= 0 && p->plane[step.bond] < 0) {
    p->plane[step.bond] = (signed char)(count++ % 2);
    last = step.atom;
    step = p->orbital[last].sp ? go_on(p, last, step.bond)
                               : (mho_graph_link){-1, -1};
  }
  bool both = count % 2 == 0 && !p->orbital[last].sp;
  for (step = link; both && p->orbital[step.atom].sp;
       step = go_on(p, step.atom, step.bond))
    p->both[step.atom] = true;
}

static void find_cumulenes(perception *p)
{
  const mho_graph *g = p->graph;
  memset(p->plane, -1, (size_t)g->bond_count);
  for (int closed = 0; closed < 2; closed++) /* chains first, then cycles */
    for (int a = 0; a < g->atom_count; a++) {
      if (p->orbital[a].kind != ORBITAL_OWN || p->orbital[a].sp != closed) continue;
      for (int i = g->start[a]; i < g->start[a + 1]; i++) {
        mho_graph_link link = g->link[i];
        if (is_cumulated(p, link.atom, link.bond) && p->plane[link.bond] < 0)
          follow_cumulene(p, a, link);
      }
    }
}

/* Marks the sp atoms of an alkyne chain that holds `first`; returns the
 * contacts that touch it. */
static unsigned mark_chain(perception *p, int first, int *count)
{
  const mho_graph *g = p->graph;
  unsigned touched = 0;
  int head = 0, tail = 0;
  p->queue[tail++] = first;
  p->both[first] = true;
  while (head < tail) {
    int a = p->queue[head++];
    touched |= p->contact[a];
    for (int i = g->start[a]; i < g->start[a + 1]; i++) {
      int next = g->link[i].atom;
      if (!p->orbital[next].sp || p->orbital[next].kind != ORBITAL_OWN ||
          p->both[next] || p->plane[g->link[i].bond] >= 0)
        continue;
      p->both[next] = true;
      p->queue[tail++] = next;
    }
  }
  *count = tail;
  return touched;
}

/* Chains that both contacts touch keep their second orbitals. */
static void find_shared_chains(perception *p)
{
  for (int a = 0; p->contact && a < p->graph->atom_count; a++) {
    int count;
    if (!(p->contact[a] & 1) || !p->orbital[a].sp || p->both[a] ||
        p->orbital[a].kind != ORBITAL_OWN)
      continue;
    if (mark_chain(p, a, &count) == 3) continue;
    while (count) p->both[p->queue[--count]] = false;
  }
}

static mho_status note_second_system(perception *p)
{
  const mho_graph *g = p->graph;
  char list[300] = "";
  size_t used = 0;
  for (int b = 0; b < g->bond_count && used + 40 < sizeof list; b++) {
    const int *ends = g->bond[b].atom;
    bool second = true;
    for (int end = 0; end < 2; end++)
      second &= p->orbital[ends[end]].kind == ORBITAL_OWN &&
                p->orbital[ends[end]].sp && !p->both[ends[end]];
    if (!second || g->bond[b].order == 1) continue;
    char name[2][NAME_SIZE];
    for (int end = 0; end < 2; end++)
      mho_graph_atom_name(g, ends[end], name[end], NAME_SIZE);
    used += (size_t)snprintf(list + used, sizeof list - used, "%s%s-%s",
                             used ? ", " : "", name[0], name[1]);
  }
  if (!used) return MHO_OK;
  return mho_texts_add(p->notes, "the second pi system of %s, orthogonal to "
                       "the one in use and not joined to anything else, is "
                       "left out", list);
}

/* Names of the atoms that a rule applies to, then the rule. */
static mho_status note_rule(perception *p, bool (*applies)(const mho_orbital *),
                            const char *rule)
{
  char list[200] = "";
  size_t used = 0;
  for (int a = 0; a < p->graph->atom_count && used + 30 < sizeof list; a++) {
    if (p->orbital[a].kind != ORBITAL_OWN || !applies(&p->orbital[a])) continue;
    char name[NAME_SIZE];
    mho_graph_atom_name(p->graph, a, name, sizeof name);
    used += (size_t)snprintf(list + used, sizeof list - used, "%s%s",
                             used ? ", " : "", name);
  }
  return used ? mho_texts_add(p->notes, "%s: %s", list, rule) : MHO_OK;
}

static bool is_oxide(const mho_orbital *o)
{
  return o->oxide && o->electrons == 2;
}

static bool is_bound(const mho_orbital *o) { return o->bound; }

static mho_status take_notes(perception *p)
{
  if (!p->notes) return MHO_OK;
  mho_status status = note_second_system(p);
  if (status == MHO_OK)
    status = note_rule(p, is_oxide, "the N-O pair is counted without its "
                       "charges, N as N-pyrrole and O as O-carbonyl");
  if (status == MHO_OK)
    status = note_rule(p, is_bound, "counted as bound to the electrode, without "
                       "the formal charge");
  return status == MHO_OK ? MHO_OK : no_memory(p->error);
}

static void add_sites(perception *p, mho_pi *pi)
{
  for (int a = 0; a < p->graph->atom_count; a++) {
    const mho_orbital *o = &p->orbital[a];
    pi->site_of[a] = -1;
    if (o->kind != ORBITAL_OWN) continue;
    pi->site_of[a] = pi->site_count;
    /* A dative pair and an isonitrile are neutral as a whole. */
    if (!(o->bound && p->graph->atom[a].charge < 0)) pi->charge += p->graph->atom[a].charge;
    for (int orbital = 0; orbital <= p->both[a]; orbital++) {
      mho_pi_site *site = &pi->site[pi->site_count++];
      *site = (mho_pi_site){a, orbital, o->electrons, o->oxide, ""};
      memcpy(site->row, o->row, sizeof site->row);
    }
  }
}

static void join(mho_pi *pi, int bond, int first, int second)
{
  pi->bond[pi->bond_count++] = (mho_pi_bond){
      .site = {first, second}, .bond = bond, .strength = 1.0};
}

/* Orbitals overlap where they lie in one plane: both pairs inside a cumulene
 * of an even number of bonds, the one of its plane at its ends. */
static void add_bonds(perception *p, mho_pi *pi)
{
  const mho_graph *g = p->graph;
  for (int b = 0; b < g->bond_count; b++) {
    const int *ends = g->bond[b].atom;
    int first = pi->site_of[ends[0]], second = pi->site_of[ends[1]];
    if (first < 0 || second < 0) continue;
    bool two[2] = {p->both[ends[0]], p->both[ends[1]]};
    if (two[0] && two[1]) {
      join(pi, b, first, second);
      join(pi, b, first + 1, second + 1);
    } else {
      int plane = p->plane[b] > 0;
      join(pi, b, first + (two[0] ? plane : 0), second + (two[1] ? plane : 0));
    }
  }
}

static mho_status build(perception *p, mho_pi *pi)
{
  const mho_graph *g = p->graph;
  size_t sites = 0, bonds = 0;
  for (int a = 0; a < g->atom_count; a++)
    if (p->orbital[a].kind == ORBITAL_OWN) sites += 1 + p->both[a];
  for (int b = 0; b < g->bond_count; b++) {
    const int *ends = g->bond[b].atom;
    if (p->orbital[ends[0]].kind == ORBITAL_OWN && p->orbital[ends[1]].kind == ORBITAL_OWN)
      bonds += 1 + (p->both[ends[0]] && p->both[ends[1]]);
  }
  pi->site = malloc((sites + 1) * sizeof *pi->site);
  pi->bond = malloc((bonds + 1) * sizeof *pi->bond);
  pi->site_of = malloc(((size_t)g->atom_count + 1) * sizeof *pi->site_of);
  if (!pi->site || !pi->bond || !pi->site_of) return no_memory(p->error);
  add_sites(p, pi);
  add_bonds(p, pi);
  return take_notes(p);
}

mho_status mho_pi_perceive(const mho_graph *graph, const bool *removed,
                           const unsigned char *contact,
                           const mho_place *place, mho_pi *pi,
                           mho_texts *notes, mho_error *error)
{
  size_t n = (size_t)graph->atom_count, m = (size_t)graph->bond_count;
  *pi = (mho_pi){0};
  perception p = {.graph = graph, .removed = removed, .contact = contact,
                  .place = place, .error = error, .notes = notes};
  p.orbital = malloc(n * sizeof *p.orbital + 1);
  p.queue = malloc(n * sizeof *p.queue + 1);
  p.plane = malloc(m + 1);
  p.both = calloc(n + 1, sizeof *p.both);
  mho_status status = MHO_OK;
  if (!p.orbital || !p.queue || !p.plane || !p.both) status = no_memory(error);
  if (status == MHO_OK) {
    for (int a = 0; a < graph->atom_count; a++)
      p.orbital[a] = mho_orbital_of(graph, removed, a);
    status = spread(&p);
  }
  if (status == MHO_OK) {
    find_cumulenes(&p);
    find_shared_chains(&p);
    status = build(&p, pi);
  }
  free(p.orbital);
  free(p.queue);
  free(p.plane);
  free(p.both);
  if (status != MHO_OK) mho_pi_clear(pi);
  return status;
}

void mho_pi_clear(mho_pi *pi)
{
  free(pi->site);
  free(pi->bond);
  free(pi->site_of);
  *pi = (mho_pi){0};
}
