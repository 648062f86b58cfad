/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * With g = (E - H)^-1 and H' = H + e u^T + u e^T + d e e^T, e the site and u its
 * changed hoppings (d depends on E where a chain hangs on the site),
 *
 *   g' = g + g U M^-1 U^T g,   U = (e, u),   M = (0 1; 1 -d) - U^T g U
 *
 * (M. A. Woodbury, Princeton memorandum 42 (1950)), needed between the contacts
 * only:  F' = V^T g' V,
 *   T' = Gamma_l Gamma_r |F'_lr|^2 / |(1 - S_l F'_ll)(1 - S_r F'_rr) - S_l S_r F'_lr^2|^2.
 *
 * One g an energy serves every change.  The energies are the Gauss points of the
 * unchanged junction; whether they resolve T' is seen from the last Legendre
 * coefficients of each panel.
 */
#include "analysis/site_change.h"

#include <complex.h>
#include <float.h>
#include <math.h>
#include <stdlib.h>

#include "analysis/pairs.h"
#include "analysis/thermal.h"

/* Relative error of the average that is good enough. */
#define ENOUGH 1e-8

/* Errors of levels and orbitals, in roundoffs. */
#define EIGEN_CONSTANT 16

enum { P = MHO_THERMAL_POINTS };

typedef struct {
  const mho_junction *junction;
  size_t n, points, levels;
  const double *energy_ev;
  double *weight;       /* [levels][points]: of T in the average */
  double *green, *work; /* [n][n] */
  double *left, *right; /* [n]: g v of both contacts */
  double *norm;         /* [n]: |g e_i| */
  double f[3], left_norm, right_norm, scale_ev; /* F_ll, F_lr, F_rr; |g v| */
  double last[2][P];    /* functionals that give the last two coefficients */
} work;

/* d of the chain: continued fraction. */
static double hang_on(const mho_site_change *c, double energy_ev)
{
  double sum = 0;
  for (int k = c->chain - 1; k >= 0; k--)
    sum = c->chain_hopping_ev[k] * c->chain_hopping_ev[k] / (energy_ev - c->chain_onsite_ev[k] - sum);
  return sum;
}

static double transmit(const work *w, const double f[3])
{
  const mho_lead *l = &w->junction->lead[MHO_LEFT], *r = &w->junction->lead[MHO_RIGHT];
  double complex a = *l->shift_ev - 0.5 * I * *l->coupling_ev;
  double complex b = *r->shift_ev - 0.5 * I * *r->coupling_ev;
  double complex d = (1 - a * f[0]) * (1 - b * f[2]) - a * b * f[1] * f[1];
  return *l->coupling_ev * *r->coupling_ev * f[1] * f[1] / creal(d * conj(d));
}

/* T' at one energy, and a bound on its error. */
static double evaluate(const work *w, const mho_site_change *c, double energy_ev, double *error)
{
  size_t s = (size_t)c->site;
  const double *column = w->green + s * w->n;
  double d = c->onsite_ev + hang_on(c, energy_ev), ss = column[s], su = 0, uu = 0;
  double left[2] = {w->left[s], 0}, right[2] = {w->right[s], 0}, u_norm = 0;
  for (int k = 0; k < c->bonds; k++) {
    size_t p = (size_t)c->partner[k];
    double t = c->hopping_ev[k];
    su += t * column[p];
    left[1] += t * w->left[p];
    right[1] += t * w->right[p];
    u_norm += fabs(t) * w->norm[p];
    for (int m = 0; m < c->bonds; m++)
      uu += t * c->hopping_ev[m] * w->green[p * w->n + (size_t)c->partner[m]];
  }
  double m00 = -ss, m01 = 1 - su, m11 = -d - uu, f[3], x[2], y[2];
  double determinant = m00 * m11 - m01 * m01;
  x[0] = (m11 * left[0] - m01 * left[1]) / determinant;
  x[1] = (m00 * left[1] - m01 * left[0]) / determinant;
  y[0] = (m11 * right[0] - m01 * right[1]) / determinant;
  y[1] = (m00 * right[1] - m01 * right[0]) / determinant;
  f[0] = w->f[0] + left[0] * x[0] + left[1] * x[1];
  f[1] = w->f[1] + left[0] * y[0] + left[1] * y[1];
  f[2] = w->f[2] + right[0] * y[0] + right[1] * y[1];
  double from_left = w->left_norm + fabs(x[0]) * w->norm[s] + fabs(x[1]) * u_norm;
  double from_right = w->right_norm + fabs(y[0]) * w->norm[s] + fabs(y[1]) * u_norm;
  double t = transmit(w, f);
  double doubt = EIGEN_CONSTANT * (0.5 * DBL_EPSILON) * w->scale_ev * from_left * from_right;
  *error = f[1] != 0 ? t * fmin(1, 2 * doubt / fabs(f[1])) + transmit(w, (double[]){f[0], doubt, f[2]})
                     : transmit(w, (double[]){f[0], doubt, f[2]});
  return t;
}

