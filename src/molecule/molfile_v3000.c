/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * MDL molfile V3000 behind its counts line: lines `M  V30 ...`, a `-` at the
 * end of a line continuing it.
 *
 *   BEGIN CTAB, COUNTS atoms bonds ..., BEGIN ATOM,
 *   index symbol x y z map [CHG=n] [RAD=n] [VAL=n] [MASS=n] [RGROUPS=...],
 *   END ATOM, BEGIN BOND, index type first second ..., END BOND, END CTAB
 */
#include <stdlib.h>
#include <string.h>

#include "molecule/record_reader.h"

enum { TEXT_SIZE = 4096 };

typedef struct {
  int index, atom; /* as the file numbers it, as we do */
} numbering;

typedef struct {
  mho_record_reader *r;
  char text[TEXT_SIZE]; /* the logical line behind `M  V30 ` */
  const char *at;
  mho_record_state *state;
  numbering *number; /* [atoms], sorted by index once all are read */
  int atoms, bonds;
} reader;

/* The next logical line; false at the end of the record or where a line is no
 * V30 line. */
static bool next_line(reader *v)
{
  size_t used = 0;
  for (bool more = true; more;) {
    if (!mho_record_line(v->r) || v->r->length < 7 || strncmp(v->r->line, "M  V30 ", 7)) return false;
    const char *from = v->r->line + 7;
    size_t size = (size_t)v->r->length - 7;
    more = size > 0 && from[size - 1] == '-';
    if (more) size--;
    if (used + size >= TEXT_SIZE) size = TEXT_SIZE - 1 - used;
    memcpy(v->text + used, from, size);
    used += size;
  }
  v->text[used] = '\0';
  v->at = v->text;
  return true;
}

static const char *next_word(reader *v, int *length)
{
  v->at += strspn(v->at, " \t");
  const char *word = v->at;
  *length = (int)strcspn(word, " \t");
  if (*word == '"') { /* a quoted symbol */
    const char *close = strchr(word + 1, '"');
    if (close) *length = (int)(close - word) + 1;
  }
  v->at += *length;
  return word;
}

static bool read_integer(const char *word, int length, int *value)
{
  mho_record_reader line = {.line = word, .length = length};
  return length > 0 && mho_record_integer(&line, 0, length, value);
}

static bool next_integer(reader *v, int *value)
{
  int length;
  const char *word = next_word(v, &length);
  return read_integer(word, length, value);
}

static int column_of(const reader *v, const char *at)
{
  return 8 + (int)(at - v->text); /* of the first line, where it was not continued */
}

static mho_status fail(reader *v, const char *at, const char *message)
{
  return mho_record_fail(v->r, MHO_ERR_SYNTAX, column_of(v, at), "%s", message);
}

static mho_status read_option(reader *v, const char *word, int length, int index)
{
  mho_graph_atom *atom = &v->r->graph->atom[index];
  const char *equals = memchr(word, '=', (size_t)length);
  int value, key = equals ? (int)(equals - word) : length;
  bool number = equals && read_integer(equals + 1, length - key - 1, &value);
#define IS(name) (key == (int)strlen(name) && !strncmp(word, name, (size_t)key))
  if (IS("RGROUPS"))
    return mho_record_fail(v->r, MHO_ERR_UNPARAMETERISED, column_of(v, word),
                           "an R-group leaves the molecule open; draw its atoms");
  if (!IS("CHG") && !IS("RAD") && !IS("VAL") && !IS("MASS")) return MHO_OK;
  if (!number || value < -15 || value > 400)
    return fail(v, word, "the value behind '=' is no number that is allowed");
  if (IS("CHG") && value <= 15) atom->charge = value;
  else if (IS("RAD") && value >= 0 && value <= 3) v->state[index].radical = value;
  else if (IS("VAL") && value >= -1 && value <= 14) v->state[index].valence = value;
  else if (IS("MASS")) atom->isotope = value;
  else return fail(v, word, "the value behind '=' is out of range");
#undef IS
  return MHO_OK;
}

static mho_status read_atom(reader *v)
{
  mho_graph *g = v->r->graph;
  int index = g->atom_count, number, length, map;
  mho_graph_atom *atom = &g->atom[index];
  if (!next_line(v)) return mho_record_fail(v->r, MHO_ERR_SYNTAX, 1, "an atom is missing here");
  if (!next_integer(v, &number) || number < 1)
    return fail(v, v->text, "an atom begins with its index, from 1");
  const char *symbol = next_word(v, &length);
  atom->line = v->r->number;
  atom->column = column_of(v, symbol);
  mho_status status = mho_record_element(v->r, symbol, length, column_of(v, symbol), atom);
  if (status != MHO_OK) return status;
  for (int k = 0; k < 3; k++) {
    const char *word = next_word(v, &length);
    if (!mho_record_decimal(word, length, &g->position[index][k]))
      return fail(v, word, "three coordinates follow the symbol");
  }
  if (!next_integer(v, &map) || map < 0) return fail(v, v->at, "an atom map (or 0) follows the coordinates");
  atom->atom_class = map;
  v->number[index] = (numbering){number, index};
  for (const char *word = next_word(v, &length); length && status == MHO_OK; word = next_word(v, &length))
    status = read_option(v, word, length, index);
  g->atom_count++;
  return status;
}

