/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <mho/constants.h>
#include <mho/sensitivity.h>

#include <math.h>
#include <stdio.h>
#include <stdlib.h>

#include "analysis/perturb.h"
#include "analysis/samples.h"
#include "analysis/thermal.h"
#include "solver/gradient_sum.h"
#include "solver/plan.h"

#define LN_10 2.302585092994045684
#define RADIANS_PER_DEGREE 0.017453292519943295769

enum { DEFAULT_SAMPLES = 400, TRIALS = 48, SAMPLES_MIN = 16, SAMPLES_MAX = 1000000 };

/* The linear rule stands if what it leaves over is less than that share of it. */
#define LINEAR_TOLERANCE 0.4

/* Energies that carry less of the thermal average are left out. */
#define WEIGHT_FLOOR 1e-12

/* One sigma of a normal distribution to both sides. */
#define LOW_QUANTILE 0.1587
#define HIGH_QUANTILE 0.8413

mho_sensitivity_options mho_sensitivity_defaults(void)
{
  mho_sensitivity_options options = {.samples = DEFAULT_SAMPLES, .seed = 1};
#define DEFAULT_SIGMA(member, value, what) options.sigma.member = value;
  MHO_UNCERTAINTY_LIST(DEFAULT_SIGMA)
#undef DEFAULT_SIGMA
  return options;
}

void mho_sensitivity_clear(mho_sensitivity *result)
{
  free(result->row);
  *result = (mho_sensitivity){0};
}

/* dlnT/dp from the derivatives over H, Gamma and E. */
static double chain_rule(const mho_sensitivity_row *row, const mho_molecule *m,
                         const mho_gradient *g)
{
  double sum = 0;
  switch (row->kind) {
  case MHO_PARAMETER_FERMI: return g->energy;
  case MHO_PARAMETER_BETA:
    for (int i = 0; i < m->site_count; i++)
      if (!m->site[i].explicit_onsite)
        sum += mho_parameters_h(m->parameters, m->site[i].row) * g->onsite[i];
    for (int b = 0; b < m->bond_count; b++)
      if (!m->bond[b].explicit_hopping)
        sum += mho_molecule_hopping_ev(m, b) / m->beta_ev * g->hopping[b];
    return sum;
  case MHO_PARAMETER_COUPLING:
    for (int c = 0; c < g->left + g->right; c++) {
      int side = c < g->left ? MHO_LEFT : MHO_RIGHT;
      if (row->index == 2 || row->index == side)
        sum += m->contact[side].coupling_ev * g->coupling[c];
    }
    return sum;
  case MHO_PARAMETER_H: return m->beta_ev * g->onsite[row->index];
  case MHO_PARAMETER_ONSITE: return g->onsite[row->index];
  default: break;
  }
  mho_bond bond = m->bond[row->index];
  double cosine = mho_cos_deg(bond.twist_deg), slope = g->hopping[row->index];
  if (row->kind == MHO_PARAMETER_HOPPING) return cosine * slope;
  if (row->kind == MHO_PARAMETER_K) return bond.strength * m->beta_ev * cosine * slope;
  mho_molecule flat = *m; /* the hopping before its twist */
  flat.bond = &bond;
  bond.twist_deg = 0;
  double untwisted = mho_molecule_hopping_ev(&flat, 0);
  return -untwisted * sin(m->bond[row->index].twist_deg * RADIANS_PER_DEGREE) *
         RADIANS_PER_DEGREE * slope;
}

static mho_status create_gradient(const mho_plan *plan, const mho_molecule *m,
                                  mho_gradient **gradient, mho_error *error)
{
  int(*pair)[2] = malloc(((size_t)m->bond_count + 1) * sizeof *pair);
  if (!pair) return mho_fail(error, MHO_ERR_MEMORY, "analysis", NULL, "out of memory");
  for (int b = 0; b < m->bond_count; b++) {
    pair[b][0] = m->bond[b].site[0];
    pair[b][1] = m->bond[b].site[1];
  }
  mho_status status = mho_gradient_create(plan, (const int(*)[2])pair, (size_t)m->bond_count,
                                          gradient, error);
  free(pair);
  return status;
}

/* Energies that carry the thermal average, their T and share, in place. */
static size_t thermal_shares(mho_thermal_grid *grid, double fermi_ev, double kt)
{
  double total = 0, scale = pow(10, grid->scale_log10);
  for (size_t i = 0; i < grid->count; i++) {
    double f = exp(-fabs(grid->energy_ev[i] - fermi_ev) / kt);
    grid->weight_ev[i] *= grid->value[i] * f / ((1 + f) * (1 + f));
    total += grid->weight_ev[i];
  }
  size_t kept = 0;
  for (size_t i = 0; i < grid->count; i++) {
    if (!(grid->weight_ev[i] > WEIGHT_FLOOR * total)) continue;
    grid->energy_ev[kept] = grid->energy_ev[i];
    grid->value[kept] = grid->value[i] * scale;
    grid->weight_ev[kept++] = grid->weight_ev[i] / total;
  }
  return kept;
}

