/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * P = g D, with D the polynomial of the states that a contact sees.  A level
 * that has seen combinations but no weight in g is a zero of P by itself; the
 * others are the zeros of g, whose number is known exactly: the poles of g,
 * less one, less the power by which it falls faster than 1/E.
 *
 * They start as eigenvalues of H with the input and the output held at zero,
 *
 *   Q^T H Q = [[A, .], [a^T, .]],  Z = A - b a^T / beta,
 *
 * Q with the Krylov vectors of v_r last, (b, beta) = Q^T v_l, and are improved
 * together (O. Aberth, Math. Comp. 27, 339 (1973)), first on sums over levels,
 * then on g to twice the digits.  Of a polynomial u of degree n some zero lies
 * within n |u/u'| of any point (Laguerre), so that discs which are apart, as
 * many as zeros, hold one each.  Where discs meet, the argument principle on a
 * circle around them counts.
 */
#include "solver/zeros.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/lapack.h"
#include "solver/bare.h"
#include "solver/levels.h"

enum { SUM_STEPS = 40, BARE_STEPS = 60, KICKS = 4, CIRCLE_POINTS = 48 };

/* More guesses far off, and g is below the range of a double where its zeros are: the
 * way between the contacts has hundreds of bonds. */
enum { LOST_MAX = 8 };

/* A zero this near (times ||H||) to a level that g does not have, where z - H is
 * near to singular, may be left to a circle; nearer than the second it is. */
#define HELD 1e-4
#define HELD_LEAST 1e-9

/* The same where g is known to 30 digits. */
#define HELD_FINE 1e-10
#define HELD_LEAST_FINE 1e-13

/* Steps below this (times ||H||) that no longer shrink are rounding, after so many
 * kicks off the line that two near zeros are mirror images in. */
#define STANDS 1e-9

/* A disc this small (times ||H||) needs no further step. */
#define ENOUGH 1e-11

/* Energies this near (times ||H||) are one; what counts as alpha. */
#define SAME_ENERGY 1e-13
#define TINY 1e-16

/* Where a level is looked at from, times ||H||. */
#define ASIDE 1e-9

/* Largest circle, times ||H||; one around m zeros has a radius of CIRCLE_DECADES/m
 * decades, so that g on it is well above rounding; largest cluster on a circle
 * that is one zero. */
#define CIRCLE 0.05
#define CIRCLE_DECADES -12.0
#define SPREAD 1e-5

typedef struct {
  double complex z;
  double radius; /* a zero lies within */
  double step;   /* last correction */
  int cluster, kicks;
  bool held, level; /* beside a level that g lacks; such a level */
} zero;

typedef struct {
  const mho_plan *plan;
  mho_level_group *group;
  int groups, zeros, free; /* zero[0 .. free - 1] are those of g */
  zero *zero;
  mho_bare *bare;
  int lost;  /* zeros that were brought back */
  bool fine; /* what doubles did not tell apart once more, with g to 30 digits */
} search;

static bool evaluate(const search *s, double complex z, mho_bare_green *green)
{
  return s->fine ? mho_bare_evaluate_fine(s->bare, z, green) : mho_bare_evaluate(s->bare, z, green);
}

static double held(const search *s) { return (s->fine ? HELD_FINE : HELD) * s->plan->norm_ev; }

static double held_least(const search *s)
{
  return (s->fine ? HELD_LEAST_FINE : HELD_LEAST) * s->plan->norm_ev;
}

/* x -= u (u.x) 2/|u|^2 for x[0], x[step], ... */
static void reflect(const double *u, double scale, double *x, size_t step, size_t n)
{
  double sum = 0;
  for (size_t i = 0; i < n; i++) sum += u[i] * x[i * step];
  sum *= scale;
  for (size_t i = 0; i < n; i++) x[i * step] -= sum * u[i];
}

/* Turns the output c into the last of m states, of matrix a, input b and all. */
static void turn_last(double *a, size_t stride, size_t m, double *b, double *u)
{
  double square = 0;
  for (size_t i = 0; i < m; i++) square += u[i] * u[i];
  u[m - 1] += u[m - 1] > 0 ? sqrt(square) : -sqrt(square);
  square = 0;
  for (size_t i = 0; i < m; i++) square += u[i] * u[i];
  double scale = square > 0 ? 2 / square : 0;
  for (size_t j = 0; j < m; j++) reflect(u, scale, a + j * stride, 1, m);
  for (size_t i = 0; i < m; i++) reflect(u, scale, a + i, stride, m);
  reflect(u, scale, b, 1, m);
}

