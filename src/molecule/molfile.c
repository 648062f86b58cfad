/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * MDL molfile V2000 behind its counts line.  Fields stand in fixed columns:
 *
 *   atom:  x y z (10 each), blank, symbol (3), mass difference (2), charge
 *          code (3), parity (3), hydrogens (3), stereo (3), valence (3), ...,
 *          atom map (columns 61-63)
 *   bond:  first, second, type, stereo ... (3 each)
 *   then property lines `M  CHG`, `M  RAD`, `M  ISO`, up to `M  END`.
 */
#include <stdlib.h>
#include <string.h>

#include "molecule/element.h"
#include "molecule/record_reader.h"

enum { PROPERTY_PAIRS = 8 };

static bool begins(const mho_record_reader *r, const char *word)
{
  int length = (int)strlen(word);
  return r->length >= length && !strncmp(r->line, word, (size_t)length);
}

/* Charge codes of the atom block: 1 to 3 are +3 to +1, 4 a doublet radical,
 * 5 to 7 are -1 to -3. */
static bool set_charge_code(int code, mho_graph_atom *atom, mho_record_state *state)
{
  if (code < 0 || code > 7) return false;
  if (code == 4) state->radical = 2;
  else if (code) atom->charge = 4 - code;
  return true;
}

static mho_status read_atom(mho_record_reader *r, mho_record_state *state)
{
  mho_graph *g = r->graph;
  int index = g->atom_count, code, map, first = 31, last;
  mho_graph_atom *atom = &g->atom[index];
  if (!mho_record_line(r))
    return mho_record_fail(r, MHO_ERR_SYNTAX, 1, "the record ends in its atoms");
  for (int k = 0; k < 3; k++)
    if (r->length < 10 * k + 10 || !mho_record_decimal(r->line + 10 * k, 10, &g->position[index][k]))
      return mho_record_fail(r, MHO_ERR_SYNTAX, 10 * k + 1,
                             "no coordinate in the columns %d to %d of an atom", 10 * k + 1, 10 * k + 10);
  while (first < r->length && first < 34 && r->line[first] == ' ') first++;
  last = first;
  while (last < r->length && last < 34 && r->line[last] != ' ') last++;
  atom->line = r->number;
  atom->column = first + 1;
  mho_status status = mho_record_element(r, r->line + first, last - first, first + 1, atom);
  if (status != MHO_OK) return status;
  if (!mho_record_integer(r, 36, 3, &code) || !set_charge_code(code, atom, state))
    return mho_record_fail(r, MHO_ERR_SYNTAX, 37, "the charge code is a number from 0 to 7");
  if (!mho_record_integer(r, 48, 3, &state->valence) || state->valence < 0 || state->valence > 15)
    return mho_record_fail(r, MHO_ERR_SYNTAX, 49, "the valence is a number from 0 to 15");
  if (!mho_record_integer(r, 60, 3, &map) || map < 0)
    return mho_record_fail(r, MHO_ERR_SYNTAX, 61, "the atom map is a number");
  atom->atom_class = map;
  g->atom_count++;
  return MHO_OK;
}

static mho_status read_bond(mho_record_reader *r)
{
  int value[3];
  if (!mho_record_line(r))
    return mho_record_fail(r, MHO_ERR_SYNTAX, 1, "the record ends in its bonds");
  for (int k = 0; k < 3; k++)
    if (r->length <= 3 * k || !mho_record_integer(r, 3 * k, 3, &value[k]))
      return mho_record_fail(r, MHO_ERR_SYNTAX, 3 * k + 1,
                             "a bond begins with two atoms and a type, three columns each");
  return mho_record_bond(r, value[2], value[0], value[1], 1);
}

