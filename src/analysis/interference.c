/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <mho/interference.h>
#include <mho/transmission.h>

#include <float.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "analysis/pairs.h"
#include "base/lapack.h"

/* Nearer to a level than this, pairs go through plans one by one. */
#define LEVEL_REACH_EV 1e-4

/* Rounding errors of sum |c_ki c_kj / (E - level)| that a node may have left. */
#define ZERO_ROUNDOFFS 64

#define COUPLING_MAX_EV 10.0

static const char *const words[] = {
#define PAIR_WORD(code, word) word,
    MHO_PAIR_LIST(PAIR_WORD)
#undef PAIR_WORD
};

const char *mho_pair_word(mho_pair_class kind) { return words[kind]; }

mho_interference_options mho_interference_defaults(const mho_molecule *molecule)
{
  return (mho_interference_options){.coupling_ev = molecule->contact[MHO_LEFT].coupling_ev,
                                    .nodes = true, .rules = true, .magic = true};
}

static void link_sites(const mho_junction *j, mho_pair_graph *g, bool fill)
{
  int n = j->sites, links = 0;
  for (int a = 0; a < n; a++) {
    g->start[a] = links;
    for (int b = 0; b < n; b++)
      if (a != b && j->hamiltonian_ev[(size_t)a * (size_t)n + (size_t)b] != 0) {
        if (fill) g->next[links] = b;
        links++;
      }
  }
  g->start[n] = links;
}

static void walk_from(mho_pair_graph *g, int root, int *queue)
{
  int *distance = g->distance + (size_t)root * (size_t)g->count, head = 0, tail = 0;
  for (int i = 0; i < g->count; i++) distance[i] = -1;
  distance[root] = 0;
  queue[tail++] = root;
  while (head < tail) {
    int i = queue[head++];
    for (int k = g->start[i]; k < g->start[i + 1]; k++)
      if (distance[g->next[k]] < 0) {
        distance[g->next[k]] = distance[i] + 1;
        queue[tail++] = g->next[k];
      }
  }
}

static void colour(mho_pair_graph *g)
{
  g->two_coloured = true;
  for (int i = 0; i < g->count; i++) g->colour[i] = -1;
  for (int root = 0; root < g->count; root++) {
    if (g->colour[root] >= 0) continue;
    const int *distance = g->distance + (size_t)root * (size_t)g->count;
    for (int i = 0; i < g->count; i++)
      if (distance[i] >= 0) g->colour[i] = distance[i] % 2;
  }
  for (int i = 0; i < g->count; i++)
    for (int k = g->start[i]; k < g->start[i + 1]; k++)
      g->two_coloured &= g->colour[i] != g->colour[g->next[k]];
}

mho_status mho_pair_graph_build(const mho_junction *junction, mho_pair_graph *g)
{
  size_t n = (size_t)junction->sites;
  *g = (mho_pair_graph){.count = junction->sites};
  g->start = malloc((n + 1) * sizeof(int));
  g->distance = malloc(n * n * sizeof(int));
  g->colour = malloc(n * sizeof(int));
  int *queue = malloc(n * sizeof(int));
  if (g->start) link_sites(junction, g, false);
  if (g->start) g->next = malloc(((size_t)g->start[n] + 1) * sizeof(int));
  bool good = g->start && g->next && g->distance && g->colour && queue;
  if (good) link_sites(junction, g, true);
  for (int i = 0; good && i < g->count; i++) walk_from(g, i, queue);
  if (good) colour(g);
  free(queue);
  return good ? MHO_OK : MHO_ERR_MEMORY;
}

void mho_pair_graph_clear(mho_pair_graph *g)
{
  free(g->start);
  free(g->next);
  free(g->distance);
  free(g->colour);
  *g = (mho_pair_graph){0};
}

