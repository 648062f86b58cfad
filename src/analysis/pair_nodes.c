/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * How near to a node each pair is.  g_ij(E) = sum_k c_ki c_kj / (E - level_k)
 * has no poles but the levels, so between two samples with no level between
 * them a change of sign is a node.  Samples go outwards from the Fermi level;
 * at each, a pair that may still find something nearer costs one dot product,
 * and what is bracketed a few of Newton's steps.
 */
#include <math.h>
#include <stdlib.h>

#include <mho/nodes.h>

#include "analysis/pairs.h"
#include "base/processor.h"

/* Samples in the gap about the Fermi level, and in each gap beyond it. */
enum { FIRST_SAMPLES = 16, NEXT_SAMPLES = 8, SAMPLES_MAX = 48, STEPS_MAX = 60 };

#define ROOT_EV 1e-10

/* Samples keep this part of a gap away from its ends. */
#define MARGIN 1e-3

/* Distances closer than this, in eV and relatively, are the same. */
#define TIE 1e-9

/* Numbers summed at a time; rows are filled up with zeros. */
enum { V = 8 };
typedef double vector __attribute__((vector_size(V * sizeof(double)), aligned(8), may_alias));
#define AT(array, k) (*(const vector *)((array) + (k)))

typedef struct {
  double energy, below, above; /* the levels about it; +-INFINITY: none */
  bool joined;                 /* no level lies between it and the sample before */
} sample;

typedef struct {
  const mho_junction *junction;
  size_t stride;   /* sites, filled up to a multiple of V */
  double *row;     /* orbitals by site: [site][level] */
  double *level;   /* [stride] */
  double *inverse;  /* [stride]: 1/(E - level) */
  double *weighted; /* [stride]: a row times that */
  double *before;  /* [pairs]: g at the sample before */
  size_t *active;  /* [pairs] that may still find something */
  bool *turned;    /* [pairs] in this direction */
  sample sample[SAMPLES_MAX + 2];
  size_t count;
} scan;

INLINED double total(const vector *v)
{
  const vector s = *v;
  return ((s[0] + s[4]) + (s[2] + s[6])) + ((s[1] + s[5]) + (s[3] + s[7]));
}

FOR_EVERY_PROCESSOR
static double dot(size_t n, const double *a, const double *b)
{
  vector sum = {0}, more = {0};
  size_t k = 0;
  for (; k + 2 * V <= n; k += 2 * V) {
    sum += AT(a, k) * AT(b, k);
    more += AT(a, k + V) * AT(b, k + V);
  }
  for (; k < n; k += V) sum += AT(a, k) * AT(b, k);
  sum += more;
  return total(&sum);
}

/* sum a b/(E - level) and its slope. */
FOR_EVERY_PROCESSOR
static void sum_levels(size_t n, const double *a, const double *b, const double *level,
                       double energy_ev, double *value, double *slope)
{
  vector sum = {0}, steep = {0};
  for (size_t k = 0; k < n; k += V) {
    vector inverse = 1 / (energy_ev - AT(level, k)), term = AT(a, k) * AT(b, k) * inverse;
    sum += term;
    steep -= term * inverse;
  }
  *value = total(&sum);
  *slope = total(&steep);
}

/* Samples on one side of the Fermi level (direction +-1), outwards. */
static void place_samples(scan *s, int direction)
{
  const mho_junction *j = s->junction;
  int n = j->sites, level = 0, most = SAMPLES_MAX / 2;
  while (level < n && j->level_ev[level] < j->fermi_ev) level++;
  if (direction < 0) level--;
  double from = j->fermi_ev, behind = -INFINITY * direction;
  if (level - direction >= 0 && level - direction < n) behind = j->level_ev[level - direction];
  s->sample[0] = (sample){.energy = from};
  s->count = 1;
  bool first = true;
  while ((int)s->count <= most && level >= 0 && level < n) {
    double to = j->level_ev[level], gap = to - from;
    int samples = first ? FIRST_SAMPLES / 2 : NEXT_SAMPLES;
    for (int i = first ? 1 : 0; fabs(gap) > 1e-9 && i <= samples && (int)s->count <= most; i++) {
      double part = (double)i / samples;
      if (first) part *= 1 - MARGIN;
      else part = MARGIN + (1 - 2 * MARGIN) * part;
      s->sample[s->count++] = (sample){from + part * gap, fmin(behind, to), fmax(behind, to),
                                       first || i > 0};
    }
    first = false;
    from = behind = to;
    level += direction;
  }
}

