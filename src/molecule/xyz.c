/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * XYZ: atoms in angstrom without bonds.  Two atoms are bonded where they are
 * closer than the sum of their covalent radii (B. Cordero et al., Dalton
 * Trans. 2008, 2832) and 0.4 A (common practice).  Metals bind C and S; what
 * else lies that near is coordination and left out.
 *
 * All hydrogens must be there.  What an atom's bonds leave of its usual
 * valence becomes double and triple bonds: a perfect matching of the open
 * valences, short bonds first.  Where there is none the file lacks something
 * (a charge, a radical, a hydrogen) that it cannot say, and is refused.
 */
#include <mho/quantity.h>

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "molecule/element.h"
#include "molecule/matching.h"
#include "molecule/record_reader.h"
#include "molecule/texts.h"

#define BOND_SLACK 0.4
#define CLOSEST 0.5
#define TRIPLE_LENGTH 1.27 /* between C#C, 1.20, and cumulated C=C, 1.31 */

enum { OPEN_LIMIT = 3, BONDS_PER_ATOM = 16, RADII = 96 };

/* In hundredths of an angstrom, H to Cm. */
static const short radius[RADII + 1] = {
    0,
    31, 28, 128, 96, 84, 76, 71, 66, 57, 58, 166, 141, 121, 111, 107, 105, 102, 106,
    203, 176, 170, 160, 153, 139, 139, 132, 126, 124, 132, 122, 122, 120, 119, 120, 120, 116,
    220, 195, 190, 175, 164, 154, 147, 146, 142, 139, 145, 144, 142, 139, 139, 138, 139, 140,
    244, 215, 207, 204, 203, 201, 199, 198, 198, 196, 194, 192, 192, 189, 190, 187, 187, 175,
    170, 162, 151, 144, 141, 136, 136, 132, 145, 146, 148, 140, 150, 150, 260, 221, 215, 206,
    200, 196, 190, 187, 180, 169
};

typedef struct {
  mho_record_reader *r;
  mho_graph *g;
  double *length;    /* [bonds] */
  int *degree, *open; /* [atoms] bonds; valences to fill */
  int coordination;
} perception;

static mho_status no_memory(mho_record_reader *r)
{
  return mho_record_fail(r, MHO_ERR_MEMORY, 0, "out of memory");
}

/* Word `index` of the current line, counted from 0; its length. */
static const char *word_of(const mho_record_reader *r, int index, int *length)
{
  const char *at = r->line, *end = r->line + r->length;
  for (;; index--) {
    while (at < end && (*at == ' ' || *at == '\t')) at++;
    const char *word = at;
    while (at < end && *at != ' ' && *at != '\t') at++;
    *length = (int)(at - word);
    if (index == 0 || !*length) return word;
  }
}

static mho_status read_atom(mho_record_reader *r)
{
  mho_graph *g = r->graph;
  int index = g->atom_count, length;
  mho_graph_atom *atom = &g->atom[index];
  if (!mho_record_line(r))
    return mho_record_fail(r, MHO_ERR_SYNTAX, 1, "the record ends in its atoms");
  const char *word = word_of(r, 0, &length);
  int column = (int)(word - r->line) + 1;
  atom->line = r->number;
  atom->column = column;
  atom->bracket = true;
  mho_record_reader number = {.line = word, .length = length};
  if (length && mho_record_integer(&number, 0, length, &atom->element)) {
    if (atom->element < 1 || atom->element > ELEMENT_LIMIT)
      return mho_record_fail(r, MHO_ERR_SYNTAX, column, "no element has the number %d", atom->element);
  } else {
    mho_status status = mho_record_element(r, word, length, column, atom);
    if (status != MHO_OK) return status;
  }
  for (int k = 0; k < 3; k++) {
    word = word_of(r, k + 1, &length);
    if (!mho_record_decimal(word, length, &g->position[index][k]))
      return mho_record_fail(r, MHO_ERR_SYNTAX, (int)(word - r->line) + 1,
                             "a symbol is followed by three coordinates in angstrom");
  }
  g->atom_count++;
  return MHO_OK;
}