/* `M  CHGnn8 aaa vvv ...` */
static mho_status read_property(mho_record_reader *r, mho_record_state *state)
{
  mho_graph *g = r->graph;
  int count, atom, value;
  if (!mho_record_integer(r, 6, 3, &count) || count < 0 || count > PROPERTY_PAIRS)
    return mho_record_fail(r, MHO_ERR_SYNTAX, 7, "a property line has up to %d entries", PROPERTY_PAIRS);
  for (int i = 0; i < count; i++) {
    int at = 9 + 8 * i;
    if (r->length <= at + 4 || !mho_record_integer(r, at, 4, &atom) ||
        !mho_record_integer(r, at + 4, 4, &value))
      return mho_record_fail(r, MHO_ERR_SYNTAX, at + 1,
                             "an atom and a value are needed, four columns each");
    if (atom < 1 || atom > g->atom_count)
      return mho_record_fail(r, MHO_ERR_SYNTAX, at + 1, "atom %d does not exist; there are %d",
                             atom, g->atom_count);
    switch (r->line[3]) {
    case 'C':
      if (value < -15 || value > 15)
        return mho_record_fail(r, MHO_ERR_SYNTAX, at + 5, "a charge lies between -15 and 15");
      g->atom[atom - 1].charge = value;
      break;
    case 'R':
      if (value < 0 || value > 3)
        return mho_record_fail(r, MHO_ERR_SYNTAX, at + 5, "a radical is 1 singlet, 2 doublet or 3 triplet");
      state[atom - 1].radical = value;
      break;
    default: g->atom[atom - 1].isotope = value;
    }
  }
  return MHO_OK;
}

/* The first CHG or RAD line replaces all charges of the atom block. */
static void forget_codes(mho_graph *g, mho_record_state *state, bool *forgotten)
{
  for (int a = 0; a < g->atom_count && !*forgotten; a++)
    g->atom[a].charge = state[a].radical = 0;
  *forgotten = true;
}

static mho_status read_properties(mho_record_reader *r, mho_record_state *state)
{
  bool forgotten = false;
  int skip;
  while (mho_record_line(r)) {
    mho_status status = MHO_OK;
    if (begins(r, "M  END")) return MHO_OK;
    if (begins(r, "M  CHG") || begins(r, "M  RAD")) {
      forget_codes(r->graph, state, &forgotten);
      status = read_property(r, state);
    } else if (begins(r, "M  ISO")) {
      status = read_property(r, state);
    } else if (begins(r, "M  RGP") || begins(r, "M  ALS")) {
      status = mho_record_fail(r, MHO_ERR_UNPARAMETERISED, 1,
                               "R-groups and atom lists are no molecule; draw the atoms");
    } else if (begins(r, "A  ")) {
      mho_record_line(r); /* an alias stands in a line of its own */
    } else if (begins(r, "G  ")) {
      mho_record_line(r);
    } else if (begins(r, "S  SKP") && mho_record_integer(r, 6, 3, &skip)) {
      while (skip-- > 0 && mho_record_line(r)) {}
    }
    if (status != MHO_OK) return status;
  }
  return mho_record_fail(r, MHO_ERR_SYNTAX, 1, "the record ends without 'M  END'; is the file cut off?");
}

mho_status mho_molfile_v2000(mho_record_reader *r, bool spatial)
{
  int atoms, bonds, lists;
  if (r->length < 6 || !mho_record_integer(r, 0, 3, &atoms) || !mho_record_integer(r, 3, 3, &bonds) ||
      atoms < 0 || bonds < 0)
    return mho_record_fail(r, MHO_ERR_SYNTAX, 1,
                           "the counts line begins with the numbers of atoms and bonds, three columns each");
  if (mho_record_integer(r, 6, 3, &lists) && lists > 0)
    return mho_record_fail(r, MHO_ERR_UNPARAMETERISED, 7, "atom lists are no molecule; draw the atoms");
  mho_record_state *state = calloc((size_t)atoms + 1, sizeof *state);
  mho_status status = MHO_OK;
  r->graph->position = calloc((size_t)atoms + 1, sizeof *r->graph->position);
  if (!state || !r->graph->position || mho_graph_reserve(r->graph, atoms, bonds) != MHO_OK)
    status = mho_record_fail(r, MHO_ERR_MEMORY, 0, "out of memory");
  for (int a = 0; a < atoms && status == MHO_OK; a++) status = read_atom(r, &state[a]);
  for (int b = 0; b < bonds && status == MHO_OK; b++) status = read_bond(r);
  if (status == MHO_OK) status = read_properties(r, state);
  if (status == MHO_OK) status = mho_record_complete(r, state, spatial);
  free(state);
  return status;
}