/* Z, in the first *size rows and columns of a. */
static void closed_loop(const mho_plan *plan, int first, double *a, double *b, double *u,
                        size_t *size)
{
  size_t n = (size_t)plan->sites, m = n;
  for (size_t e = 0; e < plan->entries; e++) {
    size_t i = (size_t)plan->entry[e].i, j = (size_t)plan->entry[e].j;
    a[i * n + j] += plan->entry[e].value_ev;
    if (i != j) a[j * n + i] += plan->entry[e].value_ev;
  }
  memcpy(b, plan->vector, n * sizeof *b);
  memcpy(u, plan->vector + n, n * sizeof *u);
  for (int dropped = 0;; dropped++, m--) {
    turn_last(a, n, m, b, u);
    if (dropped == first) break;
    for (size_t j = 0; j + 1 < m; j++) u[j] = a[j * n + m - 1]; /* its row feeds it */
  }
  *size = --m;
  for (size_t j = 0; j < m; j++) {
    double row = a[j * n + m] / b[m];
    for (size_t i = 0; i < m; i++) a[j * n + i] -= row * b[i];
  }
}

/* Takes the guess nearest to a level out of the list. */
static void take_nearest(double complex *guess, size_t *count, double level_ev)
{
  size_t best = 0;
  for (size_t k = 1; k < *count; k++)
    if (cabs(guess[k] - level_ev) < cabs(guess[best] - level_ev)) best = k;
  if (*count) guess[best] = guess[--*count];
}

/* *sure is false where Z overflows or its eigenvalues do not converge. */
static mho_status guess(search *s, const mho_exact_counts *counts, bool *sure)
{
  size_t n = (size_t)s->plan->sites, m = 0;
  double *a = calloc(n * n + 2 * n, sizeof *a), *b = a + n * n;
  double complex *value = malloc(n * sizeof *value);
  mho_status status = a && value ? MHO_OK : MHO_ERR_MEMORY;
  if (status == MHO_OK) {
    closed_loop(s->plan, counts->first, a, b, b + n, &m);
    for (size_t j = 1; j < m; j++) memmove(a + j * m, a + j * n, m * sizeof *a);
    if (m > 0) status = mho_eigenvalues_real((int)m, a, value, NULL);
  }
  *sure = status == MHO_OK;
  for (int i = 0; status == MHO_OK && i < s->groups; i++)
    for (int k = s->group[i].weight != 0; k < s->group[i].states; k++)
      take_nearest(value, &m, s->group[i].level_ev);
  for (size_t k = 0; status == MHO_OK && k < (size_t)s->free; k++) /* apart, to be divided by */
    s->zero[k].z = k < m ? value[k] + 1e-15 * s->plan->norm_ev * (double)k : (double)k;
  free(a);
  free(value);
  return status == MHO_ERR_MEMORY ? status : MHO_OK;
}

/* Step that takes zero k to one of u, the others divided out; newton is u'/u. */
static double complex correction(const search *s, int k, double complex newton)
{
  double complex others = 0;
  for (int j = 0; j < s->free; j++) {
    double x = creal(s->zero[k].z) - creal(s->zero[j].z);
    double y = cimag(s->zero[k].z) - cimag(s->zero[j].z), square = x * x + y * y;
    if (j != k && square > 0) others += CMPLX(x / square, -y / square);
  }
  double complex together = newton - others;
  return cabs(together) > 0 ? 1 / together : 0;
}

static void polish_on_levels(search *s)
{
  double norm = s->plan->norm_ev, largest = norm;
  for (int k = 0; k < s->free; k++) s->zero[k].step = norm;
  for (int step = 0; step < SUM_STEPS && largest > 0; step++) {
    largest = 0;
    for (int k = 0; k < s->free; k++) {
      zero *z = &s->zero[k];
      if (z->step == 0) continue;
      mho_level_sum g = mho_levels_sum(s->group, s->groups, norm, z->z);
      if (!isfinite(g.noise) || cabs(g.value) <= 4 * g.noise) {
        z->step = 0;
        continue;
      }
      double complex change = correction(s, k, g.slope / g.value + g.poles);
      double size = cabs(change);
      if (size < STANDS * norm && size > z->step / 4) size = 0;
      z->z -= change;
      z->step = size > 1e-15 * norm ? size : 0;
      largest = fmax(largest, z->step);
    }
  }
}

