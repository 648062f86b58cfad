/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Resonances of chains as electrodes, for grids and quadratures.
 *
 * Poles of E - H - Sigma(E) with Sigma frozen in the middle of each of CELLS cells
 * that are equal in q, E = centre + half cos q.  A state with the part w on a
 * contact site has the width w 2 V^2/|t| sin q, and freezing displaces it by at
 * most w V^2/(2 t^2) times the distance |2 t sin q| dq/2 from the middle of the
 * cell: the part dq/4 of its width, or 0.012, also next to an edge.
 */
#include <math.h>
#include <stdlib.h>

#include "solver/plan.h"

enum { CELLS = 64 };

#define PI 3.14159265358979323846

/* A resonance that far away is seen yet. */
#define REACH_EV 0.5

typedef struct {
  mho_pole *pole;
  size_t count, capacity;
} collection;

static mho_status keep(collection *c, const mho_pole *pole)
{
  if (c->count == c->capacity) {
    size_t capacity = 2 * c->capacity + 64;
    mho_pole *larger = realloc(c->pole, capacity * sizeof *larger);
    if (!larger) return MHO_ERR_MEMORY;
    c->pole = larger;
    c->capacity = capacity;
  }
  c->pole[c->count++] = *pole;
  return MHO_OK;
}

static int compare(const void *a, const void *b)
{
  const mho_pole *p = a, *q = b;
  return (p->energy_ev > q->energy_ev) - (p->energy_ev < q->energy_ev);
}

static mho_status search_cell(const mho_plan *plan, double middle, double low, double high,
                              mho_frozen *frozen, mho_pole *all, collection *found,
                              mho_error *error)
{
  if (!mho_frozen_set(plan, middle, frozen)) return MHO_OK;
  mho_status status = mho_poles(&frozen->plan, all, error);
  for (int k = 0; status == MHO_OK && k < plan->sites; k++)
    if (all[k].energy_ev >= low && all[k].energy_ev <= high && keep(found, &all[k]) != MHO_OK)
      status = mho_fail(error, MHO_ERR_MEMORY, "solver", NULL, "out of memory");
  return status;
}

/* A pole near a border of cells may lie a little beyond it for both: each cell
 * reaches a quarter of itself into the next. */
static mho_status search_cells(const mho_plan *plan, double low_ev, double high_ev, mho_pole *all,
                               collection *found, mho_error *error)
{
  double low, high;
  mho_plan_band(plan, &low, &high);
  double center = 0.5 * (low + high), half = 0.5 * (high - low);
  mho_frozen frozen;
  if (!(low < high)) return MHO_OK;
  if (mho_frozen_create(plan, &frozen) != MHO_OK)
    return mho_fail(error, MHO_ERR_MEMORY, "solver", NULL, "out of memory");
  mho_status status = MHO_OK;
  for (int c = 0; status == MHO_OK && c < CELLS; c++) {
    double from = c > 0 ? center - half * cos(PI * (c - 0.25) / CELLS) : low;
    double to = c + 1 < CELLS ? center - half * cos(PI * (c + 1.25) / CELLS) : high;
    double middle = center - half * cos(PI * (c + 0.5) / CELLS);
    if (to >= low_ev - REACH_EV && from <= high_ev + REACH_EV)
      status = search_cell(plan, middle, from, to, &frozen, all, found, error);
  }
  mho_frozen_clear(&frozen);
  return status;
}

mho_status mho_plan_resonances(const mho_plan *plan, double low_ev, double high_ev, mho_pole **pole,
                               size_t *count, mho_error *error)
{
  size_t n = (size_t)plan->sites;
  mho_pole *all = malloc(n * sizeof *all);
  *pole = NULL;
  *count = 0;
  if (!all) return mho_fail(error, MHO_ERR_MEMORY, "solver", NULL, "out of memory");
  if (!mho_plan_has_chain(plan)) {
    *pole = all;
    *count = n;
    return mho_poles(plan, all, error);
  }
  collection found = {0};
  mho_status status = search_cells(plan, low_ev, high_ev, all, &found, error);
  if (found.count) qsort(found.pole, found.count, sizeof *found.pole, compare);
  free(all);
  *pole = found.pole;
  *count = found.count;
  return status;
}
