/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "molecule/rings.h"

#include <stdlib.h>
#include <string.h>

static bool has_neighbour(const mho_neighbours *n, const int *used, int a, int b)
{
  for (int i = n->start[a]; i < n->start[a] + used[a]; i++)
    if (n->next[i] == b) return true;
  return false;
}

mho_status mho_neighbours_make(const mho_layout_graph *graph, mho_neighbours *n)
{
  *n = (mho_neighbours){.points = graph->points};
  n->start = calloc((size_t)graph->points + 2, sizeof *n->start);
  n->next = malloc((2 * (size_t)graph->bonds + 1) * sizeof *n->next);
  int *used = calloc((size_t)graph->points + 1, sizeof *used);
  if (!n->start || !n->next || !used) {
    free(used);
    mho_neighbours_clear(n);
    return MHO_ERR_MEMORY;
  }
  for (int b = 0; b < graph->bonds; b++)
    for (int end = 0; end < 2; end++) n->start[graph->bond[b][end] + 1]++;
  for (int v = 0; v < graph->points; v++) n->start[v + 1] += n->start[v];
  for (int b = 0; b < graph->bonds; b++) {
    int first = graph->bond[b][0], second = graph->bond[b][1];
    if (first == second || has_neighbour(n, used, first, second)) continue;
    n->next[n->start[first] + used[first]++] = second;
    n->next[n->start[second] + used[second]++] = first;
  }
  int count = 0; /* close the gaps of bonds that were given twice */
  for (int v = 0; v < graph->points; v++) {
    int from = n->start[v];
    n->start[v] = count;
    for (int i = 0; i < used[v]; i++) n->next[count++] = n->next[from + i];
  }
  n->start[graph->points] = count;
  free(used);
  return MHO_OK;
}

void mho_neighbours_clear(mho_neighbours *n)
{
  free(n->start);
  free(n->next);
  *n = (mho_neighbours){0};
}

typedef struct {
  const mho_neighbours *graph;
  int *queue, *from, *stamp; /* [points] */
  int walk;
  long work;
  size_t room, used; /* of rings->point */
  int ring_room;
} search;

/* Shortest way from a to b that does not use their bond; its points in
 * s->queue, b first, and their number; 0 if there is none. */
static int shortest_way(search *s, int a, int b)
{
  const mho_neighbours *g = s->graph;
  int head = 0, tail = 0;
  s->walk++;
  s->stamp[a] = s->walk;
  s->from[a] = -1;
  s->queue[tail++] = a;
  while (head < tail && s->stamp[b] != s->walk) {
    int at = s->queue[head++];
    for (int i = g->start[at]; i < g->start[at + 1]; i++) {
      int next = g->next[i];
      s->work--;
      if (s->stamp[next] == s->walk || (at == a && next == b)) continue;
      s->stamp[next] = s->walk;
      s->from[next] = at;
      s->queue[tail++] = next;
    }
  }
  if (s->stamp[b] != s->walk) return 0;
  int count = 0;
  for (int at = b; at >= 0; at = s->from[at]) s->queue[count++] = at;
  return count;
}

/* Is the ring in s->queue known?  seen[] stamps its points. */
static bool is_known(search *s, const mho_ring_list *rings, int count)
{
  s->walk++;
  for (int i = 0; i < count; i++) s->stamp[s->queue[i]] = s->walk;
  for (int r = 0; r < rings->count; r++) {
    if (rings->start[r + 1] - rings->start[r] != count) continue;
    bool same = true;
    for (int i = rings->start[r]; same && i < rings->start[r + 1]; i++) {
      same = s->stamp[rings->point[i]] == s->walk;
      s->work--;
    }
    if (same) return true;
  }
  return false;
}

static mho_status keep_ring(search *s, mho_ring_list *rings, int count)
{
  if (rings->count + 1 >= s->ring_room) {
    int room = 2 * s->ring_room + 8;
    int *larger = realloc(rings->start, (size_t)room * sizeof *larger);
    if (!larger) return MHO_ERR_MEMORY;
    rings->start = larger;
    s->ring_room = room;
  }
  if (s->used + (size_t)count > s->room) {
    size_t room = 2 * s->room + (size_t)count + 64;
    int *larger = realloc(rings->point, room * sizeof *larger);
    if (!larger) return MHO_ERR_MEMORY;
    rings->point = larger;
    s->room = room;
  }
  memcpy(rings->point + s->used, s->queue, (size_t)count * sizeof *rings->point);
  rings->start[rings->count++] = (int)s->used;
  s->used += (size_t)count;
  rings->start[rings->count] = (int)s->used;
  return MHO_OK;
}

mho_status mho_rings_find(const mho_neighbours *neighbours, long work,
                          mho_ring_list *rings, bool *complete)
{
  size_t n = (size_t)neighbours->points;
  *rings = (mho_ring_list){0};
  int *memory = calloc(3 * n + 1, sizeof *memory);
  if (!memory) return MHO_ERR_MEMORY;
  search s = {.graph = neighbours, .queue = memory, .from = memory + n,
              .stamp = memory + 2 * n, .work = work};
  mho_status status = MHO_OK;
  for (int a = 0; a < neighbours->points && status == MHO_OK; a++)
    for (int i = neighbours->start[a]; i < neighbours->start[a + 1]; i++) {
      int b = neighbours->next[i];
      if (b < a || s.work < 0) continue;
      int count = shortest_way(&s, a, b);
      if (count && !is_known(&s, rings, count)) status = keep_ring(&s, rings, count);
      if (status != MHO_OK) break;
    }
  free(memory);
  *complete = s.work >= 0;
  if (status != MHO_OK) mho_rings_clear(rings);
  return status;
}

void mho_rings_clear(mho_ring_list *rings)
{
  free(rings->start);
  free(rings->point);
  *rings = (mho_ring_list){0};
}