static double project(const mho_lead *lead, size_t n, const double *x)
{
  double sum = 0;
  for (size_t i = 0; i < n; i++) sum += lead->vector[i] * x[i];
  return sum;
}

/* g and what follows from it; false beside a level. */
static mho_status move_to(work *w, double energy_ev, bool *near, mho_error *error)
{
  const mho_junction *j = w->junction;
  const mho_lead *l = &j->lead[MHO_LEFT], *r = &j->lead[MHO_RIGHT];
  double nearest = INFINITY;
  for (size_t k = 0; k < w->n; k++) nearest = fmin(nearest, fabs(energy_ev - j->level_ev[k]));
  *near = nearest < 1e-9;
  if (*near) return MHO_OK;
  mho_status status = mho_bare_green(j, energy_ev, w->work, w->green, error);
  w->left_norm = w->right_norm = 0;
  w->scale_ev = fmax(fabs(j->level_ev[0]), fabs(j->level_ev[w->n - 1])) + fabs(energy_ev);
  for (size_t i = 0; status == MHO_OK && i < w->n; i++) {
    const double *column = w->green + i * w->n;
    double square = 0;
    for (size_t k = 0; k < w->n; k++) square += column[k] * column[k];
    w->norm[i] = sqrt(square);
    w->left[i] = project(l, w->n, column);
    w->right[i] = project(r, w->n, column);
    w->left_norm = hypot(w->left_norm, w->left[i]);
    w->right_norm = hypot(w->right_norm, w->right[i]);
  }
  w->f[0] = project(l, w->n, w->left);
  w->f[1] = project(l, w->n, w->right);
  w->f[2] = project(r, w->n, w->right);
  return status;
}

/* Coefficients of P_14 and P_15 from values at the Gauss points of a panel. */
static void set_functionals(work *w, const mho_thermal_grid *grid)
{
  double low = grid->energy_ev[0], high = grid->energy_ev[0], total = 0;
  for (size_t i = 0; i < P; i++) {
    low = fmin(low, grid->energy_ev[i]);
    high = fmax(high, grid->energy_ev[i]);
    total += grid->weight_ev[i];
  }
  for (size_t i = 0; i < P; i++) {
    double x = (2 * grid->energy_ev[i] - low - high) / total, before = 1, now = x;
    for (int k = 1; k < P - 1; k++) {
      double next = ((2 * k + 1) * x * now - k * before) / (k + 1);
      before = now;
      now = next;
    }
    double part = 2 * grid->weight_ev[i] / total;
    w->last[0][i] = (P - 2 + 0.5) * part * before;
    w->last[1][i] = (P - 1 + 0.5) * part * now;
  }
}

static void set_weights(work *w, const mho_thermal_grid *grid, const double *fermi_ev, double kt_ev)
{
  for (size_t l = 0; l < w->levels; l++)
    for (size_t i = 0; i < w->points; i++) {
      double f = exp(-fabs(grid->energy_ev[i] - fermi_ev[l]) / kt_ev);
      w->weight[l * w->points + i] = grid->weight_ev[i] * f / ((1 + f) * (1 + f)) / kt_ev;
    }
}

