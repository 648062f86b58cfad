/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Poles: eigenvalues of H + Sigma, complex symmetric, so that the general
 * eigensolver is used.  A state that no contact sees has width 0; so has one
 * whose width is below the rounding of that solver.
 */
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/lapack.h"
#include "solver/plan.h"

static int compare_poles(const void *a, const void *b)
{
  const mho_pole *p = a, *q = b;
  if (p->energy_ev != q->energy_ev) return p->energy_ev < q->energy_ev ? -1 : 1;
  return (p->width_ev > q->width_ev) - (p->width_ev < q->width_ev);
}

static void effective_hamiltonian(const mho_plan *plan, double complex *matrix)
{
  size_t n = (size_t)plan->sites;
  for (size_t e = 0; e < plan->entries; e++) {
    size_t i = (size_t)plan->entry[e].i, j = (size_t)plan->entry[e].j;
    matrix[i * n + j] = matrix[j * n + i] = plan->entry[e].value_ev;
  }
  for (int c = 0; c < plan->channels; c++) {
    const double *v = plan->vector + (size_t)c * n;
    double complex sigma = plan->shift_ev[c] - 0.5 * I * plan->coupling_ev[c];
    for (size_t i = 0; i < n; i++)
      for (size_t j = 0; v[i] != 0.0 && j < n; j++)
        matrix[i * n + j] += sigma * v[i] * v[j];
  }
}

mho_status mho_poles(const mho_plan *plan, mho_pole *pole, mho_error *error)
{
  size_t n = (size_t)plan->sites;
  double complex *matrix = calloc(n * n, sizeof *matrix);
  double complex *value = malloc(n * sizeof *value);
  mho_status status = MHO_OK;
  if (!matrix || !value)
    status = mho_fail(error, MHO_ERR_MEMORY, "solver", NULL, "out of memory");
  if (status == MHO_OK) {
    effective_hamiltonian(plan, matrix);
    status = mho_eigenvalues_complex(plan->sites, matrix, value, error);
  }
  double rounding = 4.0 * (double)n * DBL_EPSILON * plan->norm_ev;
  for (size_t k = 0; status == MHO_OK && k < n; k++) {
    double width = -2.0 * cimag(value[k]);
    pole[k] = (mho_pole){creal(value[k]), width > rounding ? width : 0.0};
  }
  if (status == MHO_OK) qsort(pole, n, sizeof *pole, compare_poles);
  free(matrix);
  free(value);
  return status;
}

/* Distances from a pole, in its widths, that draw a Lorentzian well. */
static const double pole_offset[] = {0,   0.05, 0.1, 0.15, 0.2, 0.3, 0.4, 0.5, 0.65,
                                     0.8, 1,    1.5, 2,    3,   5,   8,   13,  21,
                                     40,  80,   160, 320,  640, 1280};
enum { POLE_OFFSETS = sizeof pole_offset / sizeof *pole_offset };

static int compare_doubles(const void *a, const void *b)
{
  double x = *(const double *)a, y = *(const double *)b;
  return (x > y) - (x < y);
}

mho_status mho_energy_grid(const mho_plan *plan, double low_ev, double high_ev,
                           int even, double **energy_ev, size_t *count,
                           mho_error *error)
{
  *energy_ev = NULL;
  if (!(low_ev < high_ev) || even < 2)
    return mho_fail(error, MHO_ERR_RANGE, "solver", "energies",
                    "the lower energy must be below the upper one");
  size_t n = (size_t)plan->sites;
  mho_pole *pole = malloc(n * sizeof *pole);
  double *grid = malloc(((size_t)even + n * 2 * POLE_OFFSETS) * sizeof *grid);
  mho_status status = MHO_OK;
  if (!pole || !grid)
    status = mho_fail(error, MHO_ERR_MEMORY, "solver", NULL, "out of memory");
  if (status == MHO_OK) status = mho_poles(plan, pole, error);
  if (status != MHO_OK) {
    free(pole);
    free(grid);
    return status;
  }
  double step = (high_ev - low_ev) / (even - 1);
  size_t filled = 0;
  for (int i = 0; i < even; i++)
    grid[filled++] = i == even - 1 ? high_ev : low_ev + i * step;
  for (size_t k = 0; k < n; k++)
    for (int o = 0; o < POLE_OFFSETS; o++) {
      double offset = pole_offset[o] * pole[k].width_ev;
      for (int side = -1; side <= 1; side += 2) {
        double energy = pole[k].energy_ev + side * offset;
        bool useful = offset < 2 * step && energy > low_ev && energy < high_ev;
        if (useful && !(o == 0 && side > 0)) grid[filled++] = energy;
      }
    }
  qsort(grid, filled, sizeof *grid, compare_doubles);
  size_t kept = 1;
  for (size_t i = 1; i < filled; i++)
    if (grid[i] > grid[kept - 1]) grid[kept++] = grid[i];
  free(pole);
  *energy_ev = grid;
  *count = kept;
  return MHO_OK;
}
