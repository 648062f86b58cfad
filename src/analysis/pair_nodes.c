/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * How near to a node each pair is.  g_ij(E) = sum_k c_ki c_kj / (E - level_k)
 * has no poles but the levels, so between two samples with no level between
 * them a change of sign is a node.  One matrix product a sample serves all
 * pairs; what it brackets is then refined pair by pair.
 */
#include <math.h>
#include <stdlib.h>

#include <mho/nodes.h>

#include "analysis/pairs.h"

/* Samples in the gap about the Fermi level, and in each gap beyond it. */
enum { FIRST_SAMPLES = 16, NEXT_SAMPLES = 8, SAMPLES_MAX = 48, STEPS_MAX = 60 };

#define ROOT_EV 1e-10

/* Samples keep this part of a gap away from its ends. */
#define MARGIN 1e-3

/* Distances closer than this, in eV and relatively, are the same. */
#define TIE 1e-9

typedef struct {
  const mho_junction *junction;
  double *energy, *previous, *green, *work;
  double *row; /* orbitals by site: [site][level] */
  bool *joined; /* no level lies between this sample and the one before */
  size_t count;
} scan;

/* |g_ij| - threshold, or g_ij with threshold 0. */
static double excess(const scan *s, const int *site, double threshold, double energy_ev)
{
  const mho_junction *j = s->junction;
  size_t n = (size_t)j->sites;
  const double *a = s->row + (size_t)site[0] * n, *b = s->row + (size_t)site[1] * n;
  double sum = 0;
  for (size_t k = 0; k < n; k++) sum += a[k] * b[k] / (energy_ev - j->level_ev[k]);
  return threshold > 0 ? fabs(sum) - threshold : sum;
}

/* Samples on one side of the Fermi level (direction +-1), outwards. */
static void place_samples(scan *s, int direction)
{
  const mho_junction *j = s->junction;
  int n = j->sites, level = 0, most = SAMPLES_MAX / 2;
  while (level < n && j->level_ev[level] < j->fermi_ev) level++;
  if (direction < 0) level--;
  double from = j->fermi_ev;
  s->energy[0] = from;
  s->count = 1;
  bool first = true;
  while ((int)s->count <= most && level >= 0 && level < n) {
    double to = j->level_ev[level], gap = to - from;
    int samples = first ? FIRST_SAMPLES / 2 : NEXT_SAMPLES;
    for (int i = first ? 1 : 0; fabs(gap) > 1e-9 && i <= samples && (int)s->count <= most; i++) {
      double part = (double)i / samples;
      if (first) part *= 1 - MARGIN;
      else part = MARGIN + (1 - 2 * MARGIN) * part;
      s->joined[s->count] = first || i > 0;
      s->energy[s->count++] = from + part * gap;
    }
    first = false;
    from = to;
    level += direction;
  }
}

/* Where excess changes sign between a and b, by false position with the weight
 * of a point that stays halved (M. Dowell and P. Jarratt, BIT 11, 168 (1971)). */
static double find_root(const scan *s, const int *site, double threshold, double a, double b)
{
  double at_a = excess(s, site, threshold, a), at_b = excess(s, site, threshold, b);
  for (int i = 0; i < STEPS_MAX && fabs(b - a) > ROOT_EV && at_b != 0; i++) {
    double c = b - at_b * (b - a) / (at_b - at_a);
    if (!(c > fmin(a, b) && c < fmax(a, b))) c = 0.5 * (a + b);
    double moved = fabs(c - b), at_c = excess(s, site, threshold, c);
    if ((at_c > 0) != (at_b > 0)) {
      a = b;
      at_a = at_b;
    } else at_a *= 0.5;
    b = c;
    at_b = at_c;
    if (moved < ROOT_EV) break;
  }
  return b;
}

/* Of two as near, the lower one that came first. */
static bool is_nearer(double candidate, double value)
{
  return fabs(candidate) < (1 - TIE) * fabs(value) && fabs(candidate) < fabs(value) - TIE;
}

static void keep_nearest(bool *has, double *value, double candidate)
{
  if (!*has || is_nearer(candidate, *value)) *value = candidate;
  *has = true;
}

