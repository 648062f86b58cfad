/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Factors of z - H within its band in double precision, and one step of
 * refinement with the residual in twice that (J. H. Wilkinson, Rounding Errors
 * in Algebraic Processes (1963), section 3.5.3):
 *
 *   x = A^-1 v_l,  r = v_l - A x exactly,  dx = A^-1 r,  g = v_r^T (x + dx),
 *   and y, dy from v_r alike:   g' = -(y + dy)^T (x + dx).
 *
 * With x wrong by the part q = |dx|/|x|, x + dx is wrong by q^2: twice the
 * digits, where elimination keeps the zeros that structure makes.  In the fine way
 * x is held in 113 bits and refined until it has them.
 */
#include "solver/bare.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/lapack.h"
#include "solver/quad.h"

/* The fine way: steps, and the part of x below which a correction is rounding. */
enum { FINE_STEPS = 24 };
#define FINE 1e-31

/* A correction larger than this part of x: no digit is right. */
#define CORRECTION_MAX 1e-2

struct mho_bare {
  const mho_plan *plan;
  size_t n, band, rows;   /* rows of the band storage, 3 band + 1 */
  double complex *factor; /* [n][rows] column by column, sites in the plan's order */
  double complex *column; /* [4][n]: x, y, dx, dy, in that order of sites */
  double *low;            /* [2][n]: what the sums of the residual have lost */
  int *pivot;
  double complex sigma[2]; /* taken from z on the site of a contact, if it has but one */
  mho_quad_complex *fine;  /* [3][n]: x, y and a residual; NULL until it is needed */
};

mho_bare *mho_bare_create(const mho_plan *plan)
{
  mho_bare *b = calloc(1, sizeof *b);
  if (!b) return NULL;
  b->plan = plan;
  b->n = (size_t)plan->sites;
  b->band = plan->bandwidth;
  b->rows = 3 * b->band + 1;
  b->factor = malloc((b->n * b->rows + 4 * b->n) * sizeof *b->factor);
  b->low = malloc(2 * b->n * sizeof *b->low);
  b->pivot = malloc(b->n * sizeof *b->pivot);
  b->column = b->factor ? b->factor + b->n * b->rows : NULL;
  if (b->factor && b->low && b->pivot) return b;
  mho_bare_free(b);
  return NULL;
}

void mho_bare_free(mho_bare *b)
{
  if (!b) return;
  free(b->factor);
  free(b->low);
  free(b->pivot);
  free(b->fine);
  free(b);
}

/* Place of a contact's first site. */
static size_t contact_place(const mho_bare *b, int c)
{
  return (size_t)b->plan->place[b->plan->support[b->plan->support_start[c]]];
}

static void assemble(mho_bare *b, double complex z)
{
  const mho_plan *plan = b->plan;
  size_t diagonal = 2 * b->band;
  memset(b->factor, 0, b->n * b->rows * sizeof *b->factor);
  for (size_t i = 0; i < b->n; i++) b->factor[i * b->rows + diagonal] = z;
  for (int c = 0; c < 2; c++)
    if (b->sigma[c] != 0) b->factor[contact_place(b, c) * b->rows + diagonal] -= b->sigma[c];
  for (size_t e = 0; e < plan->entries; e++) {
    size_t i = (size_t)plan->place[plan->entry[e].i], j = (size_t)plan->place[plan->entry[e].j];
    b->factor[j * b->rows + diagonal + i - j] -= plan->entry[e].value_ev;
    if (i != j) b->factor[i * b->rows + diagonal + j - i] -= plan->entry[e].value_ev;
  }
}

/* *high + *low -= a b, the product and the sum without rounding: T. J. Dekker,
 * Numer. Math. 18, 224 (1971), and D. E. Knuth's sum. */
static void subtract_product(double *high, double *low, double a, double b)
{
  const double split = 134217729; /* 2^27 + 1 */
  double p = a * b, a_big = split * a, b_big = split * b;
  a_big -= a_big - a;
  b_big -= b_big - b;
  double a_small = a - a_big, b_small = b - b_big;
  double lost = a_small * b_small - (((p - a_big * b_big) - a_small * b_big) - a_big * b_small);
  double sum = *high - p, part = sum - *high;
  *low += ((*high - (sum - part)) + (-p - part)) - lost;
  *high = sum;
}

static void subtract_scaled(double complex *r, double *low, double a, double complex x)
{
  double re = creal(*r), im = cimag(*r);
  subtract_product(&re, &low[0], a, creal(x));
  subtract_product(&im, &low[1], a, cimag(x));
  *r = CMPLX(re, im);
}

