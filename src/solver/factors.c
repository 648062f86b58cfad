/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * States that neither contact sees cancel from P.  One that also vanishes on the
 * cut sites is one of its link's, which cancels there.  Any other one reaches from
 * a link with a zero of P at its energy, through links without, to the next one
 * with such a zero: a link without a zero there hands (psi, force) on by an
 * invertible matrix, a link with one only takes one line of that plane from the
 * left and one from the right.  So a state is the match of two such lines, seen as
 * a state of the piece between that neither end of the piece sees; and how many
 * there are in all is known exactly (exact.h).
 */
#include "solver/factors.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "solver/chain.h"
#include "solver/levels.h"
#include "solver/zeros.h"

/* Energies this near (times ||H||) are one. */
#define SAME_ENERGY 1e-13

typedef struct {
  int sites, ends, times; /* one end: a side group */
  double *h;              /* as mho_chain_hamiltonian */
  mho_plan *plan;         /* with the two ends, or the one twice, as contacts */
  mho_exact_counts counts;
  mho_nodes nodes;
} kind;

typedef struct {
  mho_node node;
  int kind, name; /* of links; of all that are one node */
} root;

typedef struct {
  const mho_plan *plan;
  mho_chain chain;
  kind *kind;
  int kinds, *kind_of; /* of a link */
  int *site, *place;   /* room for mho_chain_piece and mho_chain_hamiltonian */
  bool *mark, *has;    /* has[kind] a zero at the energy looked at */
  root *root;
  size_t roots;
} factors;

/* Contacts on the first site and on the last of the `ends` first ones. */
static mho_status plan_of(int sites, int ends, const double *h, mho_plan **plan,
                          mho_exact_counts *counts, mho_error *error)
{
  double gamma = 1, shift = 0, *vector = calloc(2 * (size_t)sites, sizeof *vector);
  *plan = NULL;
  if (!vector) return mho_fail(error, MHO_ERR_MEMORY, "solver", NULL, "out of memory");
  vector[0] = vector[sites + ends - 1] = 1;
  mho_lead left = {.channels = 1, .coupling_ev = &gamma, .shift_ev = &shift, .vector = vector};
  mho_lead right = left;
  right.vector = vector + sites;
  mho_junction junction;
  mho_status status =
      mho_junction_from_hamiltonian(sites, h, 0, 0, &left, &right, &junction, error);
  if (status == MHO_OK) status = mho_plan_create_bare(&junction, plan, error);
  mho_junction_clear(&junction);
  free(vector);
  if (status != MHO_OK) return status;
  status = mho_exact_count(*plan, counts);
  return status == MHO_OK ? status : mho_fail(error, status, "solver", NULL, "out of memory");
}

/* A side group of one site blocks at its energy. */
static mho_status single_site(kind *k, mho_error *error)
{
  k->nodes = (mho_nodes){.count = 1, .zeros = 1, .node = malloc(sizeof(mho_node))};
  if (!k->nodes.node) return mho_fail(error, MHO_ERR_MEMORY, "solver", NULL, "out of memory");
  k->nodes.node[0] = (mho_node){.kind = MHO_NODE_EXACT, .energy_ev = k->h[3], .order = 1};
  return MHO_OK;
}

/* The kind of a link, solved if it is a new one. */
static mho_status classify(factors *f, int number, bool patient, mho_error *error)
{
  const mho_link *link = &f->chain.link[number];
  int ends = 1 + (link->last != link->first);
  size_t n = (size_t)link->sites, size = n * n * sizeof(double);
  double *h = malloc(size);
  if (!h) return mho_fail(error, MHO_ERR_MEMORY, "solver", NULL, "out of memory");
  mho_chain_hamiltonian(&f->chain, link->sites, link->site, ends, f->place, h);
  int *which = &f->kind_of[number];
  for (*which = 0; *which < f->kinds; ++*which) {
    const kind *k = &f->kind[*which];
    if (k->sites == link->sites && k->ends == ends && !memcmp(k->h, h, size)) break;
  }
  kind *k = &f->kind[*which];
  if (*which < f->kinds) {
    free(h);
    k->times++;
    return MHO_OK;
  }
  f->kinds++;
  *k = (kind){.sites = link->sites, .ends = ends, .times = 1, .h = h};
  mho_status status = plan_of(k->sites, ends, h, &k->plan, &k->counts, error);
  if (status == MHO_OK)
    status = k->sites + ends == 3 ? single_site(k, error)
                                  : mho_nodes_of_block(k->plan, &k->counts, patient, &k->nodes, error);
  return status;
}

