/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Dihedral angles between two pi fragments, from what stands in the ortho
 * positions.  A rough table: it tells flat from twisted from perpendicular,
 * and a measured or computed angle should replace it where there is one.
 */
#include "molecule/element.h"
#include "molecule/pi.h"

typedef struct {
  int size;     /* of the ring */
  int lone;     /* ortho ring atoms without a substituent: N, O, S */
  bool sulfur;  /* one of them is S */
  bool oxygen;
  int fluorine; /* ortho C-F */
  int crowded;  /* other ortho substituents, fused rings included */
} ortho_side;

static ortho_side look_at(const mho_graph *g, const mho_pi *pi, int atom)
{
  ortho_side side = {.size = mho_pi_ring_size(g, pi, atom)};
  for (int i = g->start[atom]; i < g->start[atom + 1]; i++) {
    if (!g->bond[g->link[i].bond].ring) continue;
    int ortho = g->link[i].atom, substituent = -1;
    for (int j = g->start[ortho]; j < g->start[ortho + 1]; j++) {
      int next = g->link[j].atom;
      bool main_ring = g->bond[g->link[j].bond].ring && next != atom;
      if (next == atom || g->atom[next].element == ELEMENT_H) continue;
      /* The first ring bond leads on round the ring; a second one is fused. */
      if (main_ring && substituent == -1) substituent = -2;
      else if (substituent < 0 || !main_ring) substituent = next;
    }
    int element = g->atom[ortho].element;
    if (substituent >= 0) {
      bool fluorine = g->atom[substituent].element == ELEMENT_F;
      side.fluorine += fluorine;
      side.crowded += !fluorine;
    } else if (element != ELEMENT_C && mho_graph_hydrogens(g, ortho) == 0) {
      side.lone++;
      side.sulfur |= element == ELEMENT_S;
      side.oxygen |= element == ELEMENT_O;
    }
  }
  return side;
}

/* Two rings. */
static double between_rings(ortho_side a, ortho_side b, const char **reason)
{
  int crowded = a.crowded + b.crowded;
  if (crowded >= 4) {
    /* 88 deg: L. Venkataraman et al., Nature 442, 904 (2006), Table 1
     * (memory). */
    *reason = "four ortho substituents, as tetramethylated biphenyl";
    return 88.0;
  }
  if (crowded) {
    /* Steps between o-terphenyl, about 50 deg in the crystal (Acta Cryst.
     * B 34, 1978, o-terphenyl, as cited), and the above; 2-methylbiphenyl
     * about 58, 2,2'-dimethylbiphenyl about 70 deg (memory). */
    static const double angle[] = {0.0, 55.0, 70.0, 80.0};
    static const char *const text[] = {
        "", "one ortho substituent, as 2-methylbiphenyl",
        "two ortho substituents, as 2,2'-dimethylbiphenyl",
        "three ortho substituents"};
    *reason = text[crowded];
    return angle[crowded];
  }
  if (a.fluorine + b.fluorine) {
    *reason = "ortho fluorine, as 2-fluorobiphenyl and its octafluoro relative";
    return 50.0; /* 49 and 52 deg (memory; Nature 442, 904, Table 1) */
  }
  if (a.lone && b.lone) {
    bool bithiophene = a.size == 5 && b.size == 5 && a.sulfur && b.sulfur;
    /* 2,2'-bithiophene about 147 deg from cis (electron diffraction and
     * computation, E. Orti et al., J. Phys. Chem. 99, 4955 (1995)); its
     * potential is flat.  2,2'-bipyridine is flat (Chem. Phys. Lett. 354, 233
     * (2002)). */
    *reason = bithiophene ? "2,2'-bithiophene in the gas phase"
                          : "flat as 2,2'-bipyridine: no ortho hydrogens meet";
    return bithiophene ? 33.0 : 0.0;
  }
  if (a.lone + b.lone >= 2) {
    *reason = "flat as 2-phenylpyrimidine";
    return 0.0;
  }
  if (a.lone + b.lone == 1) {
    bool thiophene = a.sulfur || b.sulfur;
    *reason = thiophene ? "as 2-phenylthiophene" : "as 2-phenylpyridine";
    return thiophene ? 28.0 : 20.0; /* memory */
  }
  /* Biphenyls without ortho substituents: 34 deg for 4,4'-diaminobiphenyl,
   * Nature 442, 904 (memory); 34 deg 20' for tetrachlorobiphenyl in a nematic
   * solvent (magnetic resonance, as read in an abstract).  In the gas 44.4
   * deg for biphenyl, 37.2 deg for 4,4'-bipyridine. */
  *reason = "ortho hydrogens meet, as in the oligophenyls";
  return 34.0;
}

/* Does the atom end a flat group by itself: doubly or triply bonded, or the
 * nitrogen of a nitro group? */
static bool is_flat_group(const mho_graph *g, int atom)
{
  for (int i = g->start[atom]; i < g->start[atom + 1]; i++)
    if (g->bond[g->link[i].bond].order > 1) return true;
  return false;
}

