/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * J. Edmonds, Can. J. Math. 17, 449 (1965): search for an augmenting path
 * from each free vertex; an odd cycle (blossom) is shrunk to its base, kept
 * by union-find.  The start is a greedy matching that serves vertices with
 * one free neighbour first (Karp and Sipser 1981), which leaves almost
 * nothing to search in molecules.  A vertex whose search fails stays free in
 * this matching for good, which is why mho_match_maximum may stop there.
 */
#include "molecule/matching.h"

#include <stdlib.h>
#include <string.h>

enum { UNSEEN, OUTER, INNER };

typedef struct {
  const mho_match_graph *graph;
  int *mate;
  int *before; /* the outer vertex from which a vertex was reached */
  int *base;   /* union-find of blossoms */
  int *queue;
  int *stamp;  /* of the walk that looks for a common ancestor */
  char *label;
  int head, tail, walk;
} search_state;

static int find_base(search_state *s, int v)
{
  while (s->base[v] != v) {
    s->base[v] = s->base[s->base[v]];
    v = s->base[v];
  }
  return v;
}

/* Base of the blossom that the edge u-v closes: the first common outer
 * ancestor, both sides walked in turn. */
static int common_base(search_state *s, int u, int v)
{
  s->walk++;
  for (;;) {
    if (u >= 0) {
      u = find_base(s, u);
      if (s->stamp[u] == s->walk) return u;
      s->stamp[u] = s->walk;
      u = s->mate[u] >= 0 ? s->before[s->mate[u]] : -1;
    }
    int swap = u;
    u = v;
    v = swap;
  }
}

/* Shrinks one side of a blossom: its inner vertices become outer. */
static void shrink_side(search_state *s, int u, int across, int base)
{
  while (find_base(s, u) != base) {
    s->before[u] = across;
    across = s->mate[u];
    if (s->label[across] == INNER) {
      s->label[across] = OUTER;
      s->queue[s->tail++] = across;
    }
    if (s->base[u] == u) s->base[u] = base;
    if (s->base[across] == across) s->base[across] = base;
    u = s->before[across];
  }
}

static void augment(search_state *s, int free_end)
{
  for (int v = free_end; v >= 0;) {
    int u = s->before[v], next = s->mate[u];
    s->mate[u] = v;
    s->mate[v] = u;
    v = next;
  }
}

/* Grows the tree from root; true when the matching grew. */
static bool search_from(search_state *s, int root)
{
  const mho_match_graph *g = s->graph;
  for (int v = 0; v < g->count; v++) {
    s->base[v] = v;
    s->before[v] = -1;
    s->label[v] = UNSEEN;
  }
  s->head = s->tail = 0;
  s->label[root] = OUTER;
  s->queue[s->tail++] = root;
  while (s->head < s->tail) {
    int u = s->queue[s->head++];
    for (int e = g->start[u]; e < g->start[u + 1]; e++) {
      int v = g->next[e];
      if (s->label[v] == INNER || find_base(s, u) == find_base(s, v)) continue;
      if (s->label[v] == OUTER) {
        int base = common_base(s, u, v);
        shrink_side(s, u, v, base);
        shrink_side(s, v, u, base);
        continue;
      }
      s->before[v] = u;
      if (s->mate[v] < 0) {
        augment(s, v);
        return true;
      }
      s->label[v] = INNER;
      s->label[s->mate[v]] = OUTER;
      s->queue[s->tail++] = s->mate[v];
    }
  }
  return false;
}

static void match_pair(search_state *s, int u, int *degree)
{
  const mho_match_graph *g = s->graph;
  for (int e = g->start[u]; e < g->start[u + 1]; e++) {
    int v = g->next[e];
    if (s->mate[v] >= 0) continue;
    s->mate[u] = v;
    s->mate[v] = u;
    for (int end = 0; end < 2; end++) {
      int w = end ? v : u;
      for (int f = g->start[w]; f < g->start[w + 1]; f++)
        if (--degree[g->next[f]] == 1) s->queue[s->tail++] = g->next[f];
    }
    return;
  }
}

/* Greedy start; base[] serves as the count of free neighbours. */
static void match_greedily(search_state *s)
{
  const mho_match_graph *g = s->graph;
  int *degree = s->base;
  memset(degree, 0, (size_t)g->count * sizeof *degree);
  for (int v = 0; v < g->count; v++)
    for (int e = g->start[v]; e < g->start[v + 1]; e++)
      degree[v] += s->mate[g->next[e]] < 0;
  s->head = s->tail = 0;
  for (int v = 0; v < g->count; v++)
    if (degree[v] == 1) s->queue[s->tail++] = v;
  for (int v = 0; v < g->count; v++) {
    while (s->head < s->tail) {
      int u = s->queue[s->head++];
      if (s->mate[u] < 0) match_pair(s, u, degree);
    }
    if (s->mate[v] < 0) match_pair(s, v, degree);
  }
}

mho_status mho_match_maximum(const mho_match_graph *graph, int *mate,
                             bool *missed)
{
  size_t n = (size_t)graph->count;
  int *memory = malloc((5 * n + 1) * sizeof *memory + n);
  if (!memory) return MHO_ERR_MEMORY;
  search_state s = {.graph = graph, .mate = mate, .before = memory,
                    .base = memory + n, .stamp = memory + 2 * n,
                    .queue = memory + 3 * n,
                    .label = (char *)(memory + 5 * n + 1)};
  memset(s.stamp, 0, n * sizeof *s.stamp);
  match_greedily(&s);
  if (missed) memset(missed, 0, n * sizeof *missed);
  bool failed = false;
  for (int v = 0; v < graph->count && !(failed && !missed); v++)
    if (mate[v] < 0 && graph->start[v] < graph->start[v + 1])
      failed = !search_from(&s, v);
    else if (mate[v] < 0)
      failed = true;
  for (int v = 0; missed && v < graph->count; v++) {
    if (mate[v] >= 0) continue;
    search_from(&s, v);
    for (int u = 0; u < graph->count; u++)
      if (s.label[u] == OUTER) missed[u] = true;
  }
  free(memory);
  return MHO_OK;
}
