/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Pairs that a renumbering of the sites turns into each other, H unchanged, have
 * everything in common.  nauty (B. D. McKay and A. Piperno, J. Symb. Comput. 60,
 * 94 (2014)) gives generators of those renumberings for a graph with coloured
 * vertices: sites by their energy and, where hoppings differ, one vertex a
 * hopping by its value.  Doubles are equal or not; nothing is rounded.
 */
#include <pthread.h>
#include <stdlib.h>

/* sparse graphs of any size; its own flag for long vertex numbers stays off */
#include <nauty/nausparse.h>

#include "analysis/pairs.h"

/* nauty works in storage of its own, and its call-back carries nothing along. */
static pthread_mutex_t lock = PTHREAD_MUTEX_INITIALIZER;
static struct orbits *current;

struct orbits {
  int sites;
  const mho_interference *map;
  size_t *parent; /* union-find over pairs, to the first of an orbit */
  size_t *index;  /* [sites][sites]: pair of two sites */
};

static size_t find(size_t *parent, size_t p)
{
  while (parent[p] != p) p = parent[p] = parent[parent[p]];
  return p;
}

static void unite(int count, int *image, int *orbit, int orbits, int stabilised, int n)
{
  (void)count;
  (void)orbit;
  (void)orbits;
  (void)stabilised;
  (void)n;
  struct orbits *o = current;
  for (size_t p = 0; p < o->map->count; p++) {
    size_t a = (size_t)image[o->map->pair[p].site[0]], b = (size_t)image[o->map->pair[p].site[1]];
    size_t first = find(o->parent, p);
    size_t second = find(o->parent, o->index[a * (size_t)o->sites + b]);
    if (first < second) o->parent[second] = first;
    else o->parent[first] = second;
  }
}

typedef struct {
  double value;
  int vertex;
} coloured;

static int by_value(const void *a, const void *b)
{
  const coloured *x = a, *y = b;
  if (x->value != y->value) return x->value < y->value ? -1 : 1;
  return x->vertex - y->vertex;
}

/* Vertices sorted by colour into label; part is 0 at the last of a colour. */
static void set_colours(coloured *vertex, size_t first, size_t end, int *label, int *part)
{
  qsort(vertex + first, end - first, sizeof *vertex, by_value);
  for (size_t k = first; k < end; k++) {
    label[k] = vertex[k].vertex;
    part[k] = k + 1 < end && vertex[k + 1].value == vertex[k].value;
  }
}

static double hopping(const mho_junction *j, int a, int b)
{
  return j->hamiltonian_ev[(size_t)a * (size_t)j->sites + (size_t)b];
}

static bool is_uniform(const mho_junction *j, const mho_pair_graph *g)
{
  double value = 0;
  for (int i = 0; i < g->count; i++)
    for (int k = g->start[i]; k < g->start[i + 1]; k++) {
      double h = hopping(j, i, g->next[k]);
      if (value != 0 && h != value) return false;
      value = h;
    }
  return true;
}

/* The site at the other end of a link, or the vertex that stands for it. */
static void link_vertices(const mho_pair_graph *g, bool uniform, sparsegraph *s)
{
  int bond = g->count, arcs = g->start[g->count];
  for (int i = 0; i < g->count; i++) {
    s->v[i] = (size_t)g->start[i];
    s->d[i] = g->start[i + 1] - g->start[i];
    for (int k = g->start[i]; uniform && k < g->start[i + 1]; k++) s->e[k] = g->next[k];
  }
  for (int i = 0; i < g->count && !uniform; i++)
    for (int k = g->start[i]; k < g->start[i + 1]; k++) {
      int other = g->next[k];
      if (other < i) continue;
      int back = g->start[other];
      while (g->next[back] != i) back++;
      s->v[bond] = (size_t)(arcs + 2 * (bond - g->count));
      s->d[bond] = 2;
      s->e[s->v[bond]] = i;
      s->e[s->v[bond] + 1] = other;
      s->e[k] = s->e[back] = bond++;
    }
}

static void colour_vertices(const mho_junction *j, const sparsegraph *s, coloured *vertex,
                            int *label, int *part)
{
  size_t n = (size_t)j->sites, all = (size_t)s->nv;
  for (size_t i = 0; i < n; i++)
    vertex[i] = (coloured){j->hamiltonian_ev[i * n + i], (int)i};
  for (size_t b = n; b < all; b++)
    vertex[b] = (coloured){hopping(j, s->e[s->v[b]], s->e[s->v[b] + 1]), (int)b};
  set_colours(vertex, 0, n, label, part);
  set_colours(vertex, n, all, label, part);
}

static mho_status unite_all(const mho_junction *j, const mho_pair_graph *g, struct orbits *orbits)
{
  DEFAULTOPTIONS_SPARSEGRAPH(options);
  statsblk statistics;
  sparsegraph s;
  SG_INIT(s);
  bool uniform = is_uniform(j, g);
  size_t links = (size_t)g->start[g->count] / 2, vertices = (size_t)g->count;
  if (!uniform) vertices += links;
  size_t arcs = uniform ? 2 * links : 4 * links;
  int *room = malloc((4 * vertices + arcs + 1) * sizeof *room);
  size_t *start = malloc(vertices * sizeof *start);
  coloured *vertex = malloc(vertices * sizeof *vertex);
  if (room && start && vertex) {
    s.nv = (int)vertices;
    s.nde = arcs;
    s.v = start;
    s.d = room + 3 * vertices;
    s.e = s.d + vertices;
    s.vlen = s.dlen = vertices;
    s.elen = arcs;
    link_vertices(g, uniform, &s);
    colour_vertices(j, &s, vertex, room, room + vertices);
    options.defaultptn = FALSE;
    options.userautomproc = unite;
    pthread_mutex_lock(&lock);
    current = orbits;
    sparsenauty(&s, room, room + vertices, room + 2 * vertices, &options, &statistics, NULL);
    pthread_mutex_unlock(&lock);
  }
  mho_status status = room && start && vertex ? MHO_OK : MHO_ERR_MEMORY;
  free(room);
  free(start);
  free(vertex);
  return status;
}

mho_status mho_pairs_orbits(const mho_junction *junction, const mho_pair_graph *graph,
                            const mho_interference *map, size_t *leader)
{
  size_t n = (size_t)junction->sites;
  struct orbits o = {.sites = junction->sites, .map = map, .parent = leader};
  o.index = malloc(n * n * sizeof *o.index);
  if (!o.index) return MHO_ERR_MEMORY;
  for (size_t p = 0; p < map->count; p++) {
    size_t a = (size_t)map->pair[p].site[0], b = (size_t)map->pair[p].site[1];
    leader[p] = o.index[a * n + b] = o.index[b * n + a] = p;
  }
  mho_status status = unite_all(junction, graph, &o);
  for (size_t p = 0; p < map->count; p++) leader[p] = find(leader, p);
  free(o.index);
  return status;
}