/* Distance of the nearest level that g does not have. */
static double blank_distance(const search *s, double complex z)
{
  double nearest = INFINITY;
  for (int i = 0; i < s->groups; i++)
    if (s->group[i].weight == 0) nearest = fmin(nearest, cabs(z - s->group[i].level_ev));
  return nearest;
}

/* Beside a level that g does not have z - H is singular, and a multiple zero
 * may be met exactly: then a circle finds it. */
static bool hold(const search *s, zero *z)
{
  double distance = blank_distance(s, z->z);
  z->held = true;
  z->step = 0;
  z->radius = 3 * fmax(distance < held(s) ? distance : 0, held_least(s));
  return true;
}

/* So far out that g is nothing: a guess that rounding made.  Elsewhere, then. */
static bool bring_back(search *s, int k)
{
  zero *z = &s->zero[k];
  if (cabs(z->z) < 2 * s->plan->norm_ev || s->lost++ >= LOST_MAX) return false;
  z->kicks++;
  z->z = 0.6 * s->plan->norm_ev * cexp(I * (1 + 2.4 * k + z->kicks));
  z->step = s->plan->norm_ev;
  z->radius = INFINITY;
  return true;
}

/* One step on g itself, and the disc around where it leads. */
static bool polish(search *s, int k)
{
  zero *z = &s->zero[k];
  double norm = s->plan->norm_ev, degree = s->free, least = 8 * UNIT_ROUNDOFF * norm;
  double blank = blank_distance(s, z->z);
  mho_bare_green g;
  if (blank < held_least(s)) return hold(s, z);
  if (!evaluate(s, z->z, &g)) return bring_back(s, k) || (blank < held(s) && hold(s, z));
  double complex poles = mho_levels_sum(s->group, s->groups, norm, z->z).poles;
  double complex slope = g.slope + g.value * poles; /* u'/D */
  double size = cabs(g.value) + g.noise, doubt = g.slope_noise + g.noise * cabs(poles);
  if (!(cabs(slope) > 2 * doubt)) {
    bool vanished = cabs(g.value) < DBL_MIN && cabs(z->z) > norm;
    return bring_back(s, k) || (!vanished && hold(s, z));
  }
  z->radius = 4 * degree * size / cabs(slope) + least;
  if (!(cabs(g.value) > g.noise)) {
    z->step = 0;
    return isfinite(z->radius);
  }
  double complex change = correction(s, k, slope / g.value);
  double moved = cabs(change);
  bool stands = moved < STANDS * norm && moved > 0.6 * z->step;
  if (stands && z->kicks++ < KICKS) change *= CMPLX(0.8, 0.6);
  else if (stands) moved = 0;
  z->z -= change;
  z->step = moved <= least ? 0 : moved;
  return isfinite(z->radius);
}

/* Is the disc of zero k small, and against the distance of the next one? */
static bool is_settled(const search *s, int k)
{
  double nearest = INFINITY;
  for (int j = 0; j < s->free; j++)
    if (j != k) nearest = fmin(nearest, cabs(s->zero[k].z - s->zero[j].z));
  return s->zero[k].radius <= fmin(ENOUGH * s->plan->norm_ev, nearest / 8);
}

/* All whose step is not 0. */
static bool polish_all(search *s)
{
  double largest = INFINITY;
  for (int step = 0; step < BARE_STEPS && largest > 0; step++) {
    largest = 0;
    for (int k = 0; k < s->free; k++) {
      if (s->zero[k].step == 0) continue;
      if (!polish(s, k)) return false;
      if (is_settled(s, k)) s->zero[k].step = 0;
      largest = fmax(largest, s->zero[k].step);
    }
  }
  return true;
}

static void join(search *s)
{
  for (int k = 0; k < s->zeros; k++) s->zero[k].cluster = k;
  for (int i = 0; i < s->zeros; i++)
    for (int j = 0; j < i; j++) {
      int from = s->zero[i].cluster, to = s->zero[j].cluster;
      double distance = cabs(s->zero[i].z - s->zero[j].z);
      if (from == to || distance > s->zero[i].radius + s->zero[j].radius) continue;
      for (int k = 0; k < s->zeros; k++)
        if (s->zero[k].cluster == from) s->zero[k].cluster = to;
    }
}

