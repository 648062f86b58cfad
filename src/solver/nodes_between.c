/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Real nodes of an interval, from the sum over levels
 *
 *   g(E) = v_r^T (E - H)^-1 v_l = sum_k w_k / (E - eps_k),
 *
 * whose zeros between levels are those of P.  On a disc of radius r about c,
 * with d_k = c - eps_k and q_k = r/|d_k| < 1,
 *
 *   |g(c + x) - g - g' x| <= r^2 sum |w_k/d_k^3| / (1 - q_k),
 *   |g'(c + x) - g'|      <= sum |w_k/d_k^2| (1/(1 - q_k)^2 - 1),
 *
 * so that an interval has no zero, or g is monotonic on it, or it is halved: a
 * bisection that cannot miss a zero, also one that does not change the sign.
 * What rounding hides (zeros that nearly coincide, weights that may be zero)
 * is left to the search for all nodes.
 */
#include <mho/nodes.h>

#include <math.h>
#include <stdlib.h>

#include "solver/levels.h"

/* Amplitudes below the first are zero, below the second perhaps. */
#define ZERO_AMPLITUDE 1e-13
#define SMALL_AMPLITUDE 1e-10

/* Weights below this may be zero. */
#define SMALL_WEIGHT 1e-12

/* A node nearer to a level than this counts as one at the level. */
#define AT_LEVEL_EV 1e-10

/* Intervals this small against the distance of the next level hold zeros that
 * doubles cannot separate. */
#define UNRESOLVED 1e-6

/* Largest error of an energy that is good enough. */
#define ENERGY_ERROR_EV 1e-11

enum { PENDING_MAX = 256, NEWTON_MAX = 60 };

typedef struct {
  int count;
  mho_level_group *group;
  double scale_ev;
} poles;

/* g and g' at the center of a disc, and what they may change by on it. */
typedef struct {
  double value, slope, noise, slope_noise, curvature, bend, nearest;
} disc;

typedef struct {
  double low, high;
} interval;

static disc look(const poles *p, double center, double radius)
{
  disc d = {.nearest = INFINITY};
  double size = 0, left = 0, right = 0;
  for (int k = 0; k < p->count; k++) {
    double inverse = 1 / (center - p->group[k].level_ev), away = fabs(inverse);
    double term = p->group[k].weight * inverse, part = radius * away, far = 1 / (1 - part);
    double bend = fabs(term) * away;
    d.value += term;
    d.slope -= term * inverse;
    d.curvature += bend * away * far;
    d.bend += bend * part * (2 - part) * far * far;
    d.nearest = fmin(d.nearest, 1 / away);
    size += fabs(term);
    left += p->group[k].left * inverse * inverse;
    right += p->group[k].right * inverse * inverse;
  }
  double scale = p->scale_ev + fabs(center);
  d.noise = 8 * UNIT_ROUNDOFF * size + 16 * UNIT_ROUNDOFF * scale * sqrt(left * right);
  d.slope_noise = 4 * d.noise / d.nearest;
  if (!(radius < d.nearest)) d.curvature = d.bend = INFINITY;
  return d;
}

/* The zero of a monotonic g near x, between two energies if those differ in
 * sign (g > 0 at low: `falls`); false if rounding moves it too far. */
static bool refine(const poles *p, double x, interval piece, bool falls, double *energy_ev)
{
  disc d = look(p, x, 0);
  for (int k = 0; k < NEWTON_MAX && fabs(d.value) > d.noise; k++) {
    if ((d.value > 0) == falls) piece.low = x;
    else piece.high = x;
    double next = x - d.value / d.slope;
    if (!(next > piece.low && next < piece.high)) next = 0.5 * (piece.low + piece.high);
    if (next == x) break;
    x = next;
    d = look(p, x, 0);
  }
  *energy_ev = x;
  return d.noise <= ENERGY_ERROR_EV * fabs(d.slope);
}

/* A zero may stand on the border of two intervals: then both have found it. */
static bool add_node(mho_nodes *result, double energy_ev, double slope, double *last_slope)
{
  mho_node *last = result->count ? &result->node[result->count - 1] : NULL;
  bool same = last && energy_ev - last->energy_ev <= 4 * ENERGY_ERROR_EV;
  if (same) return (slope > 0) == (*last_slope > 0);
  *last_slope = slope;
  result->node[result->count++] =
      (mho_node){.kind = MHO_NODE_EXACT, .energy_ev = energy_ev, .order = 1};
  return true;
}

/* Decides on an interval where g is monotonic; false if rounding hides it. */
static bool take_monotonic(const poles *p, interval piece, mho_nodes *result, double *last_slope)
{
  disc low = look(p, piece.low, 0), high = look(p, piece.high, 0);
  bool falls = high.value < low.value;
  double start = 0.5 * (piece.low + piece.high), energy_ev;
  if (fabs(low.value) <= low.noise) start = piece.low;
  else if (fabs(high.value) <= high.noise) start = piece.high;
  else if ((low.value > 0) == (high.value > 0)) return true;
  if (!refine(p, start, piece, falls, &energy_ev)) return false;
  return add_node(result, energy_ev, high.value - low.value, last_slope);
}