mho_status mho_bare_green(const mho_junction *junction, double energy_ev, double *work,
                          double *green, mho_error *error)
{
  size_t n = (size_t)junction->sites;
  for (size_t k = 0; k < n; k++) {
    double weight = 1 / (energy_ev - junction->level_ev[k]);
    for (size_t i = 0; i < n; i++) work[k * n + i] = weight * junction->orbital[k * n + i];
  }
  return mho_multiply_transposed(junction->sites, work, junction->orbital, green, error);
}

mho_status mho_pair_plan(const mho_junction *junction, const int site[2], double coupling_ev,
                         mho_plan **plan, mho_error *error)
{
  size_t n = (size_t)junction->sites;
  double shift = 0, *vector = calloc(2 * n, sizeof *vector);
  *plan = NULL;
  if (!vector) return mho_fail(error, MHO_ERR_MEMORY, "analysis", NULL, "out of memory");
  mho_junction own = *junction;
  for (int side = 0; side < 2; side++) {
    vector[(size_t)side * n + (size_t)site[side]] = 1;
    own.lead[side] = (mho_lead){.channels = 1,
                                .coupling_ev = &coupling_ev,
                                .shift_ev = &shift,
                                .vector = vector + (size_t)side * n};
  }
  mho_status status = mho_plan_create(&own, plan, error);
  free(vector);
  return status;
}

/* Sites that a linker may replace a hydrogen of, or all. */
static mho_status list_pairs(const mho_pair_graph *g, bool every, mho_interference *map)
{
  size_t n = 0, p = 0;
  for (int i = 0; i < g->count; i++) n += every || g->start[i + 1] - g->start[i] <= 2;
  map->pair = calloc(n * n / 2 + 1, sizeof *map->pair);
  if (!map->pair) return MHO_ERR_MEMORY;
  for (int i = 0; i < g->count; i++)
    for (int j = i + 1; j < g->count; j++)
      if (every || (g->start[i + 1] - g->start[i] <= 2 && g->start[j + 1] - g->start[j] <= 2))
        map->pair[p++] = (mho_pair){.site = {i, j}};
  map->count = p;
  return MHO_OK;
}

/* Does every site have the Fermi level as its energy? */
static bool is_centred(const mho_junction *j)
{
  size_t n = (size_t)j->sites;
  double scale = fmax(fabs(j->level_ev[0]), fabs(j->level_ev[n - 1]));
  for (size_t i = 0; i < n; i++)
    if (fabs(j->hamiltonian_ev[i * n + i] - j->fermi_ev) > 4 * DBL_EPSILON * scale) return false;
  return true;
}

/* Near a level: each pair by its plan, without a bare Green's function. */
static mho_status evaluate_by_plans(const mho_junction *j, double coupling_ev,
                                    const size_t *leader, mho_interference *map,
                                    mho_error *error)
{
  mho_status status = MHO_OK;
  for (size_t p = 0; status == MHO_OK && p < map->count; p++) {
    if (leader[p] != p) continue;
    mho_plan *plan;
    mho_point point = {0};
    status = mho_pair_plan(j, map->pair[p].site, coupling_ev, &plan, error);
    if (status == MHO_OK) status = mho_transmission_sweep(plan, 1, &j->fermi_ev, &point, error);
    map->pair[p].transmission = point.transmission;
    map->pair[p].kind = point.method == MHO_METHOD_NO_PATH ? MHO_PAIR_NO_PATH
                        : point.node                       ? MHO_PAIR_NODE_CANCELLATION
                                                           : MHO_PAIR_CONSTRUCTIVE;
    mho_plan_free(plan);
  }
  return status;
}