/* --- bonds ---------------------------------------------------------------- */

static double radius_of(int element)
{
  return radius[element <= RADII ? element : RADII] / 100.0;
}

static double distance(const mho_graph *g, int a, int b)
{
  double sum = 0;
  for (int k = 0; k < 3; k++) {
    double d = g->position[a][k] - g->position[b][k];
    sum += d * d;
  }
  return sqrt(sum);
}

static mho_status add_bond(perception *p, int a, int b, double length, int room)
{
  mho_graph *g = p->g;
  if (g->bond_count == room)
    return mho_record_fail(p->r, MHO_ERR_SYNTAX, 0,
                           "more than %d atoms touch one on average; are the coordinates in angstrom?",
                           BONDS_PER_ATOM);
  p->length[g->bond_count] = length;
  g->bond[g->bond_count++] = (mho_graph_bond){.atom = {a, b}, .order = 1};
  p->degree[a]++;
  p->degree[b]++;
  return MHO_OK;
}

/* metals = 0: bonds between the others; 1: those of metals, of which C and S
 * take one where a valence is free. */
static mho_status find_bonds(perception *p, int metals, int room)
{
  mho_graph *g = p->g;
  mho_status status = MHO_OK;
  for (int a = 0; a < g->atom_count; a++)
    for (int b = a + 1; b < g->atom_count && status == MHO_OK; b++) {
      int first = g->atom[a].element, second = g->atom[b].element;
      double limit = radius_of(first) + radius_of(second) + BOND_SLACK;
      if (fabs(g->position[a][0] - g->position[b][0]) > limit) continue;
      double d = distance(g, a, b);
      if (d > limit) continue;
      if (d < CLOSEST)
        return mho_fail_atom(p->r->error, MHO_ERR_SYNTAX, p->r->place, g, b,
                             "atoms %d and %d are only %.2f angstrom apart", a + 1, b + 1, d);
      bool metal = mho_element_is_metal(first), other = mho_element_is_metal(second);
      if ((metal || other) != metals || (metal && other)) continue;
      if (metals) {
        int end = metal ? b : a, element = g->atom[end].element;
        int valence = element == ELEMENT_C ? 4 : element == ELEMENT_S ? 2 : 0;
        if (p->degree[end] >= valence || p->open[end]) {
          p->coordination++;
          continue;
        }
        p->open[end] = 1; /* one is enough */
      }
      status = add_bond(p, a, b, d, room);
    }
  return status;
}

/* --- orders --------------------------------------------------------------- */

/* Calls visit for the bonds of an atom; the graph has no links yet. */
static int count_ends(const perception *p, int atom, int element, int *last)
{
  int count = 0;
  for (int i = p->g->start[atom]; i < p->g->start[atom + 1]; i++) {
    int other = p->g->link[i].atom;
    if (p->g->atom[other].element != element || p->degree[other] != 1) continue;
    *last = other;
    count++;
  }
  return count;
}

/* Charges that the bonds alone prove: ammonium, nitro groups and N-oxides,
 * isonitriles. */
static void set_charges(perception *p, int a)
{
  mho_graph *g = p->g;
  int other = -1;
  if (g->atom[a].element != ELEMENT_N) return;
  if (p->degree[a] == 4) g->atom[a].charge = 1;
  else if (p->degree[a] == 3 && count_ends(p, a, ELEMENT_O, &other)) {
    g->atom[a].charge = 1;
    g->atom[other].charge = -1;
  } else if (p->degree[a] == 2 && count_ends(p, a, ELEMENT_C, &other) == 1) {
    g->atom[a].charge = 1;
    g->atom[other].charge = -1;
  }
}