static bool is_same(const factors *f, const mho_node *a, const mho_node *b)
{
  double least = SAME_ENERGY * f->plan->norm_ev;
  return a->kind == b->kind && fabs(a->energy_ev - b->energy_ev) <= least &&
         fabs(a->imaginary_ev - b->imaginary_ev) <= least;
}

/* All zeros of all kinds, and which are one. */
static mho_status collect(factors *f)
{
  size_t room = 1;
  for (int i = 0; i < f->kinds; i++) room += f->kind[i].nodes.count;
  f->root = malloc(room * sizeof *f->root);
  if (!f->root) return MHO_ERR_MEMORY;
  for (int i = 0; i < f->kinds; i++)
    for (size_t k = 0; k < f->kind[i].nodes.count; k++) {
      root *r = &f->root[f->roots];
      *r = (root){f->kind[i].nodes.node[k], i, (int)f->roots};
      for (int j = 0; j < (int)f->roots; j++)
        if (f->root[j].name == j && is_same(f, &f->root[j].node, &r->node)) r->name = j;
      f->roots++;
    }
  return MHO_OK;
}

/* States at an energy that neither contact of a plan sees; -1: it is not clear. */
static int unseen_at(const mho_plan *plan, const mho_exact_counts *counts, double energy_ev)
{
  size_t n = (size_t)plan->sites;
  mho_level_group *group = malloc(n * sizeof *group);
  double *room = malloc(2 * n * sizeof *room);
  int unseen = -1;
  if (group && room) {
    int count = mho_levels_group(plan, group);
    if (mho_levels_settle(group, count, counts, plan->norm_ev, room)) {
      unseen = 0;
      for (int i = 0; i < count; i++)
        if (fabs(group[i].level_ev - energy_ev) <= SAME_ENERGY * plan->norm_ev)
          unseen += group[i].states - group[i].seen;
    }
  }
  free(group);
  free(room);
  return unseen;
}

/* States between two links next to each other among those with a zero at this energy:
 * what the piece of both has unseen, less what its links have.  -1: it is not clear. */
static mho_status look_between(factors *f, int first, int last, double energy_ev, int *states,
                               mho_error *error)
{
  const mho_link *from = &f->chain.link[first], *to = &f->chain.link[last];
  int ends = 1 + (to->last != from->first), own = 0;
  size_t n = (size_t)mho_chain_piece(&f->chain, first, last, f->site, f->mark);
  double *h = malloc(n * n * sizeof *h);
  mho_plan *plan = NULL;
  mho_exact_counts counts;
  if (!h) return mho_fail(error, MHO_ERR_MEMORY, "solver", NULL, "out of memory");
  mho_chain_hamiltonian(&f->chain, (int)n, f->site, ends, f->place, h);
  mho_status status = plan_of((int)n, ends, h, &plan, &counts, error);
  *states = status == MHO_OK ? unseen_at(plan, &counts, energy_ev) : -1;
  for (int l = first; *states >= 0 && l <= last; l++) {
    const mho_link *link = &f->chain.link[l];
    bool outer = link->first == link->last && (link->first == from->first || link->first == to->last);
    if (outer && l != first && l != last) continue;
    const kind *k = &f->kind[f->kind_of[l]];
    own = unseen_at(k->plan, &k->counts, energy_ev);
    *states = own < 0 || own > *states ? -1 : *states - own;
  }
  mho_plan_free(plan);
  free(h);
  return status;
}

/* Takes from a node the states between its links; *left less those, or -1. */
static mho_status cancel(factors *f, int name, mho_node *node, int *left, mho_error *error)
{
  mho_status status = MHO_OK;
  int before = -1;
  memset(f->has, 0, (size_t)f->kinds * sizeof *f->has);
  for (size_t r = 0; r < f->roots; r++)
    if (f->root[r].name == name) f->has[f->root[r].kind] = true;
  for (int l = 0; status == MHO_OK && *left >= 0 && l < f->chain.links; l++) {
    int states = 0;
    if (!f->has[f->kind_of[l]]) continue;
    if (before >= 0) status = look_between(f, before, l, node->energy_ev, &states, error);
    if (states < 0 || states > 1) *left = -1;
    else {
      *left -= states;
      node->order -= states;
    }
    before = l;
  }
  return status;
}