/* Where |g| - threshold, or g with threshold 0, changes sign between a and b:
 * Newton's steps within the bracket on that times the distances of the two
 * levels, which takes the poles away. */
static double find_root(const scan *s, const mho_pair *pair, double threshold, const sample *at,
                        double a, double b, double at_a, double at_b)
{
  const double *first = s->row + (size_t)pair->site[0] * s->stride;
  const double *second = s->row + (size_t)pair->site[1] * s->stride;
  double x = a + (b - a) * at_a / (at_a - at_b);
  for (int i = 0; i < STEPS_MAX && fabs(b - a) > ROOT_EV; i++) {
    double g, slope;
    if (!(x > fmin(a, b) && x < fmax(a, b))) x = 0.5 * (a + b);
    sum_levels(s->stride, first, second, s->level, x, &g, &slope);
    if (threshold > 0) {
      slope = g < 0 ? -slope : slope;
      g = fabs(g) - threshold;
    }
    if (g == 0) return x;
    if ((g > 0) == (at_a > 0)) a = x;
    else b = x;
    double poles = 0;
    if (isfinite(at->below)) poles += 1 / (x - at->below);
    if (isfinite(at->above)) poles += 1 / (x - at->above);
    double step = g / (slope + g * poles);
    x -= step;
    if (fabs(step) < ROOT_EV && x > fmin(a, b) && x < fmax(a, b)) break;
  }
  return x;
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
static void look_at(const scan *s, size_t step, bool signs, double reference, double before,
                    double now, mho_pair *pair, bool *turned)
{
  const sample *at = &s->sample[step];
  double fermi = s->junction->fermi_ev, threshold = MHO_PAIR_CONDUCTS * reference;
  double a = s->sample[step - 1].energy, b = at->energy;
  bool conducts = pair->kind == MHO_PAIR_CONSTRUCTIVE;
  bool crossed = at->joined && (step > 1 || pair->green_per_ev != 0) && before * now < 0;
  double node = crossed ? find_root(s, pair, 0, at, a, b, before, now) : 0;
  if (crossed && signs) keep_nearest(&pair->has_node, &pair->node_ev, node - fermi);
  if (*turned || !at->joined || !(threshold > 0)) return;
  double end = fabs(now) - threshold;
  if (conducts && crossed) { /* below the threshold on the way there */
    b = node;
    end = -threshold;
  } else if ((fabs(now) >= threshold) == conducts) return;
  *turned = true;
  keep_nearest(&pair->has_shift, &pair->overturning_shift_ev,
               find_root(s, pair, threshold, at, a, b, fabs(before) - threshold, end) - fermi);
}

/* Can a sample so far out still find a nearer node or shift? */
static bool is_open(const mho_pair *pair, bool signs, double threshold, bool turned,
                    double distance)
{
  bool node = signs && !(pair->has_node && fabs(pair->node_ev) < distance);
  bool shift = threshold > 0 && !turned &&
               !(pair->has_shift && fabs(pair->overturning_shift_ev) < distance);
  return node || shift;
}

/* Values of the active pairs at a sample; with `step` 0 only kept for the next. */
static void visit(scan *s, size_t step, bool signs, const double *reference, size_t *actives,
                  mho_interference *map)
{
  int site = -1;
  size_t kept = 0;
  double energy = s->sample[step].energy, distance = fabs(energy - s->junction->fermi_ev);
  for (size_t k = 0; k < s->stride; k++) s->inverse[k] = 1 / (energy - s->level[k]);
  for (size_t q = 0; q < *actives; q++) {
    size_t p = s->active[q];
    mho_pair *pair = &map->pair[p];
    if (site != pair->site[0]) {
      site = pair->site[0];
      for (size_t k = 0; k < s->stride; k++)
        s->weighted[k] = s->row[(size_t)site * s->stride + k] * s->inverse[k];
    }
    double now = dot(s->stride, s->weighted, s->row + (size_t)pair->site[1] * s->stride);
    if (step > 0) look_at(s, step, signs, reference[p], s->before[p], now, pair, &s->turned[p]);
    s->before[p] = now;
    if (is_open(pair, signs, reference[p], s->turned[p], distance)) s->active[kept++] = p;
  }
  *actives = kept;
}

static void walk(scan *s, int direction, bool signs, const double *reference,
                 const size_t *leader, mho_interference *map)
{
  size_t actives = 0;
  place_samples(s, direction);
  for (size_t p = 0; p < map->count; p++) {
    s->turned[p] = false;
    if (leader[p] == p && map->pair[p].kind != MHO_PAIR_NO_PATH) s->active[actives++] = p;
  }
  for (size_t step = 0; actives > 0 && step < s->count; step++)
    visit(s, step, signs, reference, &actives, map);
}

static mho_status scan_create(const mho_junction *junction, size_t pairs, scan *s)
{
  size_t n = (size_t)junction->sites, stride = (n + V - 1) / V * V;
  *s = (scan){.junction = junction, .stride = stride};
  s->row = calloc((n + 3) * stride, sizeof *s->row);
  s->before = malloc((pairs + 1) * sizeof *s->before);
  s->active = malloc((pairs + 1) * sizeof *s->active);
  s->turned = malloc((pairs + 1) * sizeof *s->turned);
  if (!s->row || !s->before || !s->active || !s->turned) return MHO_ERR_MEMORY;
  s->level = s->row + n * stride;
  s->inverse = s->level + stride;
  s->weighted = s->inverse + stride;
  for (size_t k = 0; k < stride; k++) s->level[k] = k < n ? junction->level_ev[k] : HUGE_VAL;
  for (size_t i = 0; i < n; i++)
    for (size_t k = 0; k < n; k++) s->row[i * stride + k] = junction->orbital[k * n + i];
  return MHO_OK;
}

static void scan_clear(scan *s)
{
  free(s->row);
  free(s->before);
  free(s->active);
  free(s->turned);
}

static void take_nearest(const mho_junction *j, const mho_nodes *nodes, mho_pair *pair)
{
  for (size_t k = 0; k < nodes->count; k++) {
    double distance = nodes->node[k].energy_ev - j->fermi_ev;
    if (nodes->node[k].kind != MHO_NODE_EXACT) continue;
    if (fabs(distance) < TIE) distance = 0;
    if (pair->has_node && !is_nearer(distance, pair->node_ev)) continue;
    pair->has_node = true;
    pair->node_ev = distance;
    pair->node_order = nodes->node[k].order;
  }
}

/* The nearest real node of a pair from the zeros of its Green's function: as far
 * as the next level to either side, then over some levels, then all. */
static mho_status find_nearest(const mho_junction *j, double coupling_ev, mho_pair *pair,
                               mho_error *error)
{
  enum { WIDER = 3, LOOKS = 2 };
  mho_plan *plan;
  mho_nodes nodes = {0};
  double reach = INFINITY;
  for (int k = 0; k < j->sites; k++) reach = fmin(reach, fabs(j->level_ev[k] - j->fermi_ev));
  mho_status status = mho_pair_plan(j, pair->site, coupling_ev, &plan, error);
  for (int look = 0; status == MHO_OK && !pair->has_node && look <= LOOKS; look++) {
    status = look < LOOKS ? mho_nodes_between(plan, j->fermi_ev - reach, j->fermi_ev + reach,
                                              &nodes, error)
                          : mho_nodes_find(plan, &nodes, error);
    if (status == MHO_OK) take_nearest(j, &nodes, pair);
    mho_nodes_clear(&nodes);
    reach *= WIDER;
  }
  mho_plan_free(plan);
  return status;
}

mho_status mho_pairs_nodes(const mho_junction *junction, double coupling_ev,
                           const double *reference, const size_t *leader, mho_interference *map,
                           mho_error *error)
{
  bool exact = junction->sites <= MHO_INTERFERENCE_NODES_MAX;
  scan s;
  mho_status status = scan_create(junction, map->count, &s);
  if (status != MHO_OK) mho_fail(error, status, "analysis", NULL, "out of memory");
  for (size_t p = 0; status == MHO_OK && p < map->count; p++) {
    mho_pair *pair = &map->pair[p];
    if (leader[p] != p) continue;
    bool at_fermi = pair->kind == MHO_PAIR_NODE_SYMMETRY || pair->kind == MHO_PAIR_NODE_CANCELLATION;
    if (exact && pair->kind != MHO_PAIR_NO_PATH)
      status = find_nearest(junction, coupling_ev, pair, error);
    else if (at_fermi) {
      pair->has_node = true;
      pair->node_ev = 0;
    }
  }
  for (int direction = -1; status == MHO_OK && direction < 2; direction += 2)
    walk(&s, direction, !exact, reference, leader, map);
  for (size_t p = 0; status == MHO_OK && p < map->count; p++) {
    mho_pair *pair = &map->pair[p];
    /* Two levels at one energy make a node that g, which diverges, hides. */
    if (pair->kind == MHO_PAIR_CONSTRUCTIVE && pair->has_node)
      keep_nearest(&pair->has_shift, &pair->overturning_shift_ev, pair->node_ev);
  }
  scan_clear(&s);
  return status;
}
