/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Cut sites by depth-first search (J. Hopcroft and R. Tarjan, Commun. ACM 16, 372
 * (1973)), links as what is left joined without them.
 */
#include "solver/chain.h"

#include <stdlib.h>
#include <string.h>

static void add_link(mho_chain *c, int i, int j, double hopping, bool fill)
{
  for (int way = 0; way < 2; way++) {
    if (fill) {
      c->hopping[c->start[i]] = hopping;
      c->next[c->start[i]++] = j;
    } else c->start[i + 1]++;
    int k = i;
    i = j;
    j = k;
  }
}

static void walk_hoppings(const mho_plan *plan, mho_chain *c, bool fill)
{
  for (size_t e = 0; e < plan->entries; e++) {
    const mho_entry *entry = &plan->entry[e];
    if (entry->i == entry->j) {
      if (fill) c->onsite[entry->i] += entry->value_ev;
    } else if (entry->value_ev != 0) add_link(c, entry->i, entry->j, entry->value_ev, fill);
  }
  for (int side = 0; side < 2; side++)
    for (size_t k = plan->support_start[side]; k < plan->support_start[side + 1]; k++) {
      int i = plan->support[k];
      add_link(c, i, plan->sites + side, plan->vector[side * plan->sites + i], fill);
    }
}

static mho_status collect(const mho_plan *plan, mho_chain *c)
{
  size_t n = (size_t)c->sites;
  c->start = calloc(n + 2, sizeof *c->start);
  c->onsite = calloc(n, sizeof *c->onsite);
  if (!c->start || !c->onsite) return MHO_ERR_MEMORY;
  walk_hoppings(plan, c, false);
  for (size_t i = 0; i < n; i++) c->start[i + 1] += c->start[i];
  c->next = malloc(((size_t)c->start[n] + 1) * sizeof *c->next);
  c->hopping = malloc(((size_t)c->start[n] + 1) * sizeof *c->hopping);
  if (!c->next || !c->hopping) return MHO_ERR_MEMORY;
  walk_hoppings(plan, c, true); /* every start now stands at its end */
  memmove(c->start + 1, c->start, n * sizeof *c->start);
  c->start[0] = 0;
  return MHO_OK;
}

/* The sites on the way from the left contact to the right one that all ways
 * share: those whose subtree towards the right has no edge back above them. */
static mho_status find_cuts(mho_chain *c)
{
  size_t n = (size_t)c->sites;
  int left = c->sites - 2, right = c->sites - 1, site = left, count = 0;
  int *room = malloc(4 * n * sizeof *room);
  c->cut = malloc(n * sizeof *c->cut);
  if (!room || !c->cut) {
    free(room);
    return MHO_ERR_MEMORY;
  }
  int *number = room, *low = room + n, *parent = low + n, *edge = parent + n;
  for (size_t i = 0; i < n; i++) number[i] = -1;
  memcpy(edge, c->start, n * sizeof *edge);
  number[left] = low[left] = count++;
  parent[left] = -1;
  while (site >= 0) {
    if (edge[site] < c->start[site + 1]) {
      int next = c->next[edge[site]++];
      if (number[next] < 0) {
        number[next] = low[next] = count++;
        parent[next] = site;
        site = next;
      } else if (number[next] < low[site]) low[site] = number[next];
    } else {
      int above = parent[site];
      if (above >= 0 && low[site] < low[above]) low[above] = low[site];
      site = above;
    }
  }
  c->apart = c->sites - count;
  c->cut[c->cuts++] = right;
  for (site = right; site != left; site = parent[site])
    if (low[site] >= number[parent[site]]) c->cut[c->cuts++] = parent[site];
  for (int i = 0; 2 * i < c->cuts - 1; i++) {
    int k = c->cut[i];
    c->cut[i] = c->cut[c->cuts - 1 - i];
    c->cut[c->cuts - 1 - i] = k;
  }
  free(room);
  return MHO_OK;
}

typedef struct {
  int first, last, seed; /* least and greatest cut site beside it; a site of it */
} part;

static int compare_parts(const void *a, const void *b)
{
  const part *p = a, *q = b;
  if (p->first != q->first) return p->first < q->first ? -1 : 1;
  if (p->last != q->last) return p->last < q->last ? -1 : 1;
  return (p->seed > q->seed) - (p->seed < q->seed);
}

/* What is joined to a site without passing cut sites, whose numbers order[] holds;
 * label[] of it becomes `name`. */
static part flood(const mho_chain *c, int seed, const int *order, int name, int *label, int *queue)
{
  part p = {c->cuts, -1, seed};
  int head = 0, tail = 0;
  label[seed] = name;
  queue[tail++] = seed;
  while (head < tail) {
    int i = queue[head++];
    for (int k = c->start[i]; k < c->start[i + 1]; k++) {
      int j = c->next[k], number = order[j];
      if (number >= 0) {
        if (number < p.first) p.first = number;
        if (number > p.last) p.last = number;
      } else if (label[j] != name) {
        label[j] = name;
        queue[tail++] = j;
      }
    }
  }
  return p;
}