static int open_valences(const perception *p, int a)
{
  const mho_graph_atom *atom = &p->g->atom[a];
  int used = p->degree[a], last;
  if (mho_element_is_metal(atom->element)) return 0;
  /* A sulfone: sulfur with four bonds, two of them to oxygen at an end. */
  if (atom->element == ELEMENT_S && used == 4 && count_ends(p, a, ELEMENT_O, &last) == 2) used = 6;
  int valence = mho_element_valence(atom->element, atom->charge, used);
  return valence < 0 ? 0 : valence - p->degree[a];
}

static int compare_lengths(const void *a, const void *b)
{
  const double *first = a, *second = b;
  return first[0] != second[0] ? (first[0] > second[0]) - (first[0] < second[0])
                               : (first[1] > second[1]) - (first[1] < second[1]);
}

/* A start for the matching: short bonds first, a second time where they are as
 * short as triple bonds.  at[a] is the first open valence of an atom. */
static void pair_short_bonds(const perception *p, const int *at, int *mate, double (*sorted)[2])
{
  const mho_graph *g = p->g;
  for (int b = 0; b < g->bond_count; b++) {
    sorted[b][0] = p->length[b];
    sorted[b][1] = b;
  }
  qsort(sorted, (size_t)g->bond_count, sizeof *sorted, compare_lengths);
  for (int i = 0; i < g->bond_count; i++) {
    const int *ends = g->bond[(int)sorted[i][1]].atom;
    int most = sorted[i][0] < TRIPLE_LENGTH ? 2 : 1;
    for (int k = 0; k < most; k++) {
      int v[2];
      for (int end = 0; end < 2; end++) {
        v[end] = at[ends[end]];
        while (v[end] < at[ends[end] + 1] && mate[v[end]] >= 0) v[end]++;
      }
      if (v[0] == at[ends[0] + 1] || v[1] == at[ends[1] + 1]) break;
      mate[v[0]] = v[1];
      mate[v[1]] = v[0];
    }
  }
}

static mho_status refuse_open(perception *p, int atom)
{
  char name[24];
  mho_graph_atom_name(p->g, atom, name, sizeof name);
  return mho_fail_atom(p->r->error, MHO_ERR_SYNTAX, p->r->place, p->g, atom,
                       "%s keeps an open valence: a charge, a radical or missing hydrogens, which an "
                       "XYZ file cannot say; use a molfile or a SMILES", name);
}

/* Vertices of the matching are open valences; owner[] is their atom. */
static mho_status match_valences(perception *p, const int *at, int *owner)
{
  mho_graph *g = p->g;
  int n = at[g->atom_count];
  size_t edges = 0;
  for (int b = 0; b < g->bond_count; b++)
    edges += (size_t)p->open[g->bond[b].atom[0]] * (size_t)p->open[g->bond[b].atom[1]];
  int *memory = malloc((2 * (size_t)n + 2 + 2 * edges) * sizeof *memory);
  bool *missed = malloc((size_t)n + 1);
  double(*sorted)[2] = malloc(((size_t)g->bond_count + 1) * sizeof *sorted);
  mho_status status = memory && missed && sorted ? MHO_OK : MHO_ERR_MEMORY;
  if (status == MHO_OK) {
    int *mate = memory, *start = memory + n, *next = memory + 2 * n + 1, count = 0;
    for (int v = 0; v < n; v++) {
      mate[v] = -1;
      start[v] = count;
      for (int i = g->start[owner[v]]; i < g->start[owner[v] + 1]; i++)
        for (int w = at[g->link[i].atom]; w < at[g->link[i].atom + 1]; w++) next[count++] = w;
    }
    start[n] = count;
    pair_short_bonds(p, at, mate, sorted);
    mho_match_graph graph = {n, start, next};
    status = mho_match_maximum(&graph, mate, missed);
    for (int v = 0; v < n && status == MHO_OK; v++) {
      if (mate[v] < 0) status = refuse_open(p, owner[v]);
      if (status != MHO_OK || mate[v] < v) continue;
      for (int i = g->start[owner[v]]; i < g->start[owner[v] + 1]; i++)
        if (g->link[i].atom == owner[mate[v]]) g->bond[g->link[i].bond].order++;
    }
  }
  free(memory);
  free(missed);
  free(sorted);
  return status;
}