typedef struct {
  int free, level; /* members: zeros of g, and a level */
  double level_ev, size, gap;
  double complex center; /* of the zeros of g */
  bool held, mixed; /* beside a level that g lacks; two levels in it */
} cluster;

static cluster gather(const search *s, int number)
{
  cluster c = {.gap = CIRCLE * s->plan->norm_ev * 3};
  double complex middle = 0;
  for (int k = 0; k < s->zeros; k++) {
    const zero *z = &s->zero[k];
    if (z->cluster != number) continue;
    middle += z->z;
    if (z->level) {
      c.mixed |= c.level && fabs(c.level_ev - creal(z->z)) > SAME_ENERGY * s->plan->norm_ev;
      c.level_ev = creal(z->z);
    } else c.center += z->z;
    *(z->level ? &c.level : &c.free) += 1;
    c.held |= z->held;
  }
  if (c.free + c.level == 0) return c;
  middle /= c.free + c.level;
  c.center = c.free ? c.center / c.free : middle;
  for (int k = 0; k < s->zeros; k++) {
    double distance = cabs(c.center - s->zero[k].z), radius = s->zero[k].radius;
    if (s->zero[k].cluster == number) c.size = fmax(c.size, distance + radius);
    else c.gap = fmin(c.gap, distance - radius);
  }
  for (int i = 0; i < s->groups; i++)
    if (s->group[i].weight != 0) c.gap = fmin(c.gap, cabs(c.center - s->group[i].level_ev));
  return c;
}

/* Zeros of g inside a circle and their mean,
 *   m = 1/(2 pi i) integral of g'/g dz,   m mean = 1/(2 pi i) integral of z g'/g dz,
 * by the trapezoidal rule, which converges geometrically; no pole of g lies
 * inside.  False if that is not so many zeros at one point. */
static bool count_inside(const search *s, cluster *c)
{
  double points = CIRCLE_POINTS, small = pow(10, CIRCLE_DECADES / c->free);
  small = fmax(small * s->plan->norm_ev, c->held ? held(s) : 0);
  double radius = fmin(c->gap / 3, fmax(small, 2.5 * c->size));
  double complex count = 0, moment = 0, second = 0;
  if (!(radius > 1.5 * c->size)) return false;
  for (int k = 0; k < CIRCLE_POINTS; k++) {
    double complex z = c->center + radius * cexp(2 * M_PI * I * (k + 0.5) / points);
    double complex arm = z - c->center; /* as rounded */
    mho_bare_green g;
    if (!evaluate(s, z, &g) || !(cabs(g.value) > g.noise)) return false;
    double complex term = arm * g.slope / g.value / points;
    count += term;
    moment += arm * term;
    second += arm * arm * term;
  }
  if (cabs(count - c->free) > 0.01) return false;
  double complex mean = moment / c->free;
  double spread = cabs(csqrt(second / c->free - mean * mean));
  if (c->free > 1 && spread > SPREAD * radius) return false;
  c->center += mean;
  c->size = c->held || c->free > 1 ? SAME_ENERGY * s->plan->norm_ev : c->size;
  return true;
}

static void add_node(const search *s, double complex z, double size, int order, mho_nodes *result)
{
  bool real = fabs(cimag(z)) <= size;
  if (!real && cimag(z) < 0) return;
  double energy = fabs(creal(z)) <= TINY * s->plan->norm_ev ? 0 : creal(z);
  result->node[result->count++] =
      (mho_node){.kind = real ? MHO_NODE_EXACT : MHO_NODE_DIP, .energy_ev = energy,
                 .imaginary_ev = real ? 0 : cimag(z), .order = order};
}

static bool make_nodes(const search *s, int number, mho_nodes *result)
{
  cluster c = gather(s, number);
  if (c.free + c.level == 0) return true;
  if (c.mixed) return false;
  if (c.free > 0 && (c.free + c.level > 1 || c.held) && !count_inside(s, &c)) return false;
  bool one = c.level && (!c.free || cabs(c.center - c.level_ev) <= SAME_ENERGY * s->plan->norm_ev);
  if (one) add_node(s, c.level_ev, 0, c.free + c.level, result);
  else {
    add_node(s, c.center, c.size, c.free, result);
    if (c.level) add_node(s, c.level_ev, 0, c.level, result);
  }
  return true;
}

