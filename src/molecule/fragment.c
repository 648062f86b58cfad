/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "molecule/fragment.h"

#include <stdio.h>
#include <stdlib.h>

#include "molecule/texts.h"

enum { NAME_SIZE = 24 };

/* part[a] is the first atom of a's part; queue[atoms]. */
static int find_parts(const mho_graph *g, int *part, int *queue)
{
  int parts = 0;
  for (int a = 0; a < g->atom_count; a++) part[a] = -1;
  for (int first = 0; first < g->atom_count; first++) {
    int head = 0, tail = 0;
    if (part[first] >= 0) continue;
    parts++;
    part[first] = first;
    queue[tail++] = first;
    while (head < tail) {
      int a = queue[head++];
      for (int i = g->start[a]; i < g->start[a + 1]; i++) {
        int next = g->link[i].atom;
        if (part[next] >= 0) continue;
        part[next] = first;
        queue[tail++] = next;
      }
    }
  }
  return parts;
}

/* Atoms at multiple bonds of each part, at its first atom. */
static void count_unsaturated(const mho_graph *g, const int *part, int *count)
{
  for (int a = 0; a < g->atom_count; a++) count[a] = 0;
  for (int a = 0; a < g->atom_count; a++) {
    bool unsaturated = false;
    for (int i = g->start[a]; i < g->start[a + 1]; i++)
      unsaturated |= g->bond[g->link[i].bond].order > 1;
    count[part[a]] += unsaturated;
  }
}

/* Do atom classes mark contacts in several parts? */
static bool is_marked_across(const mho_graph *g, const int *part)
{
  int marked = -1;
  for (int a = 0; a < g->atom_count; a++) {
    if (!g->atom[a].atom_class) continue;
    if (marked >= 0 && part[a] != marked) return true;
    marked = part[a];
  }
  return false;
}

static mho_status note_choice(const mho_graph *g, const int *part, const int *count, int parts,
                              int best, mho_texts *notes)
{
  char name[NAME_SIZE], list[200] = "";
  size_t used = 0;
  int equal = 0;
  for (int a = 0; a < g->atom_count; a++) {
    if (part[a] != a) continue;
    equal += count[a] == count[best];
    if (a == best || used + NAME_SIZE + 8 > sizeof list) continue;
    mho_graph_atom_name(g, a, name, sizeof name);
    used += (size_t)snprintf(list + used, sizeof list - used, "%s%s", used ? ", " : "", name);
  }
  mho_graph_atom_name(g, best, name, sizeof name);
  return mho_texts_add(notes, "%s conjugated one of %d separate parts is taken, that of %s; the parts "
                       "of %s are left out", equal > 1 ? "the first largest" : "the largest", parts,
                       name, list);
}

static void drop_linkers(const int *part, int best, mho_linkers *linkers)
{
  int kept = 0;
  for (int i = 0; i < linkers->count; i++)
    if (part[linkers->linker[i].atom[0]] == best) linkers->linker[kept++] = linkers->linker[i];
  linkers->count = kept;
}

mho_status mho_fragment_choose(const mho_graph *graph, mho_linkers *linkers, mho_texts *notes)
{
  size_t n = (size_t)graph->atom_count;
  int *memory = malloc((2 * n + 1) * sizeof *memory);
  if (!memory) return MHO_ERR_MEMORY;
  int *part = memory, *count = memory + n, best = 0;
  int parts = find_parts(graph, part, count);
  mho_status status = MHO_OK;
  if (parts > 1 && !is_marked_across(graph, part)) {
    count_unsaturated(graph, part, count);
    for (int a = 0; a < graph->atom_count; a++)
      if (count[a] > count[best]) best = a;
    if (count[best]) {
      for (int a = 0; a < graph->atom_count; a++) linkers->removed[a] |= part[a] != best;
      drop_linkers(part, best, linkers);
      if (notes) status = note_choice(graph, part, count, parts, best, notes);
    }
  }
  free(memory);
  return status;
}