static int compare_numbers(const void *a, const void *b)
{
  int first = ((const numbering *)a)->index, second = ((const numbering *)b)->index;
  return (first > second) - (first < second);
}

static mho_status read_bond(reader *v)
{
  int value[4];
  if (!next_line(v)) return mho_record_fail(v->r, MHO_ERR_SYNTAX, 1, "a bond is missing here");
  for (int k = 0; k < 4; k++)
    if (!next_integer(v, &value[k]))
      return fail(v, v->at, "a bond has an index, a type and two atoms");
  for (int k = 2; k < 4; k++) {
    numbering key = {value[k], 0};
    const numbering *found =
        bsearch(&key, v->number, (size_t)v->atoms, sizeof key, compare_numbers);
    value[k] = found ? found->atom + 1 : 0;
    if (!found) return fail(v, v->text, "the bond names an atom that does not exist");
  }
  return mho_record_bond(v->r, value[1], value[2], value[3], 8);
}

static bool is_line(const reader *v, const char *words)
{
  const char *at = v->text;
  for (; *words; words++) {
    if (*words == ' ') {
      if (*at != ' ') return false;
      at += strspn(at, " ");
    } else if (*at++ != *words) {
      return false;
    }
  }
  return *at == '\0' || *at == ' ';
}

static mho_status expect(reader *v, const char *words)
{
  if (next_line(v) && is_line(v, words)) return MHO_OK;
  return mho_record_fail(v->r, MHO_ERR_SYNTAX, 1, "'M  V30 %s' is missing here", words);
}

static mho_status read_counts(reader *v)
{
  int length;
  mho_status status = expect(v, "BEGIN CTAB");
  if (status == MHO_OK) status = expect(v, "COUNTS");
  if (status != MHO_OK) return status;
  next_word(v, &length);
  if (!next_integer(v, &v->atoms) || !next_integer(v, &v->bonds) || v->atoms < 0 || v->bonds < 0)
    return fail(v, v->text, "COUNTS needs the numbers of atoms and bonds");
  if (v->atoms > MHO_ATOM_LIMIT || v->bonds > 4 * MHO_ATOM_LIMIT)
    return mho_record_fail(v->r, MHO_ERR_LIMIT, 8, "%d atoms and %d bonds; at most %d and %d are allowed",
                           v->atoms, v->bonds, MHO_ATOM_LIMIT, 4 * MHO_ATOM_LIMIT);
  return MHO_OK;
}

static mho_status read_table(reader *v)
{
  mho_graph *g = v->r->graph;
  /* A line has 14 bytes at least: no more room than the record can fill. */
  long lines = (long)(v->r->end - v->r->at) / 14 + 2;
  int atoms = lines < v->atoms ? (int)lines : v->atoms, bonds = lines < v->bonds ? (int)lines : v->bonds;
  size_t n = (size_t)atoms + 1;
  v->state = calloc(n, sizeof *v->state);
  v->number = malloc(n * sizeof *v->number);
  g->position = calloc(n, sizeof *g->position);
  if (!v->state || !v->number || !g->position || mho_graph_reserve(g, atoms, bonds) != MHO_OK)
    return mho_record_fail(v->r, MHO_ERR_MEMORY, 0, "out of memory");
  mho_status status = expect(v, "BEGIN ATOM");
  for (int a = 0; a < v->atoms && status == MHO_OK; a++) status = read_atom(v);
  if (status == MHO_OK) status = expect(v, "END ATOM");
  if (status != MHO_OK) return status;
  qsort(v->number, (size_t)v->atoms, sizeof *v->number, compare_numbers);
  for (int a = 1; a < v->atoms; a++)
    if (v->number[a].index == v->number[a - 1].index)
      return mho_record_fail(v->r, MHO_ERR_SYNTAX, 1, "the index %d is given to two atoms",
                             v->number[a].index);
  if (v->bonds > 0) status = expect(v, "BEGIN BOND");
  for (int b = 0; b < v->bonds && status == MHO_OK; b++) status = read_bond(v);
  if (v->bonds > 0 && status == MHO_OK) status = expect(v, "END BOND");
  return status;
}

/* The blocks behind the bonds say nothing that is needed. */
static mho_status read_end(mho_record_reader *r)
{
  while (mho_record_line(r))
    if (r->length >= 6 && !strncmp(r->line, "M  END", 6)) return MHO_OK;
  return mho_record_fail(r, MHO_ERR_SYNTAX, 1, "the record ends without 'M  END'; is the file cut off?");
}

mho_status mho_molfile_v3000(mho_record_reader *r, bool spatial)
{
  reader v = {.r = r};
  mho_status status = read_counts(&v);
  if (status == MHO_OK) status = read_table(&v);
  if (status == MHO_OK) status = read_end(r);
  if (status == MHO_OK) status = mho_record_complete(r, v.state, spatial);
  free(v.state);
  free(v.number);
  return status;
}
