/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "solver/minima.h"

#include <math.h>
#include <stdlib.h>

#include "solver/grid.h"

enum { EVEN_POINTS = 2001, SECTIONS = 60 };

/* Beyond the outermost poles T only falls. */
#define MARGIN_EV 1e-3

static mho_status log_transmission(const mho_plan *plan, double energy_ev, double *value,
                                   mho_error *error)
{
  mho_point point;
  mho_status status = mho_transmission_sweep(plan, 1, &energy_ev, &point, error);
  if (status == MHO_OK) *value = point.node ? -INFINITY : point.log10_transmission;
  return status;
}

/* Golden section between two energies that hold a minimum. */
static mho_status refine(const mho_plan *plan, double low, double high, double *energy_ev,
                         mho_error *error)
{
  const double ratio = 0.6180339887498949;
  double a = high - ratio * (high - low), b = low + ratio * (high - low), at_a, at_b;
  mho_status status = log_transmission(plan, a, &at_a, error);
  if (status == MHO_OK) status = log_transmission(plan, b, &at_b, error);
  for (int k = 0; status == MHO_OK && k < SECTIONS && a < b; k++) {
    if (at_a < at_b) {
      high = b;
      b = a;
      at_b = at_a;
      a = high - ratio * (high - low);
      status = log_transmission(plan, a, &at_a, error);
    } else {
      low = a;
      a = b;
      at_a = at_b;
      b = low + ratio * (high - low);
      status = log_transmission(plan, b, &at_b, error);
    }
  }
  *energy_ev = 0.5 * (low + high);
  return status;
}

static mho_status search(const mho_plan *plan, const double *grid, const mho_point *point,
                         size_t count, mho_nodes *result, mho_error *error)
{
  mho_status status = MHO_OK;
  for (size_t i = 1; status == MHO_OK && i + 1 < count; i++) {
    double before = point[i - 1].node ? -INFINITY : point[i - 1].log10_transmission;
    double here = point[i].node ? -INFINITY : point[i].log10_transmission;
    double after = point[i + 1].node ? -INFINITY : point[i + 1].log10_transmission;
    if (!(here < before && here <= after)) continue;
    mho_node *node = &result->node[result->count++];
    *node = (mho_node){.kind = MHO_NODE_MINIMUM, .energy_ev = grid[i]};
    if (!point[i].node) status = refine(plan, grid[i - 1], grid[i + 1], &node->energy_ev, error);
  }
  return status;
}

mho_status mho_minima_find(const mho_plan *plan, mho_nodes *result, mho_error *error)
{
  size_t features, count = 0;
  double *grid = NULL, band[2];
  mho_point *point = NULL;
  mho_feature *feature;
  mho_plan_band(plan, &band[0], &band[1]);
  mho_status status = mho_pole_features(plan, -INFINITY, INFINITY, 0, &feature, &features, error);
  if (status == MHO_OK && features == 0) { /* no energy is in both bands */
    free(feature);
    result->everywhere = true;
    return MHO_OK;
  }
  if (status == MHO_OK) {
    double low = INFINITY, high = -INFINITY;
    for (size_t k = 0; k < features; k++) {
      low = fmin(low, feature[k].energy_ev - MARGIN_EV);
      high = fmax(high, feature[k].energy_ev + MARGIN_EV);
    }
    status = mho_feature_grid(feature, features, fmax(low, band[0]), fmin(high, band[1]),
                              EVEN_POINTS, &grid, &count, error);
  }
  if (status == MHO_OK) {
    point = malloc(count * sizeof *point);
    result->node = malloc(count * sizeof *result->node);
    if (!point || !result->node)
      status = mho_fail(error, MHO_ERR_MEMORY, "solver", NULL, "out of memory");
  }
  if (status == MHO_OK) status = mho_transmission_sweep(plan, count, grid, point, error);
  if (status == MHO_OK) status = search(plan, grid, point, count, result, error);
  free(feature);
  free(grid);
  free(point);
  return status;
}
