/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Gauss-Legendre panels graded by the poles of the integrand.
 *
 * n Gauss points on a panel integrate a function that is analytic inside the
 * Bernstein ellipse of parameter rho with an error of order rho^-2n (L. N.
 * Trefethen, SIAM Review 50, 67 (2008)).  A pole z lies on the ellipse with
 * (rho + 1/rho)/2 = (|z - a| + |z - b|)/(b - a).  A panel is halved until that
 * is at least 1.4 (rho = 2.4, 16 points: 12 digits) for every pole of T, and
 * panels start 4 kT wide, which puts the poles of the Fermi function, pi kT
 * off the axis, at rho > 3.4.  With chains as electrodes panels end at the edges of
 * the band, where T begins as a square root: towards them they are halved until
 * what is left is rounding.
 */
#include "analysis/thermal.h"

#include <math.h>
#include <stdlib.h>

#include <gsl/gsl_errno.h>
#include <gsl/gsl_integration.h>

#include "base/processor.h"
#include "solver/plan.h"

enum { GAUSS_POINTS = MHO_THERMAL_POINTS, HALVINGS_MAX = 60, EDGE_HALVINGS = 30 };

#define ELLIPSE 1.4
#define PANEL_KT 4.0

/* exp(-40) of a resonance at T = 1 is below rounding of 1e-5. */
#define REACH_KT 40.0

/* Widths below this (times the largest pole energy) are rounding. */
#define WIDTH_RELATIVE 1e-13

typedef struct {
  const mho_pole *pole;
  size_t poles;
  double smallest_width;
  double band_ev[2]; /* T is zero outside */
  const gsl_integration_glfixed_table *rule;
  mho_thermal_grid *grid;
  size_t capacity;
} builder;

static bool is_smooth(const builder *b, double low, double high)
{
  double middle = 0.5 * (low + high), reach = 0.5 * ELLIPSE * (high - low);
  for (size_t k = 0; k < b->poles; k++) {
    double width = b->pole[k].width_ev;
    if (width < b->smallest_width || fabs(b->pole[k].energy_ev - middle) >= reach) continue;
    double to_low = hypot(b->pole[k].energy_ev - low, 0.5 * width);
    double to_high = hypot(b->pole[k].energy_ev - high, 0.5 * width);
    if (to_low + to_high < ELLIPSE * (high - low)) return false;
  }
  return true;
}

static mho_status reserve(builder *b)
{
  mho_thermal_grid *grid = b->grid;
  if (grid->count + GAUSS_POINTS <= b->capacity) return MHO_OK;
  size_t capacity = b->capacity ? 2 * b->capacity : 1024;
  double *energy = realloc(grid->energy_ev, capacity * sizeof(double));
  if (energy) grid->energy_ev = energy;
  double *weight = realloc(grid->weight_ev, capacity * sizeof(double));
  if (weight) grid->weight_ev = weight;
  if (!energy || !weight) return MHO_ERR_MEMORY;
  b->capacity = capacity;
  return MHO_OK;
}

static mho_status add_panel(builder *b, double low, double high, int halvings)
{
  bool at_edge = halvings < EDGE_HALVINGS && (low == b->band_ev[0] || high == b->band_ev[1]);
  if (at_edge || (halvings < HALVINGS_MAX && !is_smooth(b, low, high))) {
    double middle = 0.5 * (low + high);
    mho_status status = add_panel(b, low, middle, halvings + 1);
    return status == MHO_OK ? add_panel(b, middle, high, halvings + 1) : status;
  }
  mho_status status = reserve(b);
  if (status != MHO_OK) return status;
  mho_thermal_grid *grid = b->grid;
  for (size_t i = 0; i < GAUSS_POINTS; i++) {
    gsl_integration_glfixed_point(low, high, i, &grid->energy_ev[grid->count],
                                  &grid->weight_ev[grid->count], b->rule);
    grid->count++;
  }
  return MHO_OK;
}

/* A Fermi level outside the band sees the edge first. */
static double clamp(double fermi_ev, const double band_ev[2])
{
  return fmin(fmax(fermi_ev, band_ev[0]), band_ev[1]);
}

/* Panels over the union of [center - reach, center + reach] within the band. */
static mho_status add_intervals(builder *b, const double *center, size_t centers,
                                double kt)
{
  const double *band = b->band_ev;
  size_t i = 0;
  while (i < centers) {
    double low = clamp(center[i], band) - REACH_KT * kt;
    double high = clamp(center[i], band) + REACH_KT * kt;
    while (++i < centers && clamp(center[i], band) - REACH_KT * kt <= high)
      high = clamp(center[i], band) + REACH_KT * kt;
    low = fmax(low, band[0]);
    high = fmin(high, band[1]);
    if (!(low < high)) continue;
    size_t panels = (size_t)ceil((high - low) / (PANEL_KT * kt));
    double width = (high - low) / (double)panels;
    for (size_t p = 0; p < panels; p++) {
      double end = p + 1 == panels ? high : low + (double)(p + 1) * width;
      mho_status status = add_panel(b, low + (double)p * width, end, 0);
      if (status != MHO_OK) return status;
    }
  }
  return MHO_OK;
}