double mho_torsion_estimate(const mho_graph *graph, const mho_pi *pi,
                            const int atom[2], const char **reason)
{
  ortho_side side[2];
  for (int end = 0; end < 2; end++) side[end] = look_at(graph, pi, atom[end]);
  if (side[0].size && side[1].size) return between_rings(side[0], side[1], reason);
  /* trans-Azobenzene is flat (electron diffraction, T. Tsuji et al., J. Phys.
   * Chem. A 105, 9347 (2001), in Landolt-Boernstein II/28D), trans-stilbene
   * nearly so (Chem. Phys. Lett. 421, 134 (2006)). */
  bool crowded = side[0].crowded + side[1].crowded > 0;
  bool flat = is_flat_group(graph, atom[0]) && is_flat_group(graph, atom[1]);
  *reason = flat && !crowded ? "flat as stilbene and azobenzene"
                             : "no value in the table; taken as flat";
  return 0.0;
}

/* The atom across a ring of six from `atom` is a bare nitrogen. */
static bool has_para_nitrogen(const mho_graph *g, int atom)
{
  int across = -1;
  for (int i = g->start[atom]; i < g->start[atom + 1]; i++) {
    int at = atom, to = g->link[i].atom, steps = 0;
    if (!g->bond[g->link[i].bond].ring) continue;
    for (; steps < 2; steps++) { /* round the ring without turning back */
      int next = -1;
      for (int k = g->start[to]; k < g->start[to + 1]; k++)
        if (g->bond[g->link[k].bond].ring && g->link[k].atom != at) {
          if (next >= 0) return false; /* fused */
          next = g->link[k].atom;
        }
      if (next < 0) return false;
      at = to;
      to = next;
    }
    if (across >= 0 && across != to) return false;
    across = to;
  }
  return across >= 0 && g->atom[across].element == ELEMENT_N &&
         mho_graph_hydrogens(g, across) == 0;
}

/* The neighbour of `atom` by a bond of that order outside the rings, or -1. */
static int beyond(const mho_graph *g, int atom, int order)
{
  for (int i = g->start[atom]; i < g->start[atom + 1]; i++)
    if (g->bond[g->link[i].bond].order == order && !g->bond[g->link[i].bond].ring)
      return g->link[i].atom;
  return -1;
}

static bool bears_phenyl(const mho_graph *g, const mho_pi *pi, int atom)
{
  for (int i = g->start[atom]; i < g->start[atom + 1]; i++)
    if (!g->bond[g->link[i].bond].ring && mho_pi_ring_size(g, pi, g->link[i].atom) == 6) return true;
  return false;
}

/* Atoms on a carbon besides its hydrogens. */
static int count_heavy(const mho_graph *g, int atom)
{
  int count = 0;
  for (int i = g->start[atom]; i < g->start[atom + 1]; i++)
    count += g->atom[g->link[i].atom].element != ELEMENT_H;
  return count;
}

/* A bare ring of six on a vinyl or ethynyl carbon. */
static const char *ring_and_chain(const mho_graph *g, const mho_pi *pi, int chain)
{
  int triple = beyond(g, chain, 3), twin = beyond(g, chain, 2);
  if (triple >= 0) return bears_phenyl(g, pi, triple) ? "tolane" : NULL;
  if (twin < 0 || g->atom[chain].element != ELEMENT_C || g->atom[twin].element != ELEMENT_C ||
      count_heavy(g, chain) > 2)
    return NULL;
  if (bears_phenyl(g, pi, twin) && count_heavy(g, twin) == 2) return "stilbene";
  return count_heavy(g, twin) == 1 ? "styrene" : NULL;
}

const char *mho_torsion_kind(const mho_graph *graph, const mho_pi *pi, const int atom[2])
{
  ortho_side side[2];
  for (int end = 0; end < 2; end++) side[end] = look_at(graph, pi, atom[end]);
  const ortho_side *a = &side[0], *b = &side[1];
  if (a->crowded + b->crowded + a->fluorine + b->fluorine) return NULL;
  bool carbon = graph->atom[atom[0]].element == ELEMENT_C && graph->atom[atom[1]].element == ELEMENT_C;
  for (int end = 0; end < 2; end++)
    if (side[end].size == 6 && side[end].lone == 0 && side[!end].size == 0)
      return ring_and_chain(graph, pi, atom[!end]);
  if (a->size == 6 && b->size == 6 && carbon) {
    if (a->lone + b->lone == 0)
      return has_para_nitrogen(graph, atom[0]) && has_para_nitrogen(graph, atom[1])
                 ? "bipyridine-4-4" : "biphenyl";
    return a->lone == 1 && b->lone == 1 ? "bipyridine-2-2" : NULL;
  }
  if (a->size == 5 && b->size == 5 && carbon && a->lone == 1 && b->lone == 1)
    return a->sulfur && b->sulfur ? "bithiophene-2-2" : a->oxygen && b->oxygen ? "bifuran-2-2" : NULL;
  for (int end = 0; end < 2; end++)
    if (side[end].size == 5 && graph->atom[atom[end]].element == ELEMENT_N && side[end].lone == 0 &&
        side[!end].size == 6 && side[!end].lone == 0)
      return "phenylpyrrole";
  return NULL;
}
