/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "cli/command.h"
#include "report/drawing.h"
#include "report/stages.h"

static mho_status add_molecule(const command *cmd, const subject *s, mho_output *output,
                               mho_table *table, mho_error *error)
{
  mho_plan *plan = NULL;
  mho_conductance result;
  mho_conductance_options options = {.window_ev = cmd->window_ev};
  mho_status status = mho_plan_create(&s->junction, &plan, error);
  if (status == MHO_OK)
    status = mho_conductance_compute(plan, s->junction.fermi_ev, s->junction.temperature_k,
                                     &options, &result, error);
  if (status == MHO_OK && cmd->verbose)
    mho_method_note(output, s->molecule.name, plan, &result.at_fermi, 1);
  mho_plan_free(plan);
  if (status != MHO_OK) return status;
  unsigned warnings = s->warnings | result.warnings;
  mho_conductance_row(table, s->molecule.name, &result, warnings);
  mho_output_warn(output, s->molecule.name, warnings);
  if (cmd->quiet) return MHO_OK;
  mho_verdict_note(output, s->molecule.name, &result, cmd->window_ev);
  mho_assumption_note(output, &s->molecule, &s->junction);
  return MHO_OK;
}

static mho_status add_sensitivity(const command *cmd, const subject *s, mho_output *output,
                                  mho_table *table, mho_error *error)
{
  mho_sensitivity result;
  mho_sensitivity_options options = mho_sensitivity_defaults();
  options.seed = cmd->seed;
  mho_status status = mho_molecule_require_wide_band(&s->molecule, "--sensitivity", error);
  if (status != MHO_OK) return status;
  status = mho_sensitivity_compute(&s->molecule, &s->junction, &options, &result, error);
  if (status == MHO_OK) {
    unsigned node = result.has_derivatives ? 0u : MHO_WARN_NEAR_NODE;
    mho_sensitivity_rows(table, &s->molecule, &result);
    mho_output_warn(output, s->molecule.name, s->warnings | node);
    if (!cmd->quiet) mho_sensitivity_note(output, &s->molecule, &result);
    if (!cmd->quiet) mho_assumption_note(output, &s->molecule, &s->junction);
  }
  mho_buffer svg = {0};
  if (status == MHO_OK && cmd->measured.figure) {
    status = mho_drawing_write_sensitivity(&s->molecule, &result, &svg, error);
    if (status == MHO_OK) status = mho_buffer_save(&svg, cmd->measured.figure, "cli", error);
  }
  mho_buffer_clear(&svg);
  mho_sensitivity_clear(&result);
  return status;
}

static int list_sensitivities(const command *cmd, mho_error *error)
{
  if (cmd->has_window)
    return usage_error(cmd->verb, "--sensitivity looks at the Fermi level only; it excludes "
                                  "--window");
  subjects list;
  mho_output output = {0};
  mho_status status = subjects_read(cmd, true, &list, error);
  if (status == MHO_OK && cmd->measured.figure && list.count > 1)
    status = mho_fail(error, MHO_ERR_USAGE, "cli", "figure", "--figure draws one molecule");
  mho_table *table = mho_sensitivity_table(&output);
  for (int i = 0; status == MHO_OK && table && i < list.count; i++)
    status = add_sensitivity(cmd, &list.item[i], &output, table, error);
  if (!cmd->quiet)
    mho_output_note(&output, "derivatives of log10 of the thermal conductance at the Fermi level, "
                             "each a unit of its parameter; sigma is the default uncertainty");
  if (status == MHO_OK) status = output_write(cmd, &output, error);
  mho_output_clear(&output);
  subjects_free(&list);
  return exit_of(status);
}

int command_conductance(const command *cmd, mho_error *error)
{
  if (cmd->sensitivity) return list_sensitivities(cmd, error);
  if (cmd->measured.figure)
    return usage_error(cmd->verb, "--figure draws the molecule with its --sensitivity");
  subjects list;
  mho_output output = {0};
  mho_status status = subjects_read(cmd, true, &list, error);
  mho_table *table = mho_conductance_table(&output);
  for (int i = 0; status == MHO_OK && table && i < list.count; i++)
    status = add_molecule(cmd, &list.item[i], &output, table, error);
  if (status == MHO_OK) status = output_write(cmd, &output, error);
  mho_output_clear(&output);
  subjects_free(&list);
  return exit_of(status);
}