static void set_rows(const mho_molecule *m, const mho_gradient *g, mho_sensitivity *result)
{
  for (size_t p = 0; p < result->count; p++)
    result->row[p].derivative_log10_g0 = chain_rule(&result->row[p], m, g) / LN_10;
}

/* At 0 K the Fermi level alone. */
static mho_status differentiate_cold(const mho_plan *plan, double fermi_ev, mho_gradient *g,
                                     bool *any, mho_error *error)
{
  mho_point point;
  double one = 1;
  mho_status status = mho_transmission_sweep(plan, 1, &fermi_ev, &point, error);
  *any = status == MHO_OK && !point.node;
  if (!*any) return status;
  return mho_gradient_sum(plan, 1, &fermi_ev, &point.transmission, &one, g, error);
}

static mho_status differentiate(const mho_plan *plan, const mho_pole *pole,
                                const mho_molecule *m, double fermi_ev, mho_sensitivity *result,
                                mho_error *error)
{
  double kt = MHO_BOLTZMANN_EV_PER_K * m->temperature_k;
  mho_gradient *g;
  mho_thermal_grid grid = {0};
  mho_status status = create_gradient(plan, m, &g, error);
  if (status != MHO_OK) return status;
  if (kt < MHO_COLD_EV) {
    status = differentiate_cold(plan, fermi_ev, g, &result->has_derivatives, error);
  } else {
    status = mho_thermal_grid_build(plan, pole, &fermi_ev, 1, kt, &grid, error);
    size_t count = status == MHO_OK ? thermal_shares(&grid, fermi_ev, kt) : 0;
    result->has_derivatives = count > 0;
    if (status == MHO_OK)
      status = mho_gradient_sum(plan, count, grid.energy_ev, grid.value, grid.weight_ev, g, error);
  }
  if (status == MHO_OK && result->has_derivatives) set_rows(m, g, result);
  mho_thermal_grid_clear(&grid);
  mho_gradient_free(g);
  return status;
}

static int compare_doubles(const void *a, const void *b)
{
  double x = *(const double *)a, y = *(const double *)b;
  return (x > y) - (x < y);
}

/* Root mean square of what the linear rule leaves over, about its mean. */
static double left_over(const double *value, const double *linear, size_t count)
{
  double mean = 0, square = 0;
  for (size_t i = 0; i < count; i++) mean += (value[i] - linear[i]) / (double)count;
  for (size_t i = 0; i < count; i++) {
    double rest = value[i] - linear[i] - mean;
    square += rest * rest / (double)count;
  }
  return sqrt(square); /* NaN where a sample is zero */
}

static void set_range(double *value, size_t samples, mho_sensitivity *result)
{
  qsort(value, samples, sizeof *value, compare_doubles);
  double low = value[(size_t)(LOW_QUANTILE * (double)(samples - 1))];
  double high = value[(size_t)(HIGH_QUANTILE * (double)(samples - 1))];
  result->rule = MHO_RULE_MONTE_CARLO;
  result->has_error = isfinite(low) && isfinite(high);
  result->error_decades = result->has_error ? 0.5 * (high - low) : 0;
}

/* Largest first; what symmetry makes equal stays in the molecule's order. */
static int compare_rows(const void *a, const void *b)
{
  const mho_sensitivity_row *p = a, *q = b;
  double x = rint(1e9 * p->contribution_decades), y = rint(1e9 * q->contribution_decades);
  if (x != y) return x > y ? -1 : 1;
  return p->kind != q->kind ? (int)p->kind - (int)q->kind : p->index - q->index;
}

