/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * A run of units as a two-port: E - H of r units, all but both ends eliminated,
 * is [[a, b], [b, c]].  Two runs, joined by a hopping t from the end of the first
 * to the start of the second, give with D = c_1 a_2 - t^2
 *
 *   a = a_1 - b_1^2 a_2 / D,   c = c_2 - b_2^2 c_1 / D,   b = -b_1 t b_2 / D,
 *
 * so that 2^k units cost k such steps (the doubling of surface Green's functions,
 * M. P. Lopez Sancho, J. M. Lopez Sancho and J. Rubio, J. Phys. F 15, 851 (1985)).
 * b falls off exponentially and keeps a power of two of its own: once b^2 is
 * below rounding, T goes as b^2.
 *
 * Every step rounds its results once more; the derivatives of ln T to each, from
 * the last step back to the first, turn that into an error of ln T.
 */
#include "solver/repeat.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

/* Fewer units are as fast without. */
enum { UNITS_MIN = 32 };

/* A step whose D is smaller (times the larger of its terms) is not trusted. */
#define CANCELLATION 1e-16

/* b is a number from SMALL to one, times a power of SMALL. */
#define SMALL ((mho_quad)0x1p-100)
enum { STEP = 100 };

/* --- which sites ------------------------------------------------------------------ */

typedef struct {
  const mho_plan *plan;
  double *diagonal;
  double *hopping; /* in the order of plan->neighbour */
  bool *bound;     /* to a contact */
  int *crossing;   /* [sites + 1]: bonds from sites before a cut to sites behind */
} pattern;

static double hopping_to(const pattern *p, int i, int j)
{
  const mho_plan *plan = p->plan;
  for (size_t k = plan->neighbour_start[i]; k < plan->neighbour_start[i + 1]; k++)
    if (plan->neighbour[k] == j) return p->hopping[k];
  return 0;
}

static void add_hopping(pattern *p, int i, int j, double value)
{
  const mho_plan *plan = p->plan;
  for (size_t k = plan->neighbour_start[i]; k < plan->neighbour_start[i + 1]; k++)
    if (plan->neighbour[k] == j) {
      p->hopping[k] += value;
      return; /* entries of one pair add up in one place */
    }
}

static bool find_pattern(const mho_plan *plan, pattern *p)
{
  size_t n = (size_t)plan->sites;
  *p = (pattern){plan, calloc(n, sizeof(double)),
                 calloc(plan->neighbour_start[n] + 1, sizeof(double)), calloc(n, sizeof(bool)),
                 calloc(n + 2, sizeof(int))};
  if (!p->diagonal || !p->hopping || !p->bound || !p->crossing) return false;
  for (size_t e = 0; e < plan->entries; e++) {
    int i = plan->entry[e].i, j = plan->entry[e].j;
    if (i == j) p->diagonal[i] += plan->entry[e].value_ev;
    else {
      add_hopping(p, i, j, plan->entry[e].value_ev);
      add_hopping(p, j, i, plan->entry[e].value_ev);
    }
  }
  for (size_t k = 0; k < plan->support_start[plan->channels]; k++) p->bound[plan->support[k]] = true;
  for (size_t i = 0; i < n; i++)
    for (size_t k = plan->neighbour_start[i]; k < plan->neighbour_start[i + 1]; k++)
      if ((size_t)plan->neighbour[k] > i) {
        p->crossing[i + 1]++;
        p->crossing[plan->neighbour[k] + 1]--;
      }
  for (size_t i = 0; i < n; i++) p->crossing[i + 1] += p->crossing[i];
  return true;
}

static void clear_pattern(pattern *p)
{
  free(p->diagonal);
  free(p->hopping);
  free(p->bound);
  free(p->crossing);
}

/* Do the sites i and i + period have the same energy and the same bonds on? */
static bool same_onwards(const pattern *p, int i, int period)
{
  const mho_plan *plan = p->plan;
  int onwards[2] = {0, 0};
  if (p->bound[i] || p->bound[i + period] || p->diagonal[i] != p->diagonal[i + period]) return false;
  for (int side = 0; side < 2; side++)
    for (size_t k = plan->neighbour_start[i + side * period];
         k < plan->neighbour_start[i + side * period + 1]; k++) {
      int from = i + side * period, to = plan->neighbour[k], other = to - from + i + !side * period;
      if (to <= from) continue;
      onwards[side]++;
      if (other >= plan->sites ||
          p->hopping[k] != hopping_to(p, i + !side * period, other))
        return false;
    }
  return onwards[0] == onwards[1];
}