/* |g_ij| so small that rounding alone may have left it. */
static bool is_zero(const mho_junction *j, const mho_pair *pair, double green)
{
  size_t n = (size_t)j->sites;
  const double *c = j->orbital;
  double size = 0, scale = fmax(fabs(j->level_ev[0]), fabs(j->level_ev[n - 1])), nearest = INFINITY;
  for (size_t k = 0; k < n; k++) {
    double gap = fabs(j->fermi_ev - j->level_ev[k]);
    size += fabs(c[k * n + (size_t)pair->site[0]] * c[k * n + (size_t)pair->site[1]]) / gap;
    nearest = fmin(nearest, gap);
  }
  /* Levels and orbitals carry errors of eps |H|, which their gaps enlarge. */
  return fabs(green) <= ZERO_ROUNDOFFS * DBL_EPSILON * size * fmax(1, scale / nearest);
}

static void evaluate_pair(const mho_junction *j, double coupling_ev, const double *green,
                          mho_pair *pair)
{
  size_t n = (size_t)j->sites, a = (size_t)pair->site[0], b = (size_t)pair->site[1];
  double g = green[a * n + b], x = 0.5 * coupling_ev * green[a * n + a];
  double y = 0.5 * coupling_ev * green[b * n + b], z = 0.5 * coupling_ev * g;
  pair->has_green = true;
  if (fabs(g) < 1e-6 && is_zero(j, pair, g)) {
    pair->kind = MHO_PAIR_NODE_CANCELLATION;
    return;
  }
  double re = 1 - x * y + z * z, im = x + y; /* (1 + ix)(1 + iy) + z^2 */
  pair->green_per_ev = g;
  pair->transmission = fmin(1, 4 * z * z / (re * re + im * im));
}

/* Largest |g| among the pairs of each distance. */
static double *references(const mho_pair_graph *graph, const mho_interference *map)
{
  size_t n = (size_t)graph->count;
  double *best = calloc(n + 2, sizeof *best), *reference = malloc((map->count + 1) * sizeof *best);
  for (size_t p = 0; best && reference && p < map->count; p++) {
    const mho_pair *pair = &map->pair[p];
    int distance = graph->distance[(size_t)pair->site[0] * n + (size_t)pair->site[1]];
    if (distance > 0) best[distance] = fmax(best[distance], fabs(pair->green_per_ev));
  }
  for (size_t p = 0; best && reference && p < map->count; p++) {
    const mho_pair *pair = &map->pair[p];
    int distance = graph->distance[(size_t)pair->site[0] * n + (size_t)pair->site[1]];
    reference[p] = distance < 1 ? 0
                                : fmax(best[distance], fmax(distance > 1 ? best[distance - 1] : 0,
                                                            best[distance + 1]));
  }
  free(best);
  return reference;
}

static void classify(const mho_junction *j, const mho_pair_graph *graph, const double *reference,
                     mho_interference *map)
{
  bool centred = is_centred(j) && graph->two_coloured;
  for (size_t p = 0; p < map->count; p++) {
    mho_pair *pair = &map->pair[p];
    const int *site = pair->site;
    if (graph->distance[(size_t)site[0] * (size_t)graph->count + (size_t)site[1]] < 0)
      pair->kind = MHO_PAIR_NO_PATH;
    else if (pair->kind == MHO_PAIR_NODE_CANCELLATION) {
      if (centred && graph->colour[site[0]] == graph->colour[site[1]])
        pair->kind = MHO_PAIR_NODE_SYMMETRY;
    } else if (pair->has_green && fabs(pair->green_per_ev) < MHO_PAIR_CONDUCTS * reference[p])
      pair->kind = MHO_PAIR_NEAR_NODE;
  }
}

/* What symmetry makes equal is one number, not two that rounding tells apart. */
static void copy_leaders(const size_t *leader, mho_interference *map)
{
  for (size_t p = 0; p < map->count; p++) {
    mho_pair *pair = &map->pair[p], own = *pair;
    if (leader[p] == p) continue;
    *pair = map->pair[leader[p]];
    memcpy(pair->site, own.site, sizeof own.site);
    pair->magic = own.magic;
    pair->starring = own.starring;
    pair->orbital = own.orbital;
    pair->cross_conjugation = own.cross_conjugation;
  }
}