/* One step outwards: did the sign or the verdict of a pair change? */
static void look_at(const scan *s, size_t step, bool signs, double reference, mho_pair *pair,
                    bool *turned)
{
  const mho_junction *j = s->junction;
  size_t n = (size_t)j->sites, at = (size_t)pair->site[0] * n + (size_t)pair->site[1];
  double before = s->previous[at], now = s->green[at], threshold = MHO_PAIR_CONDUCTS * reference;
  double a = s->energy[step - 1], b = s->energy[step];
  bool conducts = pair->kind == MHO_PAIR_CONSTRUCTIVE;
  bool crossed = s->joined[step] && (step > 1 || pair->green_per_ev != 0) && before * now < 0;
  double node = crossed ? find_root(s, pair->site, 0, a, b) : 0;
  if (crossed && signs) keep_nearest(&pair->has_node, &pair->node_ev, node - j->fermi_ev);
  if (*turned || !s->joined[step] || !(threshold > 0)) return;
  if (conducts && crossed) b = node; /* below the threshold on the way there */
  else if ((fabs(now) >= threshold) == conducts) return;
  *turned = true;
  keep_nearest(&pair->has_shift, &pair->overturning_shift_ev,
               find_root(s, pair->site, threshold, a, b) - j->fermi_ev);
}

static mho_status walk(scan *s, int direction, bool signs, const double *reference,
                       mho_interference *map, mho_error *error)
{
  bool *turned = calloc(map->count + 1, sizeof *turned);
  if (!turned) return mho_fail(error, MHO_ERR_MEMORY, "analysis", NULL, "out of memory");
  place_samples(s, direction);
  mho_status status =
      mho_bare_green(s->junction, s->energy[0], s->work, s->previous, error);
  for (size_t step = 1; status == MHO_OK && step < s->count; step++) {
    status = mho_bare_green(s->junction, s->energy[step], s->work, s->green, error);
    for (size_t p = 0; status == MHO_OK && p < map->count; p++)
      if (map->pair[p].kind != MHO_PAIR_NO_PATH)
        look_at(s, step, signs, reference[p], &map->pair[p], &turned[p]);
    double *swap = s->previous;
    s->previous = s->green;
    s->green = swap;
  }
  free(turned);
  return status;
}

/* The nearest real node of a pair from the zeros of its Green's function. */
static mho_status find_nearest(const mho_junction *j, double coupling_ev, mho_pair *pair,
                               mho_error *error)
{
  mho_plan *plan;
  mho_nodes nodes = {0};
  mho_status status = mho_pair_plan(j, pair->site, coupling_ev, &plan, error);
  if (status == MHO_OK) status = mho_nodes_find(plan, &nodes, error);
  for (size_t k = 0; status == MHO_OK && k < nodes.count; k++) {
    double distance = nodes.node[k].energy_ev - j->fermi_ev;
    if (nodes.node[k].kind != MHO_NODE_EXACT) continue;
    if (fabs(distance) < TIE) distance = 0;
    if (pair->has_node && !is_nearer(distance, pair->node_ev)) continue;
    pair->has_node = true;
    pair->node_ev = distance;
    pair->node_order = nodes.node[k].order;
  }
  mho_nodes_clear(&nodes);
  mho_plan_free(plan);
  return status;
}

mho_status mho_pairs_nodes(const mho_junction *junction, double coupling_ev,
                           const double *reference, mho_interference *map, mho_error *error)
{
  size_t n = (size_t)junction->sites;
  bool exact = junction->sites <= MHO_INTERFERENCE_NODES_MAX;
  double *room = malloc(4 * n * n * sizeof *room);
  double energy[SAMPLES_MAX + 2];
  bool joined[SAMPLES_MAX + 2];
  scan s = {junction, energy, room, room + n * n, room + 2 * n * n, room + 3 * n * n,
            joined, 0};
  mho_status status =
      room ? MHO_OK : mho_fail(error, MHO_ERR_MEMORY, "analysis", NULL, "out of memory");
  for (size_t i = 0; room && i < n; i++)
    for (size_t k = 0; k < n; k++) s.row[i * n + k] = junction->orbital[k * n + i];
  for (int direction = -1; status == MHO_OK && direction < 2; direction += 2)
    status = walk(&s, direction, !exact, reference, map, error);
  for (size_t p = 0; status == MHO_OK && p < map->count; p++) {
    mho_pair *pair = &map->pair[p];
    bool at_fermi = pair->kind == MHO_PAIR_NODE_SYMMETRY || pair->kind == MHO_PAIR_NODE_CANCELLATION;
    if (exact && pair->kind != MHO_PAIR_NO_PATH)
      status = find_nearest(junction, coupling_ev, pair, error);
    else if (at_fermi) {
      pair->has_node = true;
      pair->node_ev = 0;
    }
    /* Two levels at one energy make a node that g, which diverges, hides. */
    if (pair->kind == MHO_PAIR_CONSTRUCTIVE && pair->has_node)
      keep_nearest(&pair->has_shift, &pair->overturning_shift_ev, pair->node_ev);
  }
  free(room);
  return status;
}