static mho_status evaluate(const mho_plan *plan, mho_thermal_grid *grid,
                           mho_error *error)
{
  mho_point *point = malloc(grid->count * sizeof *point);
  grid->value = malloc(grid->count * sizeof(double));
  mho_status status = point && grid->value ? MHO_OK : MHO_ERR_MEMORY;
  if (status == MHO_OK)
    status = mho_transmission_sweep(plan, grid->count, grid->energy_ev, point, error);
  if (status == MHO_OK) {
    double largest = -INFINITY;
    for (size_t i = 0; i < grid->count; i++)
      if (!point[i].node) largest = fmax(largest, point[i].log10_transmission);
    grid->scale_log10 = largest < -200 && isfinite(largest) ? largest : 0.0;
    for (size_t i = 0; i < grid->count; i++) {
      double log10_t = point[i].log10_transmission - grid->scale_log10;
      grid->value[i] = point[i].node             ? 0.0
                       : grid->scale_log10 < 0.0 ? pow(10.0, log10_t)
                                                 : point[i].transmission;
    }
  }
  free(point);
  return status;
}

mho_status mho_thermal_grid_build(const mho_plan *plan, const mho_pole *pole,
                                  const double *center_ev, size_t centers, double kt_ev,
                                  mho_thermal_grid *grid, mho_error *error)
{
  *grid = (mho_thermal_grid){0};
  size_t n = (size_t)mho_plan_sites(plan);
  mho_pole *own = NULL;
  gsl_set_error_handler_off(); /* its default aborts the program */
  gsl_integration_glfixed_table *rule = gsl_integration_glfixed_table_alloc(GAUSS_POINTS);
  mho_status status = rule ? MHO_OK : MHO_ERR_MEMORY;
  builder b = {.rule = rule, .grid = grid};
  mho_plan_band(plan, &b.band_ev[0], &b.band_ev[1]);
  if (status == MHO_OK && !pole)
    status = mho_plan_resonances(plan, clamp(center_ev[0], b.band_ev) - REACH_KT * kt_ev,
                                 clamp(center_ev[centers - 1], b.band_ev) + REACH_KT * kt_ev, &own,
                                 &n, error);
  if (status == MHO_OK) {
    if (own) pole = own;
    double scale = n ? fmax(fabs(pole[0].energy_ev), fabs(pole[n - 1].energy_ev)) : 0;
    b.pole = pole;
    b.poles = n;
    b.smallest_width = WIDTH_RELATIVE * scale;
    status = add_intervals(&b, center_ev, centers, kt_ev);
  }
  if (status == MHO_OK && grid->count) status = evaluate(plan, grid, error);
  free(own);
  if (rule) gsl_integration_glfixed_table_free(rule);
  if (status == MHO_ERR_MEMORY && error && error->count == 0)
    mho_fail(error, status, "analysis", NULL, "out of memory");
  return status;
}

void mho_thermal_grid_clear(mho_thermal_grid *grid)
{
  free(grid->energy_ev);
  free(grid->weight_ev);
  free(grid->value);
  *grid = (mho_thermal_grid){0};
}

/* --- averages ----------------------------------------------------------------
 *
 * -df/dx = y/(1+y)^2 with y = e^x.  Within NEAR_KT of the Fermi level it is taken
 * as it stands, with y = e^((E-R)/kT) e^((R-F)/kT) for a reference R of many
 * Fermi levels; farther off it is the series
 *
 *   sum_n (-1)^(n+1) n e^(-n|x|),
 *
 * whose sums over all points on one side go from one Fermi level to the next by
 * a factor. */

#define NEAR_KT 8.0

enum { TERMS = 5, V = 8 }; /* the first term left out is e^(-5 NEAR_KT) of the sum */

typedef double vector __attribute__((vector_size(V * sizeof(double)), aligned(8), may_alias));

/* sum c u b / (1 + u b)^2 over points[count]. */
FOR_EVERY_PROCESSOR
static double sum_near(const double *c, const double *u, size_t count, double b)
{
  vector sum = {0};
  size_t i = 0;
  for (; i + V <= count; i += V) {
    vector y = *(const vector *)(u + i) * b, g = 1.0 + y;
    sum += *(const vector *)(c + i) * y / (g * g);
  }
  double total = 0;
  for (; i < count; i++) {
    double y = u[i] * b, g = 1.0 + y;
    total += c[i] * y / (g * g);
  }
  for (int l = 0; l < V; l++) total += sum[l];
  return total;
}