typedef struct {
  int first, unit, units, in, out;
  double joint_ev;
} run;

/* The run of period `unit` around the cut before site `cut`. */
static run run_around(const pattern *p, int cut, int unit)
{
  const mho_plan *plan = p->plan;
  int n = plan->sites, low = cut, high = cut;
  while (high + unit < n && same_onwards(p, high, unit)) high++;
  while (low > 0 && same_onwards(p, low - 1, unit)) low--;
  run r = {.first = cut - (cut - low) / unit * unit, .unit = unit};
  r.units = (high - r.first) / unit; /* whose bonds on are alike */
  int joined = 0;
  for (int i = r.first; r.units > 1 && i < r.first + unit; i++)
    for (size_t k = plan->neighbour_start[i]; k < plan->neighbour_start[i + 1]; k++)
      if (plan->neighbour[k] >= r.first + unit) {
        r.out = i - r.first;
        r.in = plan->neighbour[k] - r.first - unit;
        r.joint_ev = p->hopping[k];
        joined++;
      }
  if (joined != 1 || r.in >= unit || r.in == r.out) return (run){0};
  return r;
}

/* The first unit is entered, and the last left, at the unit's own ends. */
static bool ends_fit(const pattern *p, const run *r)
{
  const mho_plan *plan = p->plan;
  int end = r->first + r->units * r->unit;
  for (int i = r->first; i < end; i++)
    for (size_t k = plan->neighbour_start[i]; k < plan->neighbour_start[i + 1]; k++) {
      int j = plan->neighbour[k];
      if (j >= r->first && j < end) continue;
      bool start = j < r->first && i == r->first + r->in;
      if (!start && !(j >= end && i == end - r->unit + r->out)) return false;
    }
  return true;
}

/* The longest run around the middle of the molecule. */
static run longest_run(const pattern *p)
{
  int n = p->plan->sites, cut = n / 2;
  run best = {0};
  for (int tries = 0; cut < n && p->crossing[cut] != 1 && tries < REPEAT_UNIT_MAX; tries++) cut++;
  for (int unit = 2; unit <= REPEAT_UNIT_MAX && cut + unit < n; unit++) {
    if (p->crossing[cut] != 1 || p->crossing[cut + unit] != 1) continue;
    run r = run_around(p, cut, unit);
    while (r.units > 1 && !ends_fit(p, &r)) { /* the rest may enter elsewhere */
      r.units -= 2;
      r.first += r.unit;
    }
    if (r.units * r.unit > best.units * best.unit) best = r;
    if (n - best.units * best.unit <= REPEAT_REST_MAX) break;
  }
  return best;
}

/* --- what is left ------------------------------------------------------------------- */

static mho_status build(const pattern *p, const run *r, mho_repeat **repeat)
{
  mho_repeat *q = *repeat = calloc(1, sizeof *q);
  if (!q) return MHO_ERR_MEMORY;
  int n = p->plan->sites, end = r->first + r->units * r->unit, site[REPEAT_REST_MAX + 2];
  *q = (mho_repeat){.unit = r->unit, .units = r->units, .in = r->in, .out = r->out,
                    .joint_ev = r->joint_ev};
  for (int i = 0; i < n; i++)
    if (i < r->first || i >= end) site[q->rest++] = i;
  site[q->rest] = r->first + r->in;
  site[q->rest + 1] = end - r->unit + r->out;
  size_t unit = (size_t)r->unit, left = (size_t)q->rest + 2;
  q->hamiltonian_ev = malloc(unit * unit * sizeof(double));
  q->rest_ev = malloc(left * left * sizeof(double));
  if (!q->hamiltonian_ev || !q->rest_ev) return MHO_ERR_MEMORY;
  for (size_t i = 0; i < unit; i++)
    for (size_t j = 0; j < unit; j++)
      q->hamiltonian_ev[i * unit + j] =
          i == j ? p->diagonal[r->first + (int)i]
                 : hopping_to(p, r->first + (int)i, r->first + (int)j);
  for (size_t i = 0; i < left; i++)
    for (size_t j = 0; j < left; j++) {
      bool ends = i + 2 >= left && j + 2 >= left;
      q->rest_ev[i * left + j] = ends     ? 0
                                 : i == j ? p->diagonal[site[i]]
                                          : hopping_to(p, site[i], site[j]);
    }
  return mho_plan_contacts(p->plan, site, (int)left, &q->plan);
}

