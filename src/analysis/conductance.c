/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <mho/conductance.h>
#include <mho/constants.h>
#include <mho/warning.h>

#include <math.h>
#include <stdlib.h>

#include "analysis/thermal.h"
#include "solver/plan.h"

enum { WINDOW_SAMPLES = 401 };

#define NEAR_DEGENERATE_EV 0.2
#define STRONG_TWIST_DEG 70.0

/* A pole counts as being at the Fermi level within half its width + 3 kT, and
 * a node if T rises fourfold within 2 kT on both sides. */
#define NEAR_POLE_KT 3.0
#define NEAR_NODE_KT 2.0
#define NEAR_NODE_RISE 4.0

mho_conductance_options mho_conductance_defaults(void)
{
  return (mho_conductance_options){.window_ev = MHO_DEFAULT_WINDOW_EV};
}

static int compare_doubles(const void *a, const void *b)
{
  double x = *(const double *)a, y = *(const double *)b;
  return (x > y) - (x < y);
}

/* Quantile of ascending values by linear interpolation. */
static double quantile(const double *value, size_t count, double p)
{
  double place = p * (double)(count - 1);
  size_t below = (size_t)place;
  if (below + 1 >= count) return value[count - 1];
  if (value[below] == -INFINITY) return -INFINITY;
  double fraction = place - (double)below;
  return value[below] + fraction * (value[below + 1] - value[below]);
}

/* pole: of the plan, or NULL. */
static mho_status is_near_pole(const mho_plan *plan, const mho_pole *pole, double fermi_ev,
                               double kt_ev, bool *near, mho_error *error)
{
  size_t count = (size_t)mho_plan_sites(plan);
  mho_pole *own = NULL;
  mho_status status = MHO_OK;
  *near = false;
  if (!pole) status = mho_plan_resonances(plan, fermi_ev, fermi_ev, &own, &count, error);
  if (!pole) pole = own;
  for (size_t k = 0; status == MHO_OK && k < count; k++) {
    double reach = 0.5 * pole[k].width_ev + NEAR_POLE_KT * kt_ev;
    bool seen = pole[k].width_ev > 1e-12;
    *near |= seen && fabs(pole[k].energy_ev - fermi_ev) <= reach;
  }
  free(own);
  return status;
}

static mho_status fermi_warnings(const mho_plan *plan, const mho_pole *pole, double kt_ev,
                                 mho_conductance *result, mho_error *error)
{
  double fermi = result->fermi_ev;
  mho_method method = result->at_fermi.method;
  if (method == MHO_METHOD_NO_PATH || method == MHO_METHOD_NO_BAND) {
    result->warnings |= method == MHO_METHOD_NO_PATH ? MHO_WARN_NO_PI_PATH : MHO_WARN_OUTSIDE_BAND;
    return MHO_OK;
  }
  bool near;
  mho_status status = is_near_pole(plan, pole, fermi, kt_ev, &near, error);
  if (status != MHO_OK) return status;
  if (near) result->warnings |= MHO_WARN_NEAR_POLE;
  double beside = fmax(NEAR_NODE_KT * kt_ev, 1e-6);
  double energy[2] = {fermi - beside, fermi + beside};
  mho_point point[2];
  status = mho_transmission_sweep(plan, 2, energy, point, error);
  if (status != MHO_OK) return status;
  double rise = log10(NEAR_NODE_RISE) + result->at_fermi.log10_transmission;
  bool rises = !point[0].node && !point[1].node &&
               point[0].log10_transmission > rise && point[1].log10_transmission > rise;
  if (result->at_fermi.node || rises) result->warnings |= MHO_WARN_NEAR_NODE;
  return MHO_OK;
}

static void set_conductance(mho_conductance *result, double log10_g0)
{
  result->has_log = log10_g0 > -INFINITY;
  if (!result->has_log) return;
  result->log10_g0 = log10_g0;
  result->conductance_g0 = pow(10.0, log10_g0);
  result->conductance_s = result->conductance_g0 * MHO_CONDUCTANCE_QUANTUM_S;
}

