/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Energies for a plot: even, and dense around poles and nodes.
 */
#include <math.h>
#include <stdlib.h>

#include "solver/grid.h"
#include "solver/zeros.h"

/* Distances, in widths, that draw a Lorentzian well. */
static const double offset[] = {0,   0.05, 0.1, 0.15, 0.2, 0.3, 0.4, 0.5, 0.65,
                                0.8, 1,    1.5, 2,    3,   5,   8,   13,  21,
                                40,  80,   160, 320,  640, 1280};
enum { OFFSETS = sizeof offset / sizeof *offset };

/* T rises as the root of the distance from the edge of a band. */
#define EDGE_WIDTH_EV 0.01

/* Molecules above this many sites are plotted without the nodes that are hard to
 * tell apart, or without minima, which would take longer than the plot. */
enum { PATIENT_SITES = 60, MINIMA_SITES = 200 };

static int compare_doubles(const void *a, const void *b)
{
  double x = *(const double *)a, y = *(const double *)b;
  return (x > y) - (x < y);
}

mho_status mho_feature_grid(const mho_feature *feature, size_t features, double low_ev,
                            double high_ev, int even, double **energy_ev, size_t *count,
                            mho_error *error)
{
  double *grid = malloc(((size_t)even + features * 2 * OFFSETS) * sizeof *grid);
  *energy_ev = grid;
  if (!grid) return mho_fail(error, MHO_ERR_MEMORY, "solver", NULL, "out of memory");
  double step = (high_ev - low_ev) / (even - 1);
  size_t filled = 0;
  for (int i = 0; i < even; i++)
    grid[filled++] = i == even - 1 ? high_ev : low_ev + i * step;
  for (size_t k = 0; k < features; k++)
    for (int o = 0; o < OFFSETS; o++)
      for (int side = -1; side <= 1; side += 2) {
        double distance = offset[o] * feature[k].width_ev;
        double energy = feature[k].energy_ev + side * distance;
        bool useful = distance < 2 * step && energy > low_ev && energy < high_ev;
        if (useful && !(o == 0 && side > 0)) grid[filled++] = energy;
      }
  qsort(grid, filled, sizeof *grid, compare_doubles);
  *count = 1;
  for (size_t i = 1; i < filled; i++)
    if (grid[i] > grid[*count - 1]) grid[(*count)++] = grid[i];
  return MHO_OK;
}

mho_status mho_pole_features(const mho_plan *plan, double low_ev, double high_ev, size_t room,
                             mho_feature **feature, size_t *count, mho_error *error)
{
  enum { EDGES = 2 };
  mho_pole *pole;
  double edge[EDGES];
  mho_status status = mho_plan_resonances(plan, low_ev, high_ev, &pole, count, error);
  *feature = malloc((*count + EDGES + room) * sizeof **feature);
  if (status == MHO_OK && !*feature)
    status = mho_fail(error, MHO_ERR_MEMORY, "solver", NULL, "out of memory");
  for (size_t k = 0; status == MHO_OK && k < *count; k++)
    (*feature)[k] = (mho_feature){pole[k].energy_ev, pole[k].width_ev};
  mho_plan_band(plan, &edge[0], &edge[1]);
  for (int k = 0; status == MHO_OK && edge[0] < edge[1] && k < EDGES; k++)
    if (isfinite(edge[k])) (*feature)[(*count)++] = (mho_feature){edge[k], EDGE_WIDTH_EV};
  free(pole);
  return status;
}

/* An exact node is as wide as the even grid sees it. */
static void add_nodes(const mho_nodes *nodes, double step, mho_feature *feature)
{
  for (size_t k = 0; k < nodes->count; k++) {
    const mho_node *node = &nodes->node[k];
    double width = node->kind == MHO_NODE_DIP ? 2 * node->imaginary_ev : step;
    feature[k] = (mho_feature){node->energy_ev, width};
  }
}

mho_status mho_energy_grid(const mho_plan *plan, double low_ev, double high_ev, int even,
                           double **energy_ev, size_t *count, mho_error *error)
{
  *energy_ev = NULL;
  if (!(low_ev < high_ev) || even < 2)
    return mho_fail(error, MHO_ERR_RANGE, "solver", "energies",
                    "the lower energy must be below the upper one");
  mho_nodes nodes = {0};
  mho_feature *feature = NULL;
  size_t features = 0;
  mho_status status = MHO_OK;
  bool single = plan->left == 1 && plan->right == 1;
  if (single || plan->sites <= MINIMA_SITES) {
    status = mho_nodes_search(plan, plan->sites <= PATIENT_SITES, &nodes, error);
    if (status == MHO_ERR_NOT_CONVERGED) { /* a plot can do without */
      status = MHO_OK;
      if (error) mho_error_init(error);
    }
  }
  if (status == MHO_OK)
    status = mho_pole_features(plan, low_ev, high_ev, nodes.count, &feature, &features, error);
  if (status == MHO_OK) {
    add_nodes(&nodes, (high_ev - low_ev) / (even - 1), feature + features);
    status = mho_feature_grid(feature, features + nodes.count, low_ev, high_ev, even, energy_ev,
                              count, error);
  }
  mho_nodes_clear(&nodes);
  free(feature);
  return status;
}
