/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "molecule/graph.h"

#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "molecule/element.h"

void mho_graph_init(mho_graph *graph) { memset(graph, 0, sizeof *graph); }

void mho_graph_clear(mho_graph *graph)
{
  free(graph->atom);
  free(graph->bond);
  free(graph->start);
  free(graph->link);
  free(graph->position);
  mho_graph_init(graph);
}

mho_status mho_graph_reserve(mho_graph *graph, int atoms, int bonds)
{
  graph->atom = calloc((size_t)atoms + 1, sizeof *graph->atom);
  graph->bond = calloc((size_t)bonds + 1, sizeof *graph->bond);
  graph->start = calloc((size_t)atoms + 1, sizeof *graph->start);
  graph->link = calloc(2 * (size_t)bonds + 1, sizeof *graph->link);
  return graph->atom && graph->bond && graph->start && graph->link
             ? MHO_OK
             : MHO_ERR_MEMORY;
}

mho_status mho_fail_column(mho_error *error, mho_status status,
                           const mho_place *place, long column,
                           const char *format, ...)
{
  char message[400];
  va_list arguments;
  va_start(arguments, format);
  vsnprintf(message, sizeof message, format, arguments);
  va_end(arguments);
  if (place && place->record)
    return mho_fail_at(error, status, MOLECULE_STAGE, place->file, place->line,
                       place->column, "structure", "%s", message);
  long shown = place && place->line ? place->column + column - 1 : 0;
  return mho_fail_at(error, status, MOLECULE_STAGE, place ? place->file : NULL,
                     place ? place->line : 0, shown, "smiles", "column %ld: %s",
                     column, message);
}

mho_status mho_fail_atom(mho_error *error, mho_status status,
                         const mho_place *place, const mho_graph *graph,
                         int atom, const char *format, ...)
{
  char message[400];
  va_list arguments;
  va_start(arguments, format);
  vsnprintf(message, sizeof message, format, arguments);
  va_end(arguments);
  mho_place own = place ? *place : (mho_place){0};
  if (own.record) {
    own.line = graph->atom[atom].line;
    own.column = graph->atom[atom].column;
  }
  return mho_fail_column(error, status, &own, graph->atom[atom].column, "%s", message);
}

/* Neighbours of each atom, in the order of the bonds. */
void mho_graph_link_atoms(mho_graph *graph)
{
  int n = graph->atom_count;
  memset(graph->start, 0, ((size_t)n + 1) * sizeof *graph->start);
  for (int b = 0; b < graph->bond_count; b++)
    for (int end = 0; end < 2; end++) graph->start[graph->bond[b].atom[end]]++;
  for (int a = 1; a <= n; a++) graph->start[a] += graph->start[a - 1];
  for (int b = graph->bond_count - 1; b >= 0; b--)
    for (int end = 0; end < 2; end++)
      graph->link[--graph->start[graph->bond[b].atom[end]]] =
          (mho_graph_link){graph->bond[b].atom[!end], b};
}

/* A bond lies in a ring unless it is a bridge: R. Tarjan, Inf. Process.
 * Lett. 2, 160 (1974), with a stack of its own (a chain may be long).
 * depth, low, next, trail: four arrays [atom_count]. */
static void find_ring_bonds(mho_graph *graph, int *memory)
{
  int n = graph->atom_count;
  int *depth = memory, *low = memory + n, *next = memory + 2 * n;
  int *trail = memory + 3 * n; /* bond by which an atom was entered */
  for (int a = 0; a < n; a++) depth[a] = 0;
  for (int b = 0; b < graph->bond_count; b++) graph->bond[b].ring = true;
  for (int root = 0; root < n; root++) {
    if (depth[root]) continue;
    int a = root, clock = 1;
    depth[a] = low[a] = clock;
    next[a] = graph->start[a];
    trail[a] = -1;
    while (a >= 0) {
      if (next[a] < graph->start[a + 1]) {
        mho_graph_link link = graph->link[next[a]++];
        if (link.bond == trail[a]) continue;
        if (depth[link.atom]) {
          if (depth[link.atom] < low[a]) low[a] = depth[link.atom];
          continue;
        }
        a = link.atom;
        depth[a] = low[a] = ++clock;
        next[a] = graph->start[a];
        trail[a] = link.bond;
        continue;
      }
      int bond = trail[a];
      if (bond < 0) break;
      const int *ends = graph->bond[bond].atom;
      int parent = ends[0] == a ? ends[1] : ends[0];
      if (low[a] == depth[a]) graph->bond[bond].ring = false;
      if (low[a] < low[parent]) low[parent] = low[a];
      a = parent;
    }
  }
}