/* By the bare Green's function, which serves every pair. */
static mho_status evaluate_by_green(const mho_junction *j, double coupling_ev,
                                    const mho_pair_graph *graph, const size_t *leader,
                                    bool nodes, mho_interference *map, mho_error *error)
{
  size_t n = (size_t)j->sites;
  double *green = malloc(2 * n * n * sizeof *green), *reference = NULL;
  mho_status status = green ? mho_bare_green(j, j->fermi_ev, green + n * n, green, error)
                            : mho_fail(error, MHO_ERR_MEMORY, "analysis", NULL, "out of memory");
  for (size_t p = 0; status == MHO_OK && p < map->count; p++)
    if (leader[p] == p) evaluate_pair(j, coupling_ev, green, &map->pair[p]);
  if (status == MHO_OK) copy_leaders(leader, map);
  free(green);
  if (status == MHO_OK && !(reference = references(graph, map)))
    status = mho_fail(error, MHO_ERR_MEMORY, "analysis", NULL, "out of memory");
  if (status == MHO_OK) classify(j, graph, reference, map);
  if (status == MHO_OK && nodes)
    status = mho_pairs_nodes(j, coupling_ev, reference, leader, map, error);
  free(reference);
  return status;
}

static mho_status evaluate(const mho_junction *j, double coupling_ev, const mho_pair_graph *graph,
                           bool nodes, mho_interference *map, mho_error *error)
{
  double nearest = INFINITY;
  for (int k = 0; k < j->sites; k++) nearest = fmin(nearest, fabs(j->fermi_ev - j->level_ev[k]));
  size_t *leader = malloc((map->count + 1) * sizeof *leader);
  mho_status status = leader ? mho_pairs_orbits(j, graph, map, leader) : MHO_ERR_MEMORY;
  if (status != MHO_OK) mho_fail(error, status, "analysis", NULL, "out of memory");
  else if (nearest < LEVEL_REACH_EV)
    status = evaluate_by_plans(j, coupling_ev, leader, map, error);
  else status = evaluate_by_green(j, coupling_ev, graph, leader, nodes, map, error);
  if (status == MHO_OK) copy_leaders(leader, map);
  free(leader);
  return status;
}

mho_status mho_interference_map(const mho_molecule *molecule, const mho_junction *junction,
                                const mho_interference_options *options, mho_interference *map,
                                mho_error *error)
{
  mho_interference_options standard = mho_interference_defaults(molecule);
  mho_pair_graph graph = {0};
  *map = (mho_interference){0};
  if (!options) options = &standard;
  if (!(options->coupling_ev > 0 && options->coupling_ev <= COUPLING_MAX_EV))
    return mho_fail(error, MHO_ERR_RANGE, "analysis", "coupling",
                    "coupling: above 0 and at most %g eV is allowed", COUPLING_MAX_EV);
  if (junction->sites > MHO_INTERFERENCE_SITES_MAX)
    return mho_fail(error, MHO_ERR_LIMIT, "analysis", "sites",
                    "the map of %d sites is too large; at most %d are allowed", junction->sites,
                    MHO_INTERFERENCE_SITES_MAX);
  mho_status status = mho_pair_graph_build(junction, &graph);
  if (status == MHO_OK) status = list_pairs(&graph, options->every_site, map);
  if (status == MHO_OK && options->magic) status = mho_pairs_magic(junction, &graph, map);
  if (status == MHO_OK && options->rules) status = mho_pairs_rules(junction, &graph, map);
  if (status != MHO_OK) mho_fail(error, status, "analysis", NULL, "out of memory");
  else status = evaluate(junction, options->coupling_ev, &graph, options->nodes, map, error);
  mho_pair_graph_clear(&graph);
  return status;
}

void mho_interference_clear(mho_interference *map)
{
  for (size_t p = 0; p < map->count; p++) free(map->pair[p].magic);
  free(map->pair);
  *map = (mho_interference){0};
}
