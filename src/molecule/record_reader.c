/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "molecule/record_reader.h"

#include <mho/quantity.h>

#include <math.h>
#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "molecule/element.h"
#include "molecule/texts.h"

enum { TYPE_AROMATIC = 4, TYPE_COORDINATION = 9, TYPE_HYDROGEN = 10, VALENCE_ZERO = 15 };

bool mho_record_line(mho_record_reader *r)
{
  r->line = r->end;
  r->length = 0;
  if (r->at >= r->end) return false;
  const char *end = memchr(r->at, '\n', (size_t)(r->end - r->at));
  const char *next = end ? end + 1 : r->end;
  if (!end) end = r->end;
  while (end > r->at && (end[-1] == '\r' || end[-1] == ' ' || end[-1] == '\t')) end--;
  r->line = r->at;
  r->length = end - r->at > 10000 ? 10000 : (int)(end - r->at);
  r->at = next;
  r->number++;
  return true;
}

mho_status mho_record_fail(mho_record_reader *r, mho_status status, int column,
                           const char *format, ...)
{
  char message[400];
  va_list arguments;
  va_start(arguments, format);
  vsnprintf(message, sizeof message, format, arguments);
  va_end(arguments);
  return mho_fail_at(r->error, status, MOLECULE_STAGE, r->place->file, r->number, column,
                     "structure", "%s", message);
}

bool mho_record_integer(const mho_record_reader *r, int start, int width, int *value)
{
  int at = start, end = start + width, digits = 0, sign = 1;
  *value = 0;
  if (end > r->length) end = r->length;
  while (at < end && r->line[at] == ' ') at++;
  if (at >= end) return true;
  if (r->line[at] == '-' || r->line[at] == '+') sign = r->line[at++] == '-' ? -1 : 1;
  for (; at < end && r->line[at] >= '0' && r->line[at] <= '9' && digits < 7; at++, digits++)
    *value = 10 * *value + (r->line[at] - '0');
  while (at < end && r->line[at] == ' ') at++;
  *value *= sign;
  return digits > 0 && at == end;
}

bool mho_record_decimal(const char *text, int length, double *value)
{
  char copy[64];
  const char *end;
  while (length > 0 && (*text == ' ' || *text == '\t')) {
    text++;
    length--;
  }
  while (length > 0 && (text[length - 1] == ' ' || text[length - 1] == '\t')) length--;
  if (length <= 0 || length >= (int)sizeof copy) return false;
  memcpy(copy, text, (size_t)length);
  copy[length] = '\0';
  return mho_number_read(copy, &end, value) && !*end && fabs(*value) < 1e6;
}

static bool is_word(const char *symbol, int length, const char *const *words)
{
  for (; *words; words++)
    if ((int)strlen(*words) == length && !strncmp(*words, symbol, (size_t)length)) return true;
  return false;
}

mho_status mho_record_element(mho_record_reader *r, const char *symbol, int length,
                              int column, mho_graph_atom *atom)
{
  static const char *const groups[] = {"R", "R#", "*", "Pol", "Mod", NULL};
  static const char *const queries[] = {"A", "AH", "Q", "QH", "X", "XH", "M", "MH", "L", "LP", NULL};
  char word[8] = "";
  size_t used = 0;
  if (length > 0 && length < (int)sizeof word) memcpy(word, symbol, (size_t)length);
  if (is_word(symbol, length, groups) ||
      (length > 1 && *symbol == 'R' && symbol[1] >= '0' && symbol[1] <= '9'))
    return mho_record_fail(r, MHO_ERR_UNPARAMETERISED, column,
                           "'%s' stands for a group that the file leaves open; draw its atoms",
                           word);
  if (is_word(symbol, length, queries) || (length > 0 && (*symbol == '[' || !strncmp(symbol, "NOT[", 4))))
    return mho_record_fail(r, MHO_ERR_UNPARAMETERISED, column,
                           "a query atom ('%.*s') is no molecule; draw an element",
                           length < 20 ? length : 20, symbol);
  if (!strcmp(word, "D") || !strcmp(word, "T")) {
    atom->isotope = *word == 'D' ? 2 : 3;
    atom->element = ELEMENT_H;
    return MHO_OK;
  }
  atom->element = word[0] ? mho_element_read(word, &used) : -1;
  if (atom->element > 0 && (int)used == length) return MHO_OK;
  return mho_record_fail(r, MHO_ERR_SYNTAX, column, "'%.*s' is no element; e.g. C, N, Cl",
                         length < 20 ? length : 20, symbol);
}