mho_status mho_graph_complete(mho_graph *graph, const mho_place *place,
                              mho_error *error)
{
  mho_graph_link_atoms(graph);
  int *memory = malloc(4 * (size_t)graph->atom_count * sizeof *memory + 1);
  if (!memory) return mho_fail(error, MHO_ERR_MEMORY, MOLECULE_STAGE, NULL, "out of memory");
  find_ring_bonds(graph, memory);
  free(memory);
  return mho_graph_kekulise(graph, place, error);
}

int mho_graph_atom_name(const mho_graph *graph, int atom, char *buffer,
                        size_t size)
{
  char name[16], digit[12];
  int length = 0, digits = 0;
  for (const char *c = mho_element_symbol(graph->atom[atom].element); *c; c++)
    name[length++] = *c;
  for (int number = atom + 1; number; number /= 10)
    digit[digits++] = (char)('0' + number % 10);
  while (digits) name[length++] = digit[--digits];
  if (size == 0) return length;
  size_t copied = (size_t)length < size ? (size_t)length : size - 1;
  memcpy(buffer, name, copied);
  buffer[copied] = '\0';
  return length;
}

int mho_graph_hydrogens(const mho_graph *graph, int atom)
{
  int count = graph->atom[atom].hydrogens;
  for (int i = graph->start[atom]; i < graph->start[atom + 1]; i++)
    count += graph->atom[graph->link[i].atom].element == ELEMENT_H;
  return count;
}

int mho_graph_degree(const mho_graph *graph, int atom)
{
  int count = 0;
  for (int i = graph->start[atom]; i < graph->start[atom + 1]; i++)
    count += graph->atom[graph->link[i].atom].element != ELEMENT_H;
  return count;
}

int mho_graph_parts(const mho_graph *graph)
{
  int n = graph->atom_count;
  int *part = malloc((size_t)n * sizeof *part + 1);
  if (!part) return -1;
  for (int a = 0; a < n; a++) part[a] = a;
  int parts = n;
  for (int b = 0; b < graph->bond_count; b++) {
    int root[2];
    for (int end = 0; end < 2; end++) {
      int a = graph->bond[b].atom[end];
      while (part[a] != a) a = part[a] = part[part[a]];
      root[end] = a;
    }
    parts -= root[0] != root[1];
    part[root[0]] = root[1];
  }
  free(part);
  return parts;
}

int mho_graph_rings(const mho_graph *graph)
{
  int parts = mho_graph_parts(graph);
  return parts < 0 ? -1 : graph->bond_count - graph->atom_count + parts;
}

typedef struct {
  char *buffer;
  size_t size, used;
} formula_text;

static void put_element(formula_text *text, const char *symbol, long count)
{
  if (count == 0) return;
  size_t room = text->used < text->size ? text->size - text->used : 0;
  char *end = room ? text->buffer + text->used : NULL;
  int length = count == 1 ? snprintf(end, room, "%s", symbol)
                          : snprintf(end, room, "%s%ld", symbol, count);
  text->used += (size_t)length;
}

int mho_graph_formula(const mho_graph *graph, char *buffer, size_t size)
{
  long count[ELEMENT_LIMIT + 1] = {0}, charge = 0;
  for (int a = 0; a < graph->atom_count; a++) {
    count[graph->atom[a].element]++;
    count[ELEMENT_H] += graph->atom[a].hydrogens;
    charge += graph->atom[a].charge;
  }
  formula_text text = {buffer, size, 0};
  if (size) buffer[0] = '\0';
  if (count[ELEMENT_C]) {
    put_element(&text, "C", count[ELEMENT_C]);
    put_element(&text, "H", count[ELEMENT_H]);
    count[ELEMENT_C] = count[ELEMENT_H] = 0;
  }
  for (const char *previous = "";;) {
    int next = -1;
    for (int e = 0; e <= ELEMENT_LIMIT; e++)
      if (strcmp(mho_element_symbol(e), previous) > 0 &&
          (next < 0 ||
           strcmp(mho_element_symbol(e), mho_element_symbol(next)) < 0))
        next = e;
    if (next < 0) break;
    previous = mho_element_symbol(next);
    put_element(&text, previous, count[next]);
  }
  if (charge) put_element(&text, charge > 0 ? "+" : "-", labs(charge));
  return (int)text.used;
}