/* r = v - (z - H) x for the contact's v. */
static void residual(mho_bare *b, double complex z, const double *v, const double complex *x,
                     double complex *r)
{
  const mho_plan *plan = b->plan;
  memset(b->low, 0, 2 * b->n * sizeof *b->low);
  for (size_t k = 0; k < b->n; k++) {
    double *low = b->low + 2 * k;
    r[k] = v[plan->order[k]];
    subtract_scaled(&r[k], low, creal(z), x[k]);
    if (cimag(z) != 0) subtract_scaled(&r[k], low, cimag(z), CMPLX(-cimag(x[k]), creal(x[k])));
  }
  for (size_t e = 0; e < plan->entries; e++) {
    size_t i = (size_t)plan->place[plan->entry[e].i], j = (size_t)plan->place[plan->entry[e].j];
    double h = plan->entry[e].value_ev;
    subtract_scaled(&r[i], b->low + 2 * i, -h, x[j]);
    if (i != j) subtract_scaled(&r[j], b->low + 2 * j, -h, x[i]);
  }
  for (size_t k = 0; k < b->n; k++) r[k] += CMPLX(b->low[2 * k], b->low[2 * k + 1]);
}

bool mho_bare_evaluate(mho_bare *b, double complex z, mho_bare_green *green)
{
  const mho_plan *plan = b->plan;
  size_t n = b->n;
  const double *left = plan->vector, *right = left + n;
  double complex *x = b->column, *y = x + n, *dx = y + n, *dy = dx + n;
  bool several = plan->support_start[2] - plan->support_start[1] > 1;
  assemble(b, z);
  if (!mho_band_factor((int)n, (int)b->band, b->factor, b->pivot)) return false;
  for (size_t k = 0; k < n; k++) {
    x[k] = left[plan->order[k]];
    y[k] = right[plan->order[k]];
  }
  mho_band_solve((int)n, (int)b->band, b->factor, b->pivot, 2, x);
  residual(b, z, left, x, dx);
  residual(b, z, right, y, dy);
  mho_band_solve((int)n, (int)b->band, b->factor, b->pivot, 2, dx);
  double size = 0, change = 0, doubt = 0, rounding = 0;
  double y_size = 0, y_change = 0, product = 0, x_doubt = 0, y_doubt = 0;
  double complex value = 0, more = 0, slope = 0, own[2] = {0}, own_slope[2] = {0};
  for (size_t k = 0; k < n; k++) {
    double v = right[plan->order[k]];
    double complex better_x = x[k] + dx[k], better_y = y[k] + dy[k];
    value += v * x[k];
    more += v * dx[k];
    slope -= better_x * better_y;
    own[0] += left[plan->order[k]] * better_x;
    own[1] += v * better_y;
    own_slope[0] -= better_x * better_x;
    own_slope[1] -= better_y * better_y;
    if (several) rounding += fabs(v) * cabs(x[k]);
    doubt += fabs(v) * cabs(dx[k]);
    size = fmax(size, cabs(x[k]));
    change = fmax(change, cabs(dx[k]));
    y_size = fmax(y_size, cabs(y[k]));
    y_change = fmax(y_change, cabs(dy[k]));
    product += cabs(x[k] * y[k]);
    x_doubt += cabs(dx[k] * y[k]);
    y_doubt += cabs(x[k] * dy[k]);
  }
  double x_part = change / size, y_part = y_change / y_size;
  green->value = value + more;
  green->slope = slope;
  memcpy(green->own, own, sizeof own);
  memcpy(green->own_slope, own_slope, sizeof own_slope);
  green->noise = UNIT_ROUNDOFF * (4 * (cabs(green->value) + rounding) + doubt) +
                 4 * doubt * x_part;
  green->slope_noise = 4 * (UNIT_ROUNDOFF * product + x_doubt * x_part + y_doubt * y_part);
  return isfinite(size) && isfinite(green->noise) && fmax(x_part, y_part) <= CORRECTION_MAX;
}

static mho_quad_complex widen(double complex z)
{
  mho_quad_complex wide;
  __real__ wide = creal(z);
  __imag__ wide = cimag(z);
  return wide;
}

/* r = v - (z - H - Sigma) x in 113 bits. */
static void residual_fine(const mho_bare *b, double complex z, const double *v,
                          const mho_quad_complex *x, mho_quad_complex *r)
{
  const mho_plan *plan = b->plan;
  for (size_t k = 0; k < b->n; k++) r[k] = v[plan->order[k]] - widen(z) * x[k];
  for (int c = 0; c < 2; c++)
    if (b->sigma[c] != 0) r[contact_place(b, c)] += widen(b->sigma[c]) * x[contact_place(b, c)];
  for (size_t e = 0; e < plan->entries; e++) {
    size_t i = (size_t)plan->place[plan->entry[e].i], j = (size_t)plan->place[plan->entry[e].j];
    mho_quad h = plan->entry[e].value_ev;
    __real__ r[i] += h * __real__ x[j];
    __imag__ r[i] += h * __imag__ x[j];
    if (i == j) continue;
    __real__ r[j] += h * __real__ x[i];
    __imag__ r[j] += h * __imag__ x[i];
  }
}

/* Refines x until the correction dx is rounding; what is left of it, as a part of
 * x.  The residual is that of the x before. */
