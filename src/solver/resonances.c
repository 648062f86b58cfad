/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Resonances of chains as electrodes, for grids and quadratures.
 *
 * Poles of E - H - Sigma(E) with Sigma frozen at the centre of each of CELLS equal
 * cells of the band.  A state with the part w on a contact site has the width
 * w 2 V^2/|t| s, s = sqrt(1 - x^2), and freezing displaces it by at most
 * w V^2/(2 t^2) times the distance d from the centre of the cell: the part
 * d/(4 |t| s) of its width, a hundredth at most of it save next to an edge.
 */
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "solver/plan.h"

enum { CELLS = 64 };

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

/* A pole near a border of cells may lie a little beyond it for both: each cell
 * reaches a quarter of itself into the next. */
static mho_status search_cell(const mho_plan *plan, double center, double half, mho_frozen *frozen,
                              mho_pole *all, collection *found, mho_error *error)
{
  if (!mho_frozen_set(plan, center, frozen)) return MHO_OK;
  mho_status status = mho_poles(&frozen->plan, all, error);
  for (int k = 0; status == MHO_OK && k < plan->sites; k++)
    if (fabs(all[k].energy_ev - center) <= 1.5 * half && keep(found, &all[k]) != MHO_OK)
      status = mho_fail(error, MHO_ERR_MEMORY, "solver", NULL, "out of memory");
  return status;
}

static mho_status search_cells(const mho_plan *plan, double low_ev, double high_ev, mho_pole *all,
                               collection *found, mho_error *error)
{
  double low, high;
  mho_plan_band(plan, &low, &high);
  double width = (high - low) / CELLS;
  mho_frozen frozen;
  if (!(low < high)) return MHO_OK;
  if (mho_frozen_create(plan, &frozen) != MHO_OK)
    return mho_fail(error, MHO_ERR_MEMORY, "solver", NULL, "out of memory");
  mho_status status = MHO_OK;
  for (int c = 0; status == MHO_OK && c < CELLS; c++) {
    double center = low + (c + 0.5) * width;
    if (center + width < low_ev || center - width > high_ev) continue;
    status = search_cell(plan, center, 0.5 * width, &frozen, all, found, error);
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