static void set_window(double *value, mho_conductance *result)
{
  qsort(value, WINDOW_SAMPLES, sizeof *value, compare_doubles);
  result->window_low_log10_g0 = quantile(value, WINDOW_SAMPLES, MHO_WINDOW_LOW_QUANTILE);
  result->window_high_log10_g0 = quantile(value, WINDOW_SAMPLES, MHO_WINDOW_HIGH_QUANTILE);
  result->has_window_low = result->window_low_log10_g0 > -INFINITY;
  result->has_window_high = result->window_high_log10_g0 > -INFINITY;
  if (!result->has_window_low) result->window_low_log10_g0 = 0;
  if (!result->has_window_high) result->window_high_log10_g0 = 0;
}

mho_status mho_conductance_with_poles(const mho_plan *plan, const mho_pole *pole, double fermi_ev,
                                      double temperature_k,
                                      const mho_conductance_options *options,
                                      mho_conductance *result, mho_error *error)
{
  *result = (mho_conductance){.fermi_ev = fermi_ev, .temperature_k = temperature_k};
  double window = options ? options->window_ev : MHO_DEFAULT_WINDOW_EV;
  if (!(window >= 0.0 && window <= 10.0))
    return mho_fail(error, MHO_ERR_RANGE, "analysis", "window",
                    "the alignment window must lie between 0 eV and 10 eV");
  double kt = MHO_BOLTZMANN_EV_PER_K * temperature_k;
  mho_status status =
      mho_transmission_sweep(plan, 1, &fermi_ev, &result->at_fermi, error);
  double fermi[WINDOW_SAMPLES], value[WINDOW_SAMPLES];
  for (int i = 0; i < WINDOW_SAMPLES; i++)
    fermi[i] = fermi_ev + window * (2.0 * i / (WINDOW_SAMPLES - 1) - 1.0);
  if (status == MHO_OK)
    status = mho_thermal_log10(plan, pole, fermi, WINDOW_SAMPLES, kt, value, error);
  if (status != MHO_OK) return status;
  set_conductance(result, value[WINDOW_SAMPLES / 2]);
  set_window(value, result);
  return fermi_warnings(plan, pole, kt, result, error);
}

mho_status mho_conductance_compute(const mho_plan *plan, double fermi_ev,
                                   double temperature_k,
                                   const mho_conductance_options *options,
                                   mho_conductance *result, mho_error *error)
{
  *result = (mho_conductance){.fermi_ev = fermi_ev};
  if (mho_plan_has_chain(plan)) /* poles are only near ones, and belong to an interval */
    return mho_conductance_with_poles(plan, NULL, fermi_ev, temperature_k, options, result, error);
  mho_pole *pole = malloc((size_t)mho_plan_sites(plan) * sizeof *pole);
  if (!pole) return mho_fail(error, MHO_ERR_MEMORY, "analysis", NULL, "out of memory");
  mho_status status = mho_poles(plan, pole, error);
  if (status == MHO_OK)
    status = mho_conductance_with_poles(plan, pole, fermi_ev, temperature_k, options, result, error);
  free(pole);
  return status;
}

unsigned mho_molecule_warnings(const mho_molecule *molecule,
                               const mho_junction *junction)
{
  unsigned warnings = molecule->warnings;
  if (molecule->charge != 0) warnings |= MHO_WARN_CHARGED;
  if (junction->open_shell) warnings |= MHO_WARN_OPEN_SHELL;
  if (!junction->open_shell && junction->has_homo && junction->has_lumo &&
      junction->lumo_ev - junction->homo_ev < NEAR_DEGENERATE_EV)
    warnings |= MHO_WARN_NEAR_DEGENERATE_FRONTIER;
  double largest_cos = cos(STRONG_TWIST_DEG * 3.14159265358979324 / 180.0);
  for (int b = 0; b < molecule->bond_count; b++)
    if (fabs(mho_cos_deg(molecule->bond[b].twist_deg)) < largest_cos)
      warnings |= MHO_WARN_STRONG_TWIST;
  return warnings;
}