static double solve_fine(mho_bare *b, double complex z, const double *v, mho_quad_complex *x,
                         double complex *dx)
{
  mho_quad_complex *r = b->fine + 2 * b->n;
  double part = INFINITY;
  for (size_t k = 0; k < b->n; k++) x[k] = 0;
  for (int step = 0; step < FINE_STEPS && part > FINE; step++) {
    residual_fine(b, z, v, x, r);
    for (size_t k = 0; k < b->n; k++)
      dx[k] = CMPLX((double)__real__ r[k], (double)__imag__ r[k]);
    mho_band_solve((int)b->n, (int)b->band, b->factor, b->pivot, 1, dx);
    double size = 0, change = 0;
    for (size_t k = 0; k < b->n; k++) {
      x[k] += widen(dx[k]);
      size = fmax(size, (double)mho_quad_size(x[k]));
      change = fmax(change, cabs(dx[k]));
    }
    double now = change / size;
    if (!isfinite(now) || (step > 1 && now > part / 2)) break;
    part = step > 0 ? now : part;
  }
  return part;
}

/* What g may be wrong by: sum_k |y_k| (|r_k| + rounding of r_k), with the residual
 * r of x and y the row of the inverse that g comes from. */
static double doubt_fine(mho_bare *b, double complex z, const mho_quad_complex *x,
                         const mho_quad_complex *y)
{
  const mho_plan *plan = b->plan;
  mho_quad_complex *r = b->fine + 2 * b->n;
  double rounding = 4 * (double)QUAD_ROUNDOFF, doubt = 0;
  residual_fine(b, z, plan->vector, x, r);
  double shift = cabs(z) + cabs(b->sigma[0]) + cabs(b->sigma[1]);
  for (size_t k = 0; k < b->n; k++) {
    double left = (double)mho_quad_size(r[k]) + rounding * shift * (double)mho_quad_size(x[k]);
    doubt += (double)mho_quad_size(y[k]) * left;
  }
  for (size_t e = 0; e < plan->entries; e++) {
    size_t i = (size_t)plan->place[plan->entry[e].i], j = (size_t)plan->place[plan->entry[e].j];
    double h = rounding * fabs(plan->entry[e].value_ev);
    doubt += h * ((double)mho_quad_size(y[i]) * (double)mho_quad_size(x[j]) +
                  (double)mho_quad_size(y[j]) * (double)mho_quad_size(x[i]));
  }
  return doubt;
}

bool mho_bare_evaluate_fine(mho_bare *b, double complex z, mho_bare_green *green)
{
  const double *left = b->plan->vector, *right = left + b->n;
  if (!b->fine) b->fine = malloc(3 * b->n * sizeof *b->fine);
  assemble(b, z);
  if (!b->fine || !mho_band_factor((int)b->n, (int)b->band, b->factor, b->pivot)) return false;
  mho_quad_complex *x = b->fine, *y = x + b->n, value = 0, slope = 0;
  double complex *dx = b->column, *dy = dx + b->n;
  double x_part = solve_fine(b, z, left, x, dx), y_part = solve_fine(b, z, right, y, dy);
  double slope_doubt = 0;
  for (size_t k = 0; k < b->n; k++) {
    double x_size = (double)mho_quad_size(x[k]), y_size = (double)mho_quad_size(y[k]);
    value += (mho_quad)right[b->plan->order[k]] * x[k];
    slope -= x[k] * y[k];
    slope_doubt += cabs(dx[k]) * y_size + x_size * cabs(dy[k]) + FINE * x_size * y_size;
  }
  green->value = CMPLX((double)__real__ value, (double)__imag__ value);
  green->slope = CMPLX((double)__real__ slope, (double)__imag__ slope);
  green->noise = 4 * (UNIT_ROUNDOFF * cabs(green->value) + doubt_fine(b, z, x, y));
  green->slope_noise = 4 * (UNIT_ROUNDOFF * cabs(green->slope) + slope_doubt);
  return fmax(x_part, y_part) <= CORRECTION_MAX && isfinite(green->noise);
}

/* T = Gamma_l Gamma_r |G_lr|^2. */
void mho_bare_transmission(mho_bare *b, const mho_plan *plan, double energy_ev,
                           mho_estimate *estimate)
{
  mho_bare_green green;
  b->plan = plan;
  *estimate = (mho_estimate){.relative_error = INFINITY};
  for (int c = 0; c < 2; c++)
    b->sigma[c] = CMPLX(plan->shift_ev[c], -0.5 * plan->coupling_ev[c]);
  if (!mho_bare_evaluate_fine(b, energy_ev, &green)) return;
  double size = cabs(green.value), gamma = sqrt(plan->coupling_ev[0] * plan->coupling_ev[1]);
  if (!(size > 1e-140)) return;
  estimate->transmission = gamma * size * gamma * size;
  estimate->log10_transmission = 2 * log10(gamma * size);
  estimate->relative_error = 2 * green.noise / size + 8 * UNIT_ROUNDOFF;
  estimate->first_order = estimate->relative_error < 1e-2;
}