/* A level to the last digit, from z beside it: g_c = v_c^T (z - H)^-1 v_c is
 * a^2/(z - eps) + r there, so that eps = z + g_c/g_c' but for r (z - eps)^2/a^2. */
static double sharpen(const search *s, int i)
{
  const mho_level_group *g = &s->group[i];
  double norm = s->plan->norm_ev, aside = ASIDE * norm, gap = norm;
  int c = g->right > g->left;
  for (int k = i > 0 ? i - 1 : i + 1; k <= i + 1 && k < s->groups; k += 2)
    gap = fmin(gap, fabs(s->group[k].level_ev - g->level_ev));
  mho_bare_green green;
  double z = g->level_ev + aside;
  bool good = aside * aside <= TINY * norm * gap * (c ? g->right : g->left);
  if (!good || !mho_bare_evaluate(s->bare, z, &green)) return g->level_ev;
  double better = z + creal(green.own[c] / green.own_slope[c]);
  return fabs(better - g->level_ev) <= SAME_ENERGY * norm ? better : g->level_ev;
}

/* Levels that are zeros by themselves, behind those of g. */
static void add_levels(search *s)
{
  int count = s->free;
  for (int i = 0; i < s->groups; i++) {
    int first = s->group[i].weight != 0;
    if (first < s->group[i].seen) s->group[i].level_ev = sharpen(s, i);
    for (int k = first; k < s->group[i].seen; k++)
      s->zero[count++] = (zero){.z = s->group[i].level_ev - s->group[i].faint, .level = true,
                                .radius = 8 * UNIT_ROUNDOFF * s->plan->norm_ev};
  }
}

/* Nodes of all clusters; those that are none yet have their step set. */
static bool conclude(search *s, mho_nodes *result)
{
  bool good = true;
  int order = 0;
  result->count = 0;
  join(s);
  for (int number = 0; number < s->zeros; number++) {
    if (make_nodes(s, number, result)) continue;
    good = false;
    for (int k = 0; k < s->free; k++)
      if (s->zero[k].cluster == number) s->zero[k].step = s->plan->norm_ev;
  }
  for (size_t k = 0; good && k < result->count; k++)
    order += result->node[k].order * (result->node[k].kind == MHO_NODE_DIP ? 2 : 1);
  return good && order == s->zeros;
}

static bool finish(search *s, mho_nodes *result)
{
  polish_on_levels(s);
  for (int k = 0; k < s->free; k++) s->zero[k].step = s->plan->norm_ev;
  if (!polish_all(s)) return false;
  add_levels(s);
  if (conclude(s, result)) return true;
  s->fine = true;
  for (int k = 0; k < s->free; k++)
    if (s->zero[k].step > 0) {
      s->zero[k].kicks = 0;
      s->zero[k].held = false;
    }
  return polish_all(s) && conclude(s, result);
}

mho_status mho_zeros_find(const mho_plan *plan, const mho_exact_counts *counts, mho_nodes *result,
                          bool *sure, mho_error *error)
{
  size_t n = (size_t)plan->sites;
  search s = {.plan = plan};
  double *room = malloc(2 * n * sizeof *room);
  s.group = malloc(n * sizeof *s.group);
  s.zero = calloc(n, sizeof *s.zero);
  s.bare = mho_bare_create(plan);
  mho_status status = room && s.group && s.zero && s.bare ? MHO_OK : MHO_ERR_MEMORY;
  *sure = false;
  if (status == MHO_OK) {
    s.groups = mho_levels_group(plan, s.group);
    bool settled = mho_levels_settle(s.group, s.groups, counts, plan->norm_ev, room);
    for (int i = 0; settled && i < s.groups; i++) {
      s.free += s.group[i].weight != 0;
      s.zeros += s.group[i].seen;
    }
    s.free -= 1 + counts->first;
    s.zeros -= 1 + counts->first;
    if (settled && s.free >= 0) {
      result->zeros = s.zeros;
      result->unseen = plan->sites - 1 - counts->first - s.zeros;
      status = guess(&s, counts, sure);
      *sure = *sure && finish(&s, result);
    }
  }
  if (!*sure) result->count = 0;
  if (status != MHO_OK) mho_fail(error, status, "solver", NULL, "out of memory");
  mho_bare_free(s.bare);
  free(s.zero);
  free(s.group);
  free(room);
  return status;
}