/* A few samples tell whether the linear rule holds; if not, the rest follows. */
static mho_status estimate_error(const mho_molecule *m, const mho_plan *plan, double fermi_ev,
                                 const mho_sensitivity_options *options,
                                 mho_sensitivity *result, mho_error *error)
{
  double variance = 0;
  for (size_t p = 0; p < result->count; p++) {
    mho_sensitivity_row *row = &result->row[p];
    row->contribution_decades = fabs(row->derivative_log10_g0) * row->sigma;
    variance += row->contribution_decades * row->contribution_decades;
  }
  result->linear_decades = result->error_decades = sqrt(variance);
  result->has_error = true;
  size_t samples = (size_t)options->samples, few = samples < TRIALS ? samples : TRIALS;
  double *value = malloc(2 * samples * sizeof *value);
  if (!value) return mho_fail(error, MHO_ERR_MEMORY, "analysis", NULL, "out of memory");
  double *linear = value + samples;
  mho_status status = mho_samples_draw(m, plan, fermi_ev, result->row, result->count,
                                       options->seed, 0, few, value, linear, error);
  bool holds = result->has_derivatives &&
               left_over(value, linear, few) <= LINEAR_TOLERANCE * result->linear_decades;
  if (status == MHO_OK && !holds)
    status = mho_samples_draw(m, plan, fermi_ev, result->row, result->count, options->seed, few,
                              samples, value, linear, error);
  if (status == MHO_OK && !holds) set_range(value, samples, result);
  free(value);
  return status;
}

static bool is_sigma(double value) { return isfinite(value) && value >= 0; }

static mho_status check_options(const mho_sensitivity_options *options, mho_error *error)
{
  bool good = true;
#define CHECK_SIGMA(member, value, what) good = good && is_sigma(options->sigma.member);
  MHO_UNCERTAINTY_LIST(CHECK_SIGMA)
#undef CHECK_SIGMA
  if (!good)
    return mho_fail(error, MHO_ERR_RANGE, "analysis", "sigma",
                    "an uncertainty must be finite and not negative");
  if (options->samples < SAMPLES_MIN || options->samples > SAMPLES_MAX)
    return mho_fail(error, MHO_ERR_RANGE, "analysis", "samples", "samples must be %d to %d",
                    SAMPLES_MIN, SAMPLES_MAX);
  return MHO_OK;
}

mho_status mho_sensitivity_with_poles(const mho_molecule *molecule, const mho_plan *plan,
                                      const mho_pole *pole, double fermi_ev,
                                      const mho_sensitivity_options *options,
                                      mho_sensitivity *result, mho_error *error)
{
  *result = (mho_sensitivity){0};
  mho_sensitivity_options defaults = mho_sensitivity_defaults();
  if (!options) options = &defaults;
  mho_status status = check_options(options, error);
  if (status == MHO_OK) status = mho_plan_require_wide_band(plan, "sensitivities", error);
  if (status == MHO_OK)
    status = mho_parameter_list(molecule, &options->sigma, &result->row, &result->count, error);
  if (status == MHO_OK) status = differentiate(plan, pole, molecule, fermi_ev, result, error);
  if (status == MHO_OK) status = estimate_error(molecule, plan, fermi_ev, options, result, error);
  if (status == MHO_OK) qsort(result->row, result->count, sizeof *result->row, compare_rows);
  return status;
}

mho_status mho_sensitivity_compute(const mho_molecule *molecule, const mho_junction *junction,
                                   const mho_sensitivity_options *options,
                                   mho_sensitivity *result, mho_error *error)
{
  *result = (mho_sensitivity){0};
  mho_plan *plan = NULL;
  mho_status status = mho_plan_create(junction, &plan, error);
  if (status == MHO_OK)
    status = mho_sensitivity_with_poles(molecule, plan, NULL, junction->fermi_ev, options, result,
                                        error);
  mho_plan_free(plan);
  return status;
}

const char *mho_sensitivity_name(const mho_sensitivity_row *row, const mho_molecule *molecule,
                                 char *buffer, size_t size)
{
  static const char *const side[] = {"left", "right", "of both contacts"};
  static const char *const word[] = {
      [MHO_PARAMETER_H] = "h",           [MHO_PARAMETER_ONSITE] = "onsite_eV",
      [MHO_PARAMETER_K] = "k",           [MHO_PARAMETER_HOPPING] = "hopping_eV",
      [MHO_PARAMETER_TWIST] = "twist_deg"};
  switch (row->kind) {
  case MHO_PARAMETER_FERMI: snprintf(buffer, size, "fermi_eV"); break;
  case MHO_PARAMETER_BETA: snprintf(buffer, size, "beta_eV"); break;
  case MHO_PARAMETER_COUPLING: snprintf(buffer, size, "ln coupling %s", side[row->index]); break;
  case MHO_PARAMETER_H:
  case MHO_PARAMETER_ONSITE:
    snprintf(buffer, size, "%s of %s", word[row->kind], molecule->site[row->index].id);
    break;
  default: {
    const int *site = molecule->bond[row->index].site;
    snprintf(buffer, size, "%s of %s-%s", word[row->kind], molecule->site[site[0]].id,
             molecule->site[site[1]].id);
  }
  }
  return buffer;
}
