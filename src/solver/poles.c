/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Poles: eigenvalues of H + Sigma, complex symmetric, as zeros of the secular
 * polynomial or by the general eigensolver.  A state that no contact sees has width 0; so has one
 * whose amplitude on the contacts is rounding.
 */
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/lapack.h"
#include "solver/plan.h"
#include "solver/poles_secular.h"

/* An amplitude on a contact below this is rounding. */
#define MIXING_MIN 1e-13

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
    matrix[i * n + j] += plan->entry[e].value_ev;
    if (i != j) matrix[j * n + i] += plan->entry[e].value_ev;
  }
  for (int c = 0; c < plan->channels; c++) {
    const double *v = plan->vector + (size_t)c * n;
    double complex sigma = plan->shift_ev[c] - 0.5 * I * plan->coupling_ev[c];
    for (size_t i = 0; i < n; i++)
      for (size_t j = 0; v[i] != 0.0 && j < n; j++)
        matrix[i * n + j] += sigma * v[i] * v[j];
  }
}

/* The width of state x is what each contact takes of it,
 *   -2 Im E = sum_c Gamma_c |v_c.x|^2 / |x|^2,
 * to more digits than the eigenvalue has; taken[side] is that sum.  Below what
 * rounding mixes in, it is 0. */
static void set_widths(const mho_plan *plan, const double taken[2], mho_pole *pole)
{
  double total = 0, width[2];
  for (int c = 0; c < plan->channels; c++) total += plan->coupling_ev[c];
  double mixed = fmax(MIXING_MIN, 4.0 * (double)plan->sites * DBL_EPSILON * plan->norm_ev / total);
  for (int side = 0; side < 2; side++)
    width[side] = taken[side] > total * mixed * mixed ? taken[side] : 0;
  pole->left_width_ev = width[MHO_LEFT];
  pole->right_width_ev = width[MHO_RIGHT];
  pole->width_ev = width[MHO_LEFT] + width[MHO_RIGHT];
}

static void set_widths_of_state(const mho_plan *plan, const double complex *x, mho_pole *pole)
{
  size_t n = (size_t)plan->sites;
  double norm = 0, taken[2] = {0, 0};
  for (size_t i = 0; i < n; i++) norm += creal(x[i] * conj(x[i]));
  for (int c = 0; c < plan->channels; c++) {
    double complex overlap = 0;
    for (size_t k = plan->support_start[c]; k < plan->support_start[c + 1]; k++)
      overlap += plan->vector[(size_t)c * n + (size_t)plan->support[k]] * x[plan->support[k]];
    taken[c < plan->left ? MHO_LEFT : MHO_RIGHT] +=
        plan->coupling_ev[c] * creal(overlap * conj(overlap)) / norm;
  }
  set_widths(plan, taken, pole);
}

/* One channel a contact; *good as in poles_secular.h. */
static mho_status find_secular(const mho_plan *plan, mho_pole *pole, bool *good)
{
  size_t n = (size_t)plan->sites;
  double complex *value = malloc(3 * n * sizeof *value);
  if (!value) return MHO_ERR_MEMORY;
  double complex(*overlap)[2] = (double complex(*)[2])(value + n);
  mho_status status = mho_poles_secular(plan, value, overlap, good);
  for (size_t k = 0; status == MHO_OK && *good && k < n; k++) {
    double taken[2];
    for (int c = 0; c < 2; c++)
      taken[c] = plan->coupling_ev[c] * creal(overlap[k][c] * conj(overlap[k][c]));
    pole[k].energy_ev = creal(value[k]);
    set_widths(plan, taken, &pole[k]);
  }
  free(value);
  return status;
}

mho_status mho_poles(const mho_plan *plan, mho_pole *pole, mho_error *error)
{
  mho_status status = mho_plan_require_wide_band(plan, "poles", error);
  if (status != MHO_OK) return status;
  if (plan->sites > MHO_SITE_LIMIT)
    return mho_fail(error, MHO_ERR_LIMIT, "solver", "poles",
                    "poles need a full matrix; allowed are %d sites", MHO_SITE_LIMIT);
  size_t n = (size_t)plan->sites;
  bool good;
  status = find_secular(plan, pole, &good);
  if (status != MHO_OK) return mho_fail(error, status, "solver", NULL, "out of memory");
  if (good) {
    qsort(pole, n, sizeof *pole, compare_poles);
    return MHO_OK;
  }
  double complex *matrix = calloc(2 * n * n, sizeof *matrix), *vector = matrix + n * n;
  double complex *value = malloc(n * sizeof *value);
  if (!matrix || !value)
    status = mho_fail(error, MHO_ERR_MEMORY, "solver", NULL, "out of memory");
  if (status == MHO_OK) {
    effective_hamiltonian(plan, matrix);
    status = mho_eigen_complex(plan->sites, matrix, value, vector, error);
  }
  for (size_t k = 0; status == MHO_OK && k < n; k++) {
    pole[k].energy_ev = creal(value[k]);
    set_widths_of_state(plan, vector + k * n, &pole[k]);
  }
  if (status == MHO_OK) qsort(pole, n, sizeof *pole, compare_poles);
  free(matrix);
  free(value);
  return status;
}