mho_status mho_repeat_create(const mho_plan *plan, mho_repeat **repeat)
{
  *repeat = NULL;
  if (plan->sites < 2 * UNITS_MIN || !plan->connected || mho_plan_has_chain(plan))
    return MHO_OK;
  pattern p;
  mho_status status = find_pattern(plan, &p) ? MHO_OK : MHO_ERR_MEMORY;
  if (status == MHO_OK) {
    run r = longest_run(&p);
    if (r.units >= UNITS_MIN && plan->sites - r.units * r.unit <= REPEAT_REST_MAX)
      status = build(&p, &r, repeat);
  }
  clear_pattern(&p);
  if (status == MHO_OK) return MHO_OK;
  mho_repeat_free(*repeat);
  *repeat = NULL;
  return status;
}

void mho_repeat_free(mho_repeat *repeat)
{
  if (!repeat) return;
  free(repeat->hamiltonian_ev);
  free(repeat->rest_ev);
  mho_plan_free(repeat->plan);
  free(repeat);
}

/* --- two-ports ------------------------------------------------------------------------ */

enum { STATES = 64 }; /* powers and partial products of any int of units */

/* A run; b is b 2^power.  First and second are what it was joined from, and then
 * the derivatives of ln T to a, c and ln b. */
typedef struct {
  mho_quad a, b, c;
  int power;
  double a_error, b_error, c_error; /* of this step; of b relative */
  int first, second;                /* -1: the unit */
  double to_a, to_b, to_c;
} port;

static void balance(port *p)
{
  for (; mho_quad_abs(p->b) >= 1; p->power += STEP) p->b *= SMALL;
  for (; p->b != 0 && mho_quad_abs(p->b) < SMALL; p->power -= STEP) p->b /= SMALL;
}

static mho_quad times_power(mho_quad value, int power)
{
  for (; power < 0; power += STEP) value *= SMALL;
  for (; power > 0; power -= STEP) value /= SMALL;
  return value;
}

/* b^2, or zero once it is far below rounding. */
static mho_quad square_of(const port *p)
{
  return p->power < -10 * STEP ? 0 : times_power(p->b * p->b, 2 * p->power);
}

/* E - H of the unit without its inner sites, with bounds on what rounding did. */
static bool reduce_unit(const mho_repeat *q, double energy_ev, port *p)
{
  const double u = 0x1p-113;
  int n = q->unit;
  mho_quad m[REPEAT_UNIT_MAX][REPEAT_UNIT_MAX];
  double error[REPEAT_UNIT_MAX][REPEAT_UNIT_MAX];
  for (int i = 0; i < n; i++)
    for (int j = 0; j < n; j++) {
      m[i][j] = (i == j ? (mho_quad)energy_ev : 0) - q->hamiltonian_ev[i * n + j];
      error[i][j] = i == j ? u * (double)mho_quad_abs(m[i][j]) : 0;
    }
  for (int k = 0; k < n; k++) {
    if (k == q->in || k == q->out) continue;
    mho_quad w = 1 / m[k][k];
    double size = fabs((double)w), pivot_error = error[k][k];
    if (!(size * CANCELLATION * fabs(q->joint_ev) < 1)) return false;
    for (int i = 0; i < n; i++) {
      if ((i < k && i != q->in && i != q->out) || i == k || m[i][k] == 0) continue;
      for (int j = 0; j < n; j++) {
        if ((j < k && j != q->in && j != q->out) || j == k || m[k][j] == 0) continue;
        double a = fabs((double)m[i][k]), b = fabs((double)m[k][j]);
        m[i][j] -= m[i][k] * w * m[k][j];
        error[i][j] += size * (error[i][k] * b + a * error[k][j] + a * b * size * pivot_error) +
                       u * (3 * a * size * b + fabs((double)m[i][j]));
      }
    }
  }
  *p = (port){.a = m[q->in][q->in], .b = m[q->in][q->out], .c = m[q->out][q->out],
              .a_error = error[q->in][q->in], .c_error = error[q->out][q->out],
              .first = -1, .second = -1};
  if (p->b == 0) return false;
  p->b_error = error[q->in][q->out] / fabs((double)p->b);
  balance(p);
  return isfinite(p->a_error + p->b_error + p->c_error);
}