static mho_status find_orders(perception *p)
{
  mho_graph *g = p->g;
  int n = g->atom_count;
  for (int a = 0; a < n; a++) set_charges(p, a);
  int *at = malloc(((size_t)n + 1) * sizeof *at);
  int *owner = malloc(((size_t)n * OPEN_LIMIT + 1) * sizeof *owner), count = 0;
  mho_status status = at && owner ? MHO_OK : MHO_ERR_MEMORY;
  for (int a = 0; a < n && status == MHO_OK; a++) {
    p->open[a] = open_valences(p, a);
    if (p->open[a] > OPEN_LIMIT) status = refuse_open(p, a);
    at[a] = count;
    for (int k = 0; k < p->open[a] && status == MHO_OK; k++) owner[count++] = a;
  }
  if (status == MHO_OK) {
    at[n] = count;
    status = match_valences(p, at, owner);
  }
  free(at);
  free(owner);
  return status == MHO_ERR_MEMORY ? no_memory(p->r) : status;
}

static mho_status perceive(perception *p, int room)
{
  mho_graph *g = p->g;
  mho_status status = find_bonds(p, 0, room);
  if (status == MHO_OK) status = find_bonds(p, 1, room);
  if (status != MHO_OK) return status;
  mho_graph_link_atoms(g);
  status = find_orders(p);
  if (status != MHO_OK || !p->r->notes) return status;
  if (p->coordination)
    status = mho_texts_add(p->r->notes, "%d contact%s of metal atoms count%s as coordination, no bond",
                           p->coordination, p->coordination > 1 ? "s" : "", p->coordination > 1 ? "" : "s");
  if (status == MHO_OK)
    status = mho_texts_add(p->r->notes, "%d bonds are perceived from distances", g->bond_count);
  return status == MHO_OK ? MHO_OK : no_memory(p->r);
}

mho_status mho_xyz_read(mho_record_reader *r)
{
  int atoms = 0;
  if (!mho_record_integer(r, 0, r->length, &atoms) || atoms < 1 || atoms > MHO_ATOM_LIMIT)
    return mho_record_fail(r, MHO_ERR_SYNTAX, 1, "an XYZ record begins with the number of its atoms, 1 to %d",
                           MHO_ATOM_LIMIT);
  /* A line of an atom has 8 bytes at least: no more room than the record can fill. */
  long lines = (long)(r->end - r->at) / 8 + 2;
  int possible = lines < atoms ? (int)lines : atoms, room = BONDS_PER_ATOM * possible;
  size_t n = (size_t)possible + 1;
  perception p = {.r = r, .g = r->graph};
  p.length = malloc(((size_t)room + 1) * sizeof *p.length);
  p.degree = calloc(2 * n, sizeof *p.degree);
  p.open = p.degree ? p.degree + n : NULL;
  r->graph->position = calloc(n, sizeof *r->graph->position);
  mho_record_state *state = calloc(n, sizeof *state);
  mho_status status = p.length && p.degree && state && r->graph->position &&
                              mho_graph_reserve(r->graph, possible, room) == MHO_OK
                          ? MHO_OK
                          : no_memory(r);
  if (status == MHO_OK) mho_record_line(r); /* the comment */
  for (int a = 0; a < atoms && status == MHO_OK; a++) status = read_atom(r);
  if (status == MHO_OK) status = perceive(&p, room);
  if (status == MHO_OK) status = mho_record_complete(r, state, true);
  free(p.length);
  free(p.degree);
  free(state);
  return status;
}