/* The nodes, less what cancels: `left` states in all. */
static mho_status combine(factors *f, int left, mho_nodes *result, bool *sure, mho_error *error)
{
  mho_status status = MHO_OK;
  result->node = malloc((f->roots + 1) * sizeof *result->node);
  if (!result->node) return mho_fail(error, MHO_ERR_MEMORY, "solver", NULL, "out of memory");
  for (size_t r = 0; status == MHO_OK && r < f->roots; r++) {
    if (f->root[r].name != (int)r) continue;
    mho_node *node = &result->node[result->count];
    *node = f->root[r].node;
    node->order = 0;
    for (size_t k = r; k < f->roots; k++)
      if (f->root[k].name == (int)r)
        node->order += f->root[k].node.order * f->kind[f->root[k].kind].times;
    if (left > 0 && node->kind == MHO_NODE_EXACT && node->order > 1)
      status = cancel(f, (int)r, node, &left, error);
    result->count += node->order > 0;
  }
  *sure = status == MHO_OK && left == 0;
  return status;
}

static bool is_one_link(const factors *f)
{
  const mho_chain *c = &f->chain;
  if (c->links != 1) return false;
  int own = 0;
  for (int k = 0; k < c->link[0].sites; k++) own += c->link[0].site[k] < f->plan->sites;
  return own == f->plan->sites;
}

static mho_status find(factors *f, const mho_exact_counts *counts, bool patient,
                       mho_nodes *result, bool *sure, mho_error *error)
{
  int left = f->plan->sites - counts->visible - f->chain.apart, zeros = 0;
  mho_status status = MHO_OK;
  for (int l = 0; status == MHO_OK && l < f->chain.links; l++)
    status = classify(f, l, patient, error);
  for (int i = 0; status == MHO_OK && i < f->kinds; i++) {
    const kind *k = &f->kind[i];
    left -= k->times * k->nodes.unseen;
    zeros += k->times * k->nodes.zeros;
  }
  if (status == MHO_OK && collect(f) != MHO_OK)
    status = mho_fail(error, MHO_ERR_MEMORY, "solver", NULL, "out of memory");
  if (status != MHO_OK) return status;
  result->unseen = f->plan->sites - counts->visible;
  result->zeros = zeros - left;
  if (left < 0 || result->zeros != counts->visible - 1 - counts->first) return MHO_OK;
  return combine(f, left, result, sure, error);
}

static mho_status factors_create(const mho_plan *plan, factors *f)
{
  *f = (factors){.plan = plan};
  mho_status status = mho_chain_create(plan, &f->chain);
  if (status != MHO_OK) return status;
  size_t n = (size_t)f->chain.sites, links = (size_t)f->chain.links + 1;
  f->kind = calloc(links, sizeof *f->kind);
  f->kind_of = malloc(links * sizeof *f->kind_of);
  f->site = malloc(2 * n * sizeof *f->site);
  f->mark = calloc(n + links, sizeof *f->mark);
  if (!f->kind || !f->kind_of || !f->site || !f->mark) return MHO_ERR_MEMORY;
  f->place = f->site + n;
  f->has = f->mark + n;
  for (size_t i = 0; i < n; i++) f->place[i] = -1;
  return MHO_OK;
}

static void factors_clear(factors *f)
{
  for (int i = 0; f->kind && i < f->kinds; i++) {
    free(f->kind[i].h);
    mho_plan_free(f->kind[i].plan);
    mho_nodes_clear(&f->kind[i].nodes);
  }
  free(f->kind);
  free(f->kind_of);
  free(f->site);
  free(f->mark);
  free(f->root);
  mho_chain_clear(&f->chain);
}

mho_status mho_factors_find(const mho_plan *plan, const mho_exact_counts *counts, bool patient,
                            mho_nodes *result, bool *sure, mho_error *error)
{
  factors f;
  *sure = false;
  mho_status status = factors_create(plan, &f);
  if (status != MHO_OK) mho_fail(error, status, "solver", NULL, "out of memory");
  else if (!is_one_link(&f)) status = find(&f, counts, patient, result, sure, error);
  factors_clear(&f);
  if (status == MHO_OK && !*sure) mho_nodes_clear(result);
  return status;
}