static bool join(const mho_repeat *q, port *state, int first, int second, int result)
{
  const double u = 0x1p-113;
  const port *x = &state[first], *y = &state[second];
  mho_quad t = q->joint_ev, product = x->c * y->a, d = product - t * t, w = 1 / d;
  mho_quad left = square_of(x) * y->a * w, right = square_of(y) * x->c * w;
  double size = fabs((double)product) + (double)(t * t);
  if (!(fabs((double)d) > CANCELLATION * size)) return false;
  double inverse_error = u * (2 + 2 * size / fabs((double)d)); /* relative, of 1/D */
  port *p = &state[result];
  *p = (port){.a = x->a - left, .c = y->c - right, .b = -x->b * t * y->b * w,
              .power = x->power + y->power, .first = first, .second = second};
  p->a_error = u * fabs((double)p->a) + (6 * u + inverse_error) * fabs((double)left);
  p->c_error = u * fabs((double)p->c) + (6 * u + inverse_error) * fabs((double)right);
  p->b_error = 3 * u + inverse_error;
  balance(p);
  return true;
}

/* Powers of two and what they add up to; the last state, or -1. */
static int join_all(const mho_repeat *q, port *state)
{
  int count = 1, power = 0, sum = -1;
  for (int units = q->units; units; units >>= 1) {
    if ((units & 1) && sum < 0) sum = power;
    else if (units & 1) {
      if (!join(q, state, sum, power, count)) return -1;
      sum = count++;
    }
    if (units == 1) break;
    if (!join(q, state, power, power, count)) return -1;
    power = count++;
  }
  return sum;
}

/* Derivatives of ln T from a state to those it was joined from. */
static void pass_back(const mho_repeat *q, port *state, const port *p)
{
  if (p->first < 0) return;
  port *x = &state[p->first], *y = &state[p->second];
  double t = q->joint_ev, a = (double)y->a, c = (double)x->c;
  double w = 1 / (double)(x->c * y->a - (mho_quad)t * t);
  double left = (double)square_of(x), right = (double)square_of(y);
  double to_a = p->to_a, to_b = p->to_b, to_c = p->to_c;
  x->to_a += to_a;
  y->to_c += to_c;
  x->to_b += to_b - 2 * to_a * left * a * w;
  y->to_b += to_b - 2 * to_c * right * c * w;
  x->to_c += to_a * left * a * a * w * w + to_c * right * t * t * w * w - to_b * a * w;
  y->to_a += to_c * right * c * c * w * w + to_a * left * t * t * w * w - to_b * c * w;
}

void mho_repeat_evaluate(const mho_repeat *repeat, mho_elimination_quad *workspace,
                         double energy_ev, mho_estimate *estimate)
{
  *estimate = (mho_estimate){.relative_error = INFINITY};
  port state[STATES];
  int last = reduce_unit(repeat, energy_ev, &state[0]) ? join_all(repeat, state) : -1;
  if (last < 0) return;
  size_t n = (size_t)repeat->rest + 2;
  mho_quad value[(REPEAT_REST_MAX + 2) * (REPEAT_REST_MAX + 2)];
  double adjoint[(REPEAT_REST_MAX + 2) * (REPEAT_REST_MAX + 2)];
  for (size_t k = 0; k < n * n; k++)
    value[k] = (k % (n + 1) == 0 ? (mho_quad)energy_ev : 0) - repeat->rest_ev[k];
  port *p = &state[last];
  int removed = p->power < -STEP ? p->power + STEP : 0; /* T goes as b^2 down there */
  mho_quad b = times_power(p->b, p->power - removed);
  value[n * n - 1] = p->c;
  value[n * n - n - 2] = p->a;
  value[n * n - 2] = value[n * n - n - 1] = b;
  mho_elimination_reduced_quad(repeat->plan, workspace, value, adjoint, estimate);
  if (!estimate->first_order) return;
  for (int s = 0; s <= last; s++) state[s].to_a = state[s].to_b = state[s].to_c = 0;
  p->to_a = adjoint[n * n - n - 2];
  p->to_b = adjoint[n * n - 2] * (double)b;
  p->to_c = adjoint[n * n - 1];
  double error = 0;
  for (int s = last; s >= 0; s--) {
    const port *x = &state[s];
    error += fabs(x->to_a) * x->a_error + fabs(x->to_b) * x->b_error + fabs(x->to_c) * x->c_error;
    pass_back(repeat, state, x);
  }
  estimate->relative_error += 1.05 * error;
  estimate->log10_transmission += 2 * removed * log10(2.0);
  estimate->transmission = ldexp(estimate->transmission, 2 * removed);
  if (!isfinite(estimate->relative_error)) *estimate = (mho_estimate){.relative_error = INFINITY};
}