/* The points beyond `reach` on one side (side 1: above) of ascending Fermi
 * levels, added to sum[count]; *edge[i] becomes the first point that is near
 * (of the upper side: the first that is not). */
static void add_far(const mho_thermal_grid *grid, const double *c, const double *fermi_ev,
                    size_t count, double kt, int side, double *sum, size_t *edge)
{
  double term[TERMS] = {0};
  size_t done = 0, points = grid->count;
  for (size_t k = 0; k < count; k++) {
    size_t at = side > 0 ? count - 1 - k : k;
    double fermi = fermi_ev[at];
    double moved = k ? exp(-fabs(fermi - fermi_ev[side > 0 ? at + 1 : at - 1]) / kt) : 1;
    double power = 1;
    for (int n = 0; n < TERMS; n++) term[n] *= power *= moved;
    for (; done < points; done++) {
      size_t i = side > 0 ? points - 1 - done : done;
      double x = side * (grid->energy_ev[i] - fermi) / kt;
      if (x <= NEAR_KT) break;
      double f = exp(-x);
      power = c[i];
      for (int n = 0; n < TERMS; n++) term[n] += power *= f;
    }
    edge[at] = side > 0 ? points - done : done;
    for (int n = 0; n < TERMS; n++) sum[at] += (n % 2 ? -1 : 1) * (n + 1) * term[n];
  }
}

static void add_near(const mho_thermal_grid *grid, const double *c, const double *fermi_ev,
                     size_t count, double kt, const size_t *from, const size_t *to, double *u,
                     double *sum)
{
  for (size_t first = 0, end; first < count; first = end) {
    double reference = fermi_ev[first];
    for (end = first + 1; end < count && fermi_ev[end] - reference <= NEAR_KT * kt;) end++;
    for (size_t i = from[first]; i < to[end - 1]; i++)
      u[i] = exp((grid->energy_ev[i] - reference) / kt);
    for (size_t k = first; k < end; k++)
      sum[k] += sum_near(c + from[k], u + from[k], to[k] - from[k],
                         exp((reference - fermi_ev[k]) / kt));
  }
}

/* log10 of the thermal average of T at ascending Fermi levels. */
static mho_status average(const mho_thermal_grid *grid, const double *fermi_ev, size_t count,
                          double kt, double *log10_g0)
{
  double *c = malloc((2 * grid->count + 1) * sizeof *c);
  size_t *edge = malloc(2 * count * sizeof *edge);
  mho_status status = c && edge ? MHO_OK : MHO_ERR_MEMORY;
  if (status == MHO_OK) {
    for (size_t i = 0; i < grid->count; i++) c[i] = grid->weight_ev[i] * grid->value[i];
    for (size_t k = 0; k < count; k++) log10_g0[k] = 0;
    add_far(grid, c, fermi_ev, count, kt, -1, log10_g0, edge);
    add_far(grid, c, fermi_ev, count, kt, 1, log10_g0, edge + count);
    add_near(grid, c, fermi_ev, count, kt, edge, edge + count, c + grid->count, log10_g0);
    for (size_t k = 0; k < count; k++)
      log10_g0[k] = log10_g0[k] > 0 ? log10(log10_g0[k] / kt) + grid->scale_log10 : -INFINITY;
  }
  free(c);
  free(edge);
  return status;
}

mho_status mho_thermal_log10(const mho_plan *plan, const mho_pole *pole, const double *fermi_ev,
                             size_t count, double kt_ev, double *log10_g0, mho_error *error)
{
  if (kt_ev < MHO_COLD_EV) {
    mho_point *point = malloc(count * sizeof *point);
    if (!point) return mho_fail(error, MHO_ERR_MEMORY, "analysis", NULL, "out of memory");
    mho_status status = mho_transmission_sweep(plan, count, fermi_ev, point, error);
    for (size_t i = 0; status == MHO_OK && i < count; i++)
      log10_g0[i] = point[i].node ? -INFINITY : point[i].log10_transmission;
    free(point);
    return status;
  }
  mho_thermal_grid grid;
  mho_status status = mho_thermal_grid_build(plan, pole, fermi_ev, count, kt_ev, &grid, error);
  if (status == MHO_OK && average(&grid, fermi_ev, count, kt_ev, log10_g0) != MHO_OK)
    status = mho_fail(error, MHO_ERR_MEMORY, "analysis", NULL, "out of memory");
  mho_thermal_grid_clear(&grid);
  return status;
}