/* Interior sites of a link, breadth first from its first cut site: so equal links
 * have their sites in the same order if the input has. */
static void order_sites(const mho_chain *c, mho_link *link, int name, int *label)
{
  int count = 0, head = 0;
  link->site[count++] = c->cut[link->first];
  if (link->last != link->first) link->site[count++] = c->cut[link->last];
  for (; head < count; head++) {
    int i = link->site[head];
    for (int k = c->start[i]; k < c->start[i + 1]; k++)
      if (label[c->next[k]] == name) {
        label[c->next[k]] = -1;
        link->site[count++] = c->next[k];
      }
  }
  link->sites = count;
}

static void make_links(mho_chain *c, part *parts, int count, const int *order, int *label, int *queue)
{
  int *site = c->room;
  qsort(parts, (size_t)count, sizeof *parts, compare_parts);
  for (int i = 0; i < c->sites; i++) label[i] = -1;
  for (int i = 0; i < count; i++) {
    const part *p = &parts[i];
    if (p->last < 0) continue; /* apart */
    flood(c, p->seed, order, c->links, label, queue);
    bool more = i + 1 < count && p->first != p->last && parts[i + 1].first == p->first &&
                parts[i + 1].last == p->last;
    if (more) continue;
    mho_link *link = &c->link[c->links];
    *link = (mho_link){.first = p->first, .last = p->last, .site = site};
    order_sites(c, link, c->links++, label);
    site += link->sites;
  }
}

static mho_status find_links(mho_chain *c)
{
  size_t n = (size_t)c->sites;
  int *room = malloc(3 * n * sizeof *room), count = 0;
  part *parts = malloc(n * sizeof *parts);
  c->link = malloc(n * sizeof *c->link);
  c->room = malloc(3 * n * sizeof *c->room); /* a link has one site of its own, and two ends */
  mho_status status = room && parts && c->link && c->room ? MHO_OK : MHO_ERR_MEMORY;
  if (status == MHO_OK) {
    int *order = room, *label = order + n, *queue = label + n;
    for (size_t i = 0; i < n; i++) order[i] = label[i] = -1;
    for (int k = 0; k < c->cuts; k++) order[c->cut[k]] = k;
    for (int i = 0; i < c->sites; i++)
      if (order[i] < 0 && label[i] < 0) {
        parts[count] = flood(c, i, order, count, label, queue);
        count++;
      }
    make_links(c, parts, count, order, label, queue);
  }
  free(room);
  free(parts);
  return status;
}

mho_status mho_chain_create(const mho_plan *plan, mho_chain *chain)
{
  *chain = (mho_chain){.sites = plan->sites + 2};
  mho_status status = collect(plan, chain);
  if (status == MHO_OK) status = find_cuts(chain);
  if (status == MHO_OK) status = find_links(chain);
  return status;
}

void mho_chain_clear(mho_chain *c)
{
  free(c->start);
  free(c->next);
  free(c->hopping);
  free(c->onsite);
  free(c->cut);
  free(c->link);
  free(c->room);
  *c = (mho_chain){0};
}

/* Between the outer cut sites all links belong to it; at them only the two named. */
int mho_chain_piece(const mho_chain *c, int first, int last, int *site, bool *mark)
{
  int from = c->link[first].first, to = c->link[last].last, count = 0;
  site[count++] = c->cut[from];
  if (to != from) site[count++] = c->cut[to];
  for (int k = from + 1; k < to; k++) site[count++] = c->cut[k];
  for (int k = 0; k < count; k++) mark[site[k]] = true;
  for (int l = 0; l < c->links; l++) {
    const mho_link *link = &c->link[l];
    bool side = link->first == link->last;
    bool outer = side && (link->first == from || link->first == to);
    bool own = l == first || l == last;
    if (link->first < from || link->last > to || (outer && !own)) continue;
    for (int k = 0; k < link->sites; k++)
      if (!mark[link->site[k]]) {
        mark[link->site[k]] = true;
        site[count++] = link->site[k];
      }
  }
  for (int k = 0; k < count; k++) mark[site[k]] = false;
  return count;
}

void mho_chain_hamiltonian(const mho_chain *c, int count, const int *site, int ends, int *place,
                           double *h)
{
  size_t n = (size_t)count;
  memset(h, 0, n * n * sizeof *h);
  for (int i = 0; i < count; i++) place[site[i]] = i;
  for (int i = 0; i < count; i++) {
    if (i >= ends) h[(size_t)i * n + (size_t)i] = c->onsite[site[i]];
    for (int k = c->start[site[i]]; k < c->start[site[i] + 1]; k++) {
      int j = place[c->next[k]];
      if (j >= 0) h[(size_t)i * n + (size_t)j] += c->hopping[k];
    }
  }
  for (int i = 0; i < count; i++) place[site[i]] = -1;
}
