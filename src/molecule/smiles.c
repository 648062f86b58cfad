/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * SMILES by the grammar of OpenSMILES 1.0 (http://opensmiles.org).
 *
 *   chain:   atom ringbond* branch*, joined by bond symbols or `.`
 *   branch:  ( [bond | .] chain )
 *   atom:    B C N O P S F Cl Br I, b c n o p s, *, or a bracket
 *   bracket: [ isotope? symbol chiral? hcount? charge? class? ]
 *
 * Open branches are kept on a stack in memory and ring closures in a table of
 * 100, so nesting costs no recursion.  Stereochemistry is checked for its
 * form and dropped: it says nothing about a pi system's connections.
 */
#include "molecule/graph.h"

#include <stdlib.h>
#include <string.h>

#include "molecule/element.h"

enum { RINGS = 100, NUMBER_LIMIT = 99999, BOND_NONE = 0, BOND_AROMATIC = 5 };

typedef struct {
  int atom; /* -1 while the number is free */
  int order;
  long column;
} ring_opening;

typedef struct {
  int atom;
  long column;
} open_branch;

typedef struct {
  const char *text, *at;
  const mho_place *place;
  mho_error *error;
  mho_graph *graph;
  open_branch *branch; /* stack */
  int depth;
  int previous; /* atom that the next one is bonded to, -1 after `.` */
  int order;    /* bond symbol read, or BOND_NONE */
  const char *symbol; /* where it stood */
  bool fresh;   /* nothing yet in this branch */
  ring_opening ring[RINGS];
} reader;

static long column_of(const reader *r, const char *at)
{
  return (long)(at - r->text) + 1;
}

#define FAIL(r, at, ...)                                              \
  mho_fail_column((r)->error, MHO_ERR_SYNTAX, (r)->place,             \
                  column_of((r), (at)), __VA_ARGS__)

static bool is_digit(char c) { return c >= '0' && c <= '9'; }

/* Digits into *value; false where the number is too large. */
static bool read_number(reader *r, int *value)
{
  *value = 0;
  while (is_digit(*r->at)) {
    *value = 10 * *value + (*r->at++ - '0');
    if (*value > NUMBER_LIMIT) return false;
  }
  return true;
}

static int bond_order(char c)
{
  switch (c) {
    case '-': case '/': case '\\': return 1;
    case '=': return 2;
    case '#': return 3;
    case '$': return 4;
    case ':': return BOND_AROMATIC;
    default: return BOND_NONE;
  }
}

/* Appends a bond; order BOND_NONE is single, or aromatic between two atoms
 * written so. */
static void add_bond(reader *r, int first, int second, int order)
{
  mho_graph *g = r->graph;
  mho_graph_bond *bond = &g->bond[g->bond_count++];
  bond->atom[0] = first;
  bond->atom[1] = second;
  bond->aromatic =
      order == BOND_AROMATIC ||
      (order == BOND_NONE && g->atom[first].aromatic && g->atom[second].aromatic);
  bond->order = order == BOND_NONE || order == BOND_AROMATIC ? 1 : order;
  if (order == BOND_AROMATIC)
    g->atom[first].aromatic = g->atom[second].aromatic = true;
}

static mho_status add_atom(reader *r, const mho_graph_atom *atom)
{
  mho_graph *g = r->graph;
  if (g->atom_count == MHO_ATOM_LIMIT)
    return mho_fail_column(r->error, MHO_ERR_LIMIT, r->place, atom->column,
                           "more than %d atoms; a molecule may have at most "
                           "that many", MHO_ATOM_LIMIT);
  int index = g->atom_count++;
  g->atom[index] = *atom;
  if (r->previous >= 0) add_bond(r, r->previous, index, r->order);
  r->previous = index;
  r->order = BOND_NONE;
  r->fresh = false;
  return MHO_OK;
}

/* Element of an aromatic symbol at the reading position; -1 if none. */
static int read_aromatic(reader *r, bool bracket)
{
  char c = *r->at, next = c && bracket ? r->at[1] : '\0';
  int element = -1, length = 1;
  switch (c) {
    case 'b': element = ELEMENT_B; break;
    case 'c': element = ELEMENT_C; break;
    case 'n': element = ELEMENT_N; break;
    case 'o': element = ELEMENT_O; break;
    case 'p': element = ELEMENT_P; break;
    case 's':
      element = next == 'e' ? 34 : next == 'i' ? ELEMENT_SI : ELEMENT_S;
      length += element != ELEMENT_S;
      break;
    case 'a': case 't':
      element = c == 'a' && next == 's' ? 33 : c == 't' && next == 'e' ? 52 : -1;
      length = 2;
      break;
    default: break;
  }
  if (element >= 0) r->at += length;
  return element;
}

/* `@`, `@@`, `@TH1` ... `@OH30`. */
static mho_status skip_chirality(reader *r)
{
  static const struct { char text[3]; int most; } table[] = {
      {"TH", 2}, {"AL", 2}, {"SP", 3}, {"TB", 20}, {"OH", 30}};
  if (*r->at != '@') return MHO_OK;
  const char *start = r->at++;
  if (*r->at == '@') {
    r->at++;
    return MHO_OK;
  }
  for (size_t i = 0; i < sizeof table / sizeof *table; i++) {
    if (strncmp(r->at, table[i].text, 2) || !is_digit(r->at[2])) continue;
    int number;
    r->at += 2;
    if (!read_number(r, &number) || number < 1 || number > table[i].most)
      return FAIL(r, start, "the chirality @%s goes from 1 to %d",
                  table[i].text, table[i].most);
    return MHO_OK;
  }
  return MHO_OK;
}

/* `+`, `--`, `+2`: at most 15. */
static mho_status read_charge(reader *r, int *charge)
{
  char sign = *r->at;
  if (sign != '+' && sign != '-') return MHO_OK;
  const char *start = r->at++;
  int size = 1;
  if (is_digit(*r->at)) {
    if (!read_number(r, &size)) size = NUMBER_LIMIT;
  } else if (*r->at == sign) {
    r->at++;
    size = 2;
  }
  if (size > 15) return FAIL(r, start, "a charge is at most 15");
  *charge = sign == '+' ? size : -size;
  return MHO_OK;
}

/* Isotope and symbol of a bracket atom. */
static mho_status read_symbol(reader *r, mho_graph_atom *atom)
{
  const char *start = r->at;
  if (!read_number(r, &atom->isotope) || atom->isotope > 999)
    return FAIL(r, start, "an isotope has at most three digits");
  if (*r->at == '*') {
    r->at++;
    return MHO_OK;
  }
  atom->element = read_aromatic(r, true);
  atom->aromatic = atom->element >= 0;
  if (atom->aromatic) return MHO_OK;
  size_t length;
  atom->element = mho_element_read(r->at, &length);
  if (atom->element < 0)
    return FAIL(r, r->at, "no element symbol after '['; e.g. [nH] or [S-]");
  r->at += length;
  return MHO_OK;
}

static mho_status read_bracket(reader *r)
{
  const char *start = r->at++;
  mho_graph_atom atom = {.bracket = true, .column = column_of(r, start)};
  mho_status status = read_symbol(r, &atom);
  if (status == MHO_OK) status = skip_chirality(r);
  if (status != MHO_OK) return status;
  if (*r->at == 'H') {
    r->at++;
    atom.hydrogens = 1;
    if (is_digit(*r->at)) atom.hydrogens = *r->at++ - '0';
    if (atom.element == ELEMENT_H && atom.hydrogens)
      return FAIL(r, start, "a hydrogen atom cannot bear hydrogens");
  }
  if ((status = read_charge(r, &atom.charge)) != MHO_OK) return status;
  if (*r->at == ':') {
    const char *colon = r->at++;
    if (!is_digit(*r->at)) return FAIL(r, colon, "':' needs an atom class, e.g. [SH:1]");
    if (!read_number(r, &atom.atom_class))
      return FAIL(r, colon, "an atom class is at most %d", NUMBER_LIMIT);
  }
  if (*r->at == '\0' || *r->at == '\n')
    return FAIL(r, start, "'[' is never closed");
  if (*r->at != ']')
    return FAIL(r, r->at, "'%c' does not fit into a bracket atom; the order is "
                "isotope, symbol, chirality, hydrogens, charge, class", *r->at);
  r->at++;
  return add_atom(r, &atom);
}

/* Atom of the organic subset, or `*`. */
static mho_status read_bare_atom(reader *r)
{
  const char *start = r->at;
  mho_graph_atom atom = {.column = column_of(r, start)};
  if (*start == '*') {
    r->at++;
    return add_atom(r, &atom);
  }
  atom.element = read_aromatic(r, false);
  atom.aromatic = atom.element >= 0;
  if (!atom.aromatic) {
    int length = 1;
    switch (*start) {
      case 'B': atom.element = start[1] == 'r' ? ELEMENT_BR : ELEMENT_B; break;
      case 'C': atom.element = start[1] == 'l' ? ELEMENT_CL : ELEMENT_C; break;
      case 'N': atom.element = ELEMENT_N; break;
      case 'O': atom.element = ELEMENT_O; break;
      case 'P': atom.element = ELEMENT_P; break;
      case 'S': atom.element = ELEMENT_S; break;
      case 'F': atom.element = ELEMENT_F; break;
      case 'I': atom.element = ELEMENT_I; break;
      default: {
        unsigned char c = (unsigned char)*start;
        if (c <= ' ' || c > '~')
          return FAIL(r, start, "the byte 0x%02X is no part of a SMILES", c);
        return FAIL(r, start, "'%c' is no atom; elements outside B C N O P S F "
                    "Cl Br I are written in brackets, e.g. [Se]", c);
      }
    }
    length += atom.element == ELEMENT_BR || atom.element == ELEMENT_CL;
    r->at += length;
  }
  return add_atom(r, &atom);
}

static mho_status close_ring(reader *r, ring_opening *ring, int order,
                             int number, const char *start)
{
  if (ring->atom == r->previous)
    return FAIL(r, start, "ring closure %d bonds an atom to itself", number);
  for (int b = r->graph->bond_count - 1; b >= 0; b--) {
    const int *ends = r->graph->bond[b].atom;
    if ((ends[0] == ring->atom && ends[1] == r->previous) ||
        (ends[1] == ring->atom && ends[0] == r->previous))
      return FAIL(r, start, "ring closure %d bonds two atoms a second time",
                  number);
  }
  if (ring->order && order && ring->order != order)
    return FAIL(r, start, "ring closure %d has one bond order here and another "
                "at column %ld", number, ring->column);
  add_bond(r, ring->atom, r->previous, order ? order : ring->order);
  ring->atom = -1;
  return MHO_OK;
}

/* A digit or %nn after an atom: opens a ring bond or closes it. */
static mho_status read_ring_bond(reader *r)
{
  const char *start = r->at;
  if (r->previous < 0 || r->fresh)
    return FAIL(r, start, "a ring closure must follow an atom");
  int number;
  if (*start == '%') {
    if (!is_digit(start[1]) || !is_digit(start[2]))
      return FAIL(r, start, "'%%' needs two digits, e.g. %%10");
    number = 10 * (start[1] - '0') + start[2] - '0';
    r->at += 3;
  } else {
    number = *r->at++ - '0';
  }
  int order = r->order;
  r->order = BOND_NONE;
  ring_opening *ring = &r->ring[number];
  if (ring->atom >= 0) return close_ring(r, ring, order, number, start);
  *ring = (ring_opening){r->previous, order, column_of(r, start)};
  return MHO_OK;
}

static mho_status read_branch(reader *r)
{
  if (*r->at == '(') {
    if (r->previous < 0 || r->fresh)
      return FAIL(r, r->at, "a branch must follow an atom");
    if (r->order) return FAIL(r, r->symbol, "the bond belongs behind the '('");
    r->branch[r->depth++] = (open_branch){r->previous, column_of(r, r->at)};
    r->fresh = true;
    r->at++;
    return MHO_OK;
  }
  if (r->depth == 0) return FAIL(r, r->at, "')' was never opened");
  if (r->order) return FAIL(r, r->symbol, "a bond leads nowhere");
  if (r->fresh) return FAIL(r, r->at, "the branch is empty");
  if (r->previous < 0)
    return FAIL(r, r->at - 1, "'.' stands between two parts");
  r->previous = r->branch[--r->depth].atom;
  r->at++;
  return MHO_OK;
}

/* `.` separates two parts; an atom must follow. */
static mho_status read_dot(reader *r)
{
  if (r->previous < 0) return FAIL(r, r->at, "'.' stands between two parts");
  if (r->order) return FAIL(r, r->symbol, "a bond leads nowhere");
  if (r->fresh && r->at[-1] != '(')
    return FAIL(r, r->at, "'.' stands between two parts");
  r->previous = -1;
  r->at++;
  return MHO_OK;
}

static mho_status read_bond(reader *r)
{
  if (r->previous < 0) return FAIL(r, r->at, "a bond must follow an atom");
  if (r->order) return FAIL(r, r->at, "two bonds in a row");
  r->symbol = r->at;
  r->order = bond_order(*r->at++);
  return MHO_OK;
}

static mho_status read_token(reader *r)
{
  char c = *r->at;
  if (c == '[') return read_bracket(r);
  if (c == '(' || c == ')') return read_branch(r);
  if (c == '.') return read_dot(r);
  if (c == '%' || is_digit(c)) return read_ring_bond(r);
  if (bond_order(c)) return read_bond(r);
  return read_bare_atom(r);
}

static bool is_blank(char c)
{
  return c == ' ' || c == '\t' || c == '\r' || c == '\n';
}

/* What may be left open at the end. */
static mho_status check_end(reader *r)
{
  if (r->graph->atom_count == 0)
    return FAIL(r, r->text, "there is no atom; e.g. Nc1ccc(N)cc1");
  if (r->depth)
    return mho_fail_column(r->error, MHO_ERR_SYNTAX, r->place,
                           r->branch[r->depth - 1].column, "'(' is never closed");
  if (r->order) return FAIL(r, r->symbol, "a bond leads nowhere");
  if (r->previous < 0) return FAIL(r, r->at - 1, "'.' stands between two parts");
  for (int i = 0; i < RINGS; i++)
    if (r->ring[i].atom >= 0)
      return mho_fail_column(r->error, MHO_ERR_SYNTAX, r->place,
                             r->ring[i].column, "ring closure %d is never closed", i);
  return MHO_OK;
}

static mho_status read_all(reader *r)
{
  while (is_blank(*r->at)) r->at++;
  while (*r->at && !is_blank(*r->at)) {
    mho_status status = read_token(r);
    if (status != MHO_OK) return status;
  }
  mho_status status = check_end(r);
  if (status != MHO_OK) return status;
  const char *end = r->at;
  while (is_blank(*r->at)) r->at++;
  if (*r->at) return FAIL(r, end, "a blank ends the SMILES, but more text follows");
  return mho_graph_complete(r->graph, r->place, r->error);
}

/* Bounds from the text alone: an atom takes a letter or `*`, a bond an atom
 * or two ring closures, a branch a `(`. */
static mho_status reserve(reader *r, size_t *length)
{
  int atoms = 0, closures = 0, branches = 0;
  const char *c = r->text;
  for (; *c && *length <= MHO_SMILES_LIMIT; c++, ++*length) {
    atoms += (*c >= 'A' && *c <= 'Z') || (*c >= 'a' && *c <= 'z') || *c == '*';
    closures += is_digit(*c);
    branches += *c == '(';
  }
  if (*length > MHO_SMILES_LIMIT)
    return mho_fail_column(r->error, MHO_ERR_LIMIT, r->place, MHO_SMILES_LIMIT + 1,
                           "the SMILES is longer than %d characters, the most "
                           "that is read", MHO_SMILES_LIMIT);
  r->branch = malloc(((size_t)branches + 1) * sizeof *r->branch);
  if (atoms > MHO_ATOM_LIMIT) atoms = MHO_ATOM_LIMIT;
  if (!r->branch || mho_graph_reserve(r->graph, atoms, atoms + closures) != MHO_OK)
    return mho_fail(r->error, MHO_ERR_MEMORY, MOLECULE_STAGE, NULL, "out of memory");
  return MHO_OK;
}

mho_status mho_smiles_read(const char *text, const mho_place *place,
                           mho_graph *graph, mho_error *error)
{
  reader r = {.text = text, .at = text, .place = place, .error = error,
              .graph = graph, .previous = -1};
  for (int i = 0; i < RINGS; i++) r.ring[i].atom = -1;
  size_t length = 0;
  mho_graph_clear(graph);
  mho_status status = reserve(&r, &length);
  if (status == MHO_OK) status = read_all(&r);
  free(r.branch);
  if (status != MHO_OK) mho_graph_clear(graph);
  return status;
}
