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
 * off the axis, at rho > 3.4.
 */
#include "analysis/thermal.h"

#include <math.h>
#include <stdlib.h>

#include <gsl/gsl_errno.h>
#include <gsl/gsl_integration.h>

enum { GAUSS_POINTS = MHO_THERMAL_POINTS, HALVINGS_MAX = 60 };

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
  const gsl_integration_glfixed_table *rule;
  mho_thermal_grid *grid;
  size_t capacity;
} builder;

static bool is_smooth(const builder *b, double low, double high)
{
  for (size_t k = 0; k < b->poles; k++) {
    double width = b->pole[k].width_ev;
    if (width < b->smallest_width) continue;
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
  if (halvings < HALVINGS_MAX && !is_smooth(b, low, high)) {
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

/* Panels over the union of [center - reach, center + reach]. */
static mho_status add_intervals(builder *b, const double *center, size_t centers,
                                double kt)
{
  size_t i = 0;
  while (i < centers) {
    double low = center[i] - REACH_KT * kt, high = center[i] + REACH_KT * kt;
    while (++i < centers && center[i] - REACH_KT * kt <= high)
      high = center[i] + REACH_KT * kt;
    size_t panels = (size_t)ceil((high - low) / (PANEL_KT * kt));
    double width = (high - low) / (double)panels;
    for (size_t p = 0; p < panels; p++) {
      mho_status status = add_panel(b, low + (double)p * width,
                                    low + (double)(p + 1) * width, 0);
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

mho_status mho_thermal_grid_build(const mho_plan *plan, const double *center_ev,
                                  size_t centers, double kt_ev,
                                  mho_thermal_grid *grid, mho_error *error)
{
  *grid = (mho_thermal_grid){0};
  size_t n = (size_t)mho_plan_sites(plan);
  mho_pole *pole = malloc(n * sizeof *pole);
  gsl_set_error_handler_off(); /* its default aborts the program */
  gsl_integration_glfixed_table *rule = gsl_integration_glfixed_table_alloc(GAUSS_POINTS);
  mho_status status = MHO_ERR_MEMORY;
  if (pole && rule) status = mho_poles(plan, pole, error);
  if (status == MHO_OK) {
    double scale = fmax(fabs(pole[0].energy_ev), fabs(pole[n - 1].energy_ev));
    builder b = {pole, n, WIDTH_RELATIVE * scale, rule, grid, 0};
    status = add_intervals(&b, center_ev, centers, kt_ev);
  }
  if (status == MHO_OK) status = evaluate(plan, grid, error);
  free(pole);
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

double mho_thermal_average_log10(const mho_thermal_grid *grid, double fermi_ev,
                                 double kt_ev)
{
  double sum = 0;
  for (size_t i = 0; i < grid->count; i++) {
    double x = (grid->energy_ev[i] - fermi_ev) / kt_ev;
    if (fabs(x) > REACH_KT) continue;
    double f = exp(-fabs(x)), g = 1.0 + f; /* -df/dE = f / (kT (1+f)^2) */
    sum += grid->weight_ev[i] * grid->value[i] * f / (g * g);
  }
  return sum > 0 ? log10(sum / kt_ev) + grid->scale_log10 : -INFINITY;
}

mho_status mho_thermal_log10(const mho_plan *plan, const double *fermi_ev, size_t count,
                               double kt_ev, double *log10_g0, mho_error *error)
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
  mho_status status = mho_thermal_grid_build(plan, fermi_ev, count, kt_ev, &grid, error);
  for (size_t i = 0; status == MHO_OK && i < count; i++)
    log10_g0[i] = mho_thermal_average_log10(&grid, fermi_ev[i], kt_ev);
  mho_thermal_grid_clear(&grid);
  return status;
}
