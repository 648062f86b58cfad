/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <mho/conductance.h>
#include <mho/nodes.h>
#include <mho/screen.h>

#include <math.h>
#include <stdlib.h>

#include "analysis/thermal.h"
#include "screen/counts.h"
#include "screen/errors.h"

struct mho_screen_workspace {
  mho_pole *pole; /* [room] */
  int room;
};

mho_screen_workspace *mho_screen_workspace_create(void)
{
  return calloc(1, sizeof(mho_screen_workspace));
}

void mho_screen_workspace_free(mho_screen_workspace *workspace)
{
  if (workspace) free(workspace->pole);
  free(workspace);
}

static mho_status find_poles(mho_screen_workspace *workspace, const mho_plan *plan,
                             mho_error *error)
{
  int sites = mho_plan_sites(plan);
  if (sites > workspace->room) {
    mho_pole *pole = realloc(workspace->pole, (size_t)sites * sizeof *pole);
    if (!pole) return mho_fail(error, MHO_ERR_MEMORY, "screen", NULL, "out of memory");
    workspace->pole = pole;
    workspace->room = sites;
  }
  return mho_poles(plan, workspace->pole, error);
}

static void set(mho_screen_quantities *out, bool has, int index, double value)
{
  if (has) mho_screen_set_value(out, index, value);
}

static mho_status measure_conductance(const mho_plan *plan, const mho_pole *pole,
                                      const mho_junction *junction,
                                      const mho_screen_settings *settings,
                                      mho_screen_quantities *out, mho_error *error)
{
  mho_conductance c;
  mho_conductance_options options = {.window_ev = settings->window_ev};
  mho_status status = mho_conductance_with_poles(plan, pole, junction->fermi_ev,
                                                 junction->temperature_k, &options, &c, error);
  if (status != MHO_OK) return status;
  set(out, true, MHO_SCREEN_fermi_ev, c.fermi_ev);
  set(out, true, MHO_SCREEN_transmission, c.at_fermi.transmission);
  set(out, c.has_log, MHO_SCREEN_conductance_g0, c.conductance_g0);
  set(out, c.has_log, MHO_SCREEN_log10_g0, c.log10_g0);
  set(out, c.has_window_low, MHO_SCREEN_window_low_log10_g0, c.window_low_log10_g0);
  set(out, c.has_window_high, MHO_SCREEN_window_high_log10_g0, c.window_high_log10_g0);
  out->warnings |= (int)c.warnings;
  return MHO_OK;
}

static mho_status measure_nodes(const mho_plan *plan, const mho_junction *junction,
                                mho_screen_quantities *out, mho_error *error)
{
  if (!junction->has_homo || !junction->has_lumo) return MHO_OK;
  if (junction->lead[MHO_LEFT].channels != 1 || junction->lead[MHO_RIGHT].channels != 1)
    return MHO_OK;
  if (junction->lumo_ev <= junction->homo_ev) {
    set(out, true, MHO_SCREEN_nodes, 0);
    return MHO_OK;
  }
  mho_nodes nodes;
  mho_status status =
      mho_nodes_between(plan, junction->homo_ev, junction->lumo_ev, &nodes, error);
  double nearest = INFINITY;
  for (size_t k = 0; status == MHO_OK && k < nodes.count; k++) {
    double distance = nodes.node[k].energy_ev - junction->fermi_ev;
    if (fabs(distance) < fabs(nearest)) nearest = distance;
  }
  set(out, status == MHO_OK && !nodes.everywhere, MHO_SCREEN_nodes, (double)nodes.count);
  set(out, nodes.count > 0, MHO_SCREEN_node_ev, nearest);
  mho_nodes_clear(&nodes);
  return status;
}

static mho_status measure_errors(const mho_molecule *molecule, const mho_plan *plan,
                                 const mho_pole *pole, double fermi_ev,
                                 const mho_screen_settings *settings, mho_screen_quantities *out,
                                 mho_error *error)
{
  mho_sensitivity sensitivity;
  mho_status status = mho_sensitivity_with_poles(molecule, plan, pole, fermi_ev,
                                                 &settings->sensitivity, &sensitivity, error);
  if (status == MHO_OK)
    mho_screen_set_errors(molecule, &sensitivity, settings->sensitivity.sigma.twist_deg, out);
  mho_sensitivity_clear(&sensitivity);
  return status;
}

static mho_status measure_structure(const mho_molecule *molecule, const mho_junction *junction,
                                    mho_screen_quantities *out, mho_error *error)
{
  double length;
  mho_length_kind kind;
  mho_status status = mho_screen_count(molecule, out);
  if (status == MHO_OK) status = mho_molecule_length(molecule, &length, &kind);
  if (status != MHO_OK) return mho_fail(error, status, "screen", NULL, "out of memory");
  set(out, kind != MHO_LENGTH_NONE, MHO_SCREEN_length_nm, length);
  set(out, junction->has_homo, MHO_SCREEN_homo_ev, junction->homo_ev);
  set(out, junction->has_lumo, MHO_SCREEN_lumo_ev, junction->lumo_ev);
  set(out, junction->has_homo && junction->has_lumo, MHO_SCREEN_gap_ev,
      junction->lumo_ev - junction->homo_ev);
  set(out, true, MHO_SCREEN_warnings, (int)mho_molecule_warnings(molecule, junction));
  return MHO_OK;
}

mho_status mho_screen_measure(mho_screen_workspace *workspace, const mho_molecule *molecule,
                              const mho_screen_settings *settings, mho_screen_quantities *out,
                              mho_error *error)
{
  *out = (mho_screen_quantities){0};
  mho_screen_settings defaults = mho_screen_defaults();
  if (!settings) settings = &defaults;
  mho_junction junction;
  mho_plan *plan = NULL;
  mho_status status = mho_molecule_require_wide_band(molecule, "a screening", error);
  if (status != MHO_OK) return status;
  status = mho_junction_build(molecule, &junction, error);
  if (status == MHO_OK) status = mho_junction_require_contacts(&junction, molecule, error);
  if (status == MHO_OK) status = mho_plan_create(&junction, &plan, error);
  if (status == MHO_OK) status = measure_structure(molecule, &junction, out, error);
  if (status == MHO_OK) status = find_poles(workspace, plan, error);
  const mho_pole *pole = workspace->pole;
  if (status == MHO_OK) status = measure_conductance(plan, pole, &junction, settings, out, error);
  if (status == MHO_OK) status = measure_nodes(plan, &junction, out, error);
  if (status == MHO_OK)
    status = measure_errors(molecule, plan, pole, junction.fermi_ev, settings, out, error);
  mho_plan_free(plan);
  mho_junction_clear(&junction);
  return status;
}