/* All zeros between two energies with no level between them, in order. */
static bool search(const poles *p, double low, double high, mho_nodes *result)
{
  interval pending[PENDING_MAX] = {{low, high}};
  int count = 1;
  double last_slope = 0;
  while (count > 0) {
    interval piece = pending[--count];
    double width = piece.high - piece.low, center = 0.5 * (piece.low + piece.high);
    disc d = look(p, center, 0.5 * width);
    double reach = 0.5 * width * (fabs(d.slope) + 0.5 * width * d.curvature);
    if (fabs(d.value) - d.noise > reach) continue;
    if (fabs(d.slope) - d.slope_noise > d.bend) {
      if (!take_monotonic(p, piece, result, &last_slope)) return false;
      continue;
    }
    if (width < AT_LEVEL_EV && d.nearest <= width) continue;
    if (width < UNRESOLVED * d.nearest || count + 2 > PENDING_MAX ||
        (int)result->count + 2 > p->count)
      return false;
    /* off the middle, where symmetry likes to put a zero */
    double cut = piece.low + 0.46875 * width;
    pending[count++] = (interval){cut, piece.high};
    pending[count++] = (interval){piece.low, cut};
  }
  return true;
}

/* Is it beyond doubt that no node comes of level k, but where it stands? */
static bool is_clear(poles *p, int k, bool inside)
{
  mho_level_group *g = &p->group[k];
  double left = sqrt(g->left), right = sqrt(g->right), weight = g->weight;
  if (fabs(weight) > SMALL_WEIGHT && left * right - fabs(weight) < SMALL_WEIGHT) return true;
  if (inside || (left < SMALL_AMPLITUDE && right < SMALL_AMPLITUDE)) return false;
  if (fabs(weight) > SMALL_WEIGHT) return true;
  g->weight = g->left = g->right = 0;
  disc rest = look(p, nextafter(g->level_ev, INFINITY), 0);
  double doubt = fabs(weight) + SAME_LEVEL * left * right + SAME_LEVEL * SAME_LEVEL;
  return doubt < AT_LEVEL_EV * (fabs(rest.value) - rest.noise);
}

/* What no contact sees, and what stands at an end without a weight. */
static void drop_unseen(poles *p)
{
  int kept = 0;
  for (int k = 0; k < p->count; k++) {
    double seen = sqrt(fmax(p->group[k].left, p->group[k].right));
    if (seen >= ZERO_AMPLITUDE) p->group[kept++] = p->group[k];
  }
  p->count = kept;
}

static bool is_nothing(const poles *p)
{
  for (int k = 0; k < p->count; k++)
    if (fabs(p->group[k].weight) > SMALL_WEIGHT) return false;
  return true;
}

/* Between two levels at a time; false where it takes the search for all nodes. */
static bool between_levels(poles *p, double low, double high, mho_nodes *result)
{
  double near = SAME_LEVEL * p->scale_ev, from = low;
  drop_unseen(p);
  if (is_nothing(p)) return false;
  for (int k = 0; k < p->count; k++) {
    double level_ev = p->group[k].level_ev;
    if (level_ev < low - near || level_ev > high + near) continue;
    if (!is_clear(p, k, level_ev > low + near && level_ev < high - near)) return false;
  }
  drop_unseen(p);
  for (int k = 0; k < p->count; k++) {
    if (!(p->group[k].level_ev > low + near && p->group[k].level_ev < high - near)) continue;
    if (!search(p, from, p->group[k].level_ev, result)) return false;
    from = p->group[k].level_ev;
  }
  return search(p, from, high, result);
}

static bool is_level(const mho_plan *plan, double energy_ev)
{
  for (int k = 0; plan->level_ev && k < plan->sites; k++)
    if (fabs(plan->level_ev[k] - energy_ev) <= SAME_LEVEL * plan->norm_ev) return true;
  return false;
}

/* Drops dips and what is not between, at an end that is a level also what is
 * as near to it as rounding. */
static void keep_between(const mho_plan *plan, double low, double high, mho_nodes *result)
{
  size_t kept = 0;
  if (is_level(plan, low)) low += AT_LEVEL_EV;
  if (is_level(plan, high)) high -= AT_LEVEL_EV;
  result->zeros = 0;
  for (size_t k = 0; k < result->count; k++) {
    mho_node node = result->node[k];
    if (node.kind == MHO_NODE_DIP || !(node.energy_ev > low && node.energy_ev < high)) continue;
    result->node[kept++] = node;
    result->zeros += node.order;
  }
  result->count = kept;
}

mho_status mho_nodes_between(const mho_plan *plan, double low_ev, double high_ev,
                             mho_nodes *result, mho_error *error)
{
  *result = (mho_nodes){0};
  if (!(low_ev < high_ev))
    return mho_fail(error, MHO_ERR_RANGE, "solver", "energies",
                    "the lower energy must be below the upper one");
  bool found = false;
  if (plan->connected && plan->pair) {
    poles p = {.scale_ev = plan->norm_ev};
    p.group = malloc((size_t)plan->sites * sizeof *p.group);
    result->node = malloc((size_t)plan->sites * sizeof *result->node);
    if (p.group && result->node) {
      p.count = mho_levels_group(plan, p.group);
      found = between_levels(&p, low_ev, high_ev, result);
    }
    free(p.group);
    if (!p.group || !result->node)
      return mho_fail(error, MHO_ERR_MEMORY, "solver", NULL, "out of memory");
  }
  mho_status status = MHO_OK;
  if (!found) {
    mho_nodes_clear(result);
    status = mho_nodes_find(plan, result, error);
  }
  if (status == MHO_OK) keep_between(plan, low_ev, high_ev, result);
  return status;
}