/* What the panels may miss of T'.  Coefficients fall geometrically, c_k = c_0 q^k,
 * and 16 Gauss points miss those from k = 32 on: about c_15^2 / c_0. */
static void add_unresolved(const work *w, const double *value, double *error)
{
  for (size_t first = 0; first + P <= w->points; first += P) {
    double last = 0, largest = DBL_MIN;
    for (size_t i = 0; i < P; i++) largest = fmax(largest, value[first + i]);
    for (int c = 0; c < 2; c++) {
      double sum = 0;
      for (size_t i = 0; i < P; i++) sum += w->last[c][i] * value[first + i];
      last = fmax(last, fabs(sum));
    }
    for (size_t i = 0; i < P; i++) error[first + i] += last * last / largest;
  }
}

static bool average(const work *w, const double *value, double *error, double *log10_g0)
{
  bool good = true;
  add_unresolved(w, value, error);
  for (size_t l = 0; l < w->levels && good; l++) {
    const double *weight = w->weight + l * w->points;
    double sum = 0, doubt = 0;
    for (size_t i = 0; i < w->points; i++) {
      sum += weight[i] * value[i];
      doubt += weight[i] * error[i];
    }
    good = doubt <= ENOUGH * sum && isfinite(sum) && sum > 0;
    if (good) log10_g0[l] = log10(sum);
  }
  return good;
}

static mho_status run(work *w, const mho_site_change *change, size_t count, double *log10_g0,
                      bool *good, mho_error *error)
{
  double *value = malloc((2 * count * w->points + 1) * sizeof *value);
  double *doubt = value + count * w->points;
  mho_status status = value ? MHO_OK : MHO_ERR_MEMORY;
  bool near = false;
  for (size_t i = 0; status == MHO_OK && !near && i < w->points; i++) {
    status = move_to(w, w->energy_ev[i], &near, error);
    for (size_t k = 0; status == MHO_OK && !near && k < count; k++)
      value[k * w->points + i] =
          evaluate(w, &change[k], w->energy_ev[i], &doubt[k * w->points + i]);
  }
  for (size_t k = 0; status == MHO_OK && !near && k < count; k++)
    good[k] = average(w, value + k * w->points, doubt + k * w->points, log10_g0 + k * w->levels);
  free(value);
  return status;
}

mho_status mho_site_changes(const mho_junction *junction, const mho_site_change *change,
                            size_t count, const double *fermi_ev, size_t levels, double kt_ev,
                            double *log10_g0, bool *good, mho_error *error)
{
  const mho_lead *l = &junction->lead[MHO_LEFT], *r = &junction->lead[MHO_RIGHT];
  mho_thermal_grid grid = {0};
  mho_plan *plan = NULL;
  for (size_t k = 0; k < count; k++) good[k] = false;
  if (l->channels != 1 || r->channels != 1 || l->chain || r->chain || kt_ev < MHO_COLD_EV)
    return MHO_OK;
  mho_status status = mho_plan_create(junction, &plan, error);
  if (status == MHO_OK)
    status = mho_thermal_grid_build(plan, NULL, fermi_ev, levels, kt_ev, &grid, error);
  size_t n = (size_t)junction->sites;
  work w = {.junction = junction, .n = n, .points = grid.count, .levels = levels,
            .energy_ev = grid.energy_ev};
  double *room = malloc((levels * grid.count + 2 * n * n + 3 * n) * sizeof *room);
  if (status == MHO_OK && !room) status = MHO_ERR_MEMORY;
  if (status == MHO_OK) {
    w.weight = room;
    w.green = room + levels * grid.count;
    w.work = w.green + n * n;
    w.left = w.work + n * n;
    w.right = w.left + n;
    w.norm = w.right + n;
    set_functionals(&w, &grid);
    set_weights(&w, &grid, fermi_ev, kt_ev);
    status = run(&w, change, count, log10_g0, good, error);
  }
  if (status == MHO_ERR_MEMORY) mho_fail(error, status, "analysis", NULL, "out of memory");
  free(room);
  mho_thermal_grid_clear(&grid);
  mho_plan_free(plan);
  return status;
}