mho_status mho_record_bond(mho_record_reader *r, int type, int first, int second, int column)
{
  mho_graph *g = r->graph;
  if (first < 1 || first > g->atom_count || second < 1 || second > g->atom_count)
    return mho_record_fail(r, MHO_ERR_SYNTAX, column, "atom %d does not exist; there are %d",
                           first < 1 || first > g->atom_count ? first : second, g->atom_count);
  if (first == second)
    return mho_record_fail(r, MHO_ERR_SYNTAX, column, "atom %d is bonded to itself", first);
  if (type == TYPE_COORDINATION || type == TYPE_HYDROGEN) {
    if (!r->notes) return MHO_OK;
    return mho_texts_add(r->notes, "the %s bond of atoms %d and %d is left out",
                         type == TYPE_HYDROGEN ? "hydrogen" : "coordination", first, second) == MHO_OK
               ? MHO_OK
               : mho_record_fail(r, MHO_ERR_MEMORY, 0, "out of memory");
  }
  if (type < 1 || type > TYPE_AROMATIC)
    return mho_record_fail(r, MHO_ERR_UNPARAMETERISED, column,
                           "bond type %d is a query, no bond; 1, 2, 3 and 4 (aromatic) are allowed",
                           type);
  bool aromatic = type == TYPE_AROMATIC;
  g->bond[g->bond_count++] = (mho_graph_bond){
      .atom = {first - 1, second - 1}, .order = aromatic ? 1 : type, .aromatic = aromatic};
  if (aromatic) g->atom[first - 1].aromatic = g->atom[second - 1].aromatic = true;
  return MHO_OK;
}

static int compare_pairs(const void *a, const void *b)
{
  const int *first = a, *second = b;
  return first[0] != second[0] ? (first[0] > second[0]) - (first[0] < second[0])
                               : (first[1] > second[1]) - (first[1] < second[1]);
}

static mho_status refuse_repeated_bonds(mho_record_reader *r)
{
  mho_graph *g = r->graph;
  int(*pair)[2] = malloc(((size_t)g->bond_count + 1) * sizeof *pair);
  if (!pair) return mho_record_fail(r, MHO_ERR_MEMORY, 0, "out of memory");
  for (int b = 0; b < g->bond_count; b++) {
    const int *ends = g->bond[b].atom;
    pair[b][ends[0] > ends[1]] = ends[0];
    pair[b][ends[0] < ends[1]] = ends[1];
  }
  qsort(pair, (size_t)g->bond_count, sizeof *pair, compare_pairs);
  mho_status status = MHO_OK;
  for (int b = 1; b < g->bond_count && status == MHO_OK; b++)
    if (!compare_pairs(pair[b], pair[b - 1]))
      status = mho_fail_at(r->error, MHO_ERR_SYNTAX, MOLECULE_STAGE, r->place->file, r->place->line,
                           r->place->column, "structure", "atoms %d and %d are bonded twice",
                           pair[b][0] + 1, pair[b][1] + 1);
  free(pair);
  return status;
}

/* An explicit valence gives the hydrogens.  At an aromatic bond it would have
 * to be guessed what the bond counts, so there the usual valence stands. */
static mho_status set_valences(mho_record_reader *r, const mho_record_state *state)
{
  mho_graph *g = r->graph;
  int *used = calloc((size_t)g->atom_count + 1, sizeof *used);
  if (!used) return mho_record_fail(r, MHO_ERR_MEMORY, 0, "out of memory");
  for (int b = 0; b < g->bond_count; b++)
    for (int end = 0; end < 2; end++) used[g->bond[b].atom[end]] += g->bond[b].order;
  mho_status status = MHO_OK;
  for (int a = 0; a < g->atom_count && status == MHO_OK; a++) {
    mho_graph_atom *atom = &g->atom[a];
    if (state[a].radical) atom->radical = state[a].radical == 2 ? 1 : 2;
    if (!state[a].valence || atom->aromatic) continue;
    int valence = state[a].valence == VALENCE_ZERO || state[a].valence < 0 ? 0 : state[a].valence;
    atom->bracket = true;
    atom->radical = 0; /* what the usual valence leaves open */
    atom->hydrogens = valence - used[a];
    if (atom->hydrogens < 0 || valence > VALENCE_ZERO)
      status = mho_fail_atom(r->error, MHO_ERR_SYNTAX, r->place, g, a,
                             "atom %d has the valence %d, but bonds for %d", a + 1, valence, used[a]);
  }
  free(used);
  return status;
}

mho_status mho_record_complete(mho_record_reader *r, const mho_record_state *state,
                               bool spatial)
{
  mho_graph *g = r->graph;
  bool any = false;
  if (g->atom_count == 0)
    return mho_record_fail(r, MHO_ERR_SYNTAX, 1, "the record holds no atom");
  for (int a = 0; a < g->atom_count; a++) {
    const double *p = g->position[a];
    any |= p[0] != 0 || p[1] != 0 || p[2] != 0;
    spatial |= p[2] != 0;
  }
  g->is_3d = any && spatial;
  if (!any) {
    free(g->position);
    g->position = NULL;
  }
  mho_status status = refuse_repeated_bonds(r);
  if (status == MHO_OK) status = set_valences(r, state);
  return status == MHO_OK ? mho_graph_complete(g, r->place, r->error) : status;
}
