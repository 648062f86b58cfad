/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "cli/command.h"
#include "report/figure.h"
#include "report/stages.h"

static mho_status add_molecule(const command *cmd, const subject *s, int part, mho_output *output,
                               mho_error *error)
{
  const mho_molecule *m = &s->molecule;
  mho_twist_bonds bonds;
  char reason[480];
  mho_status status = mho_twist_choose(&cmd->twist, m, &bonds, reason, sizeof reason);
  if (status != MHO_OK)
    status = mho_fail_at(error, status, "cli", m->source ? m->source : m->name, 0, 0, "bond",
                         "--bond: %s", reason);
  if (status == MHO_OK)
    status = mho_twist_answer(&cmd->twist, m, &s->junction, &bonds, part, output,
                              cmd->quiet ? NULL : output, NULL, error);
  mho_twist_bonds_clear(&bonds);
  mho_output_warn(output, m->name, s->warnings & ~(unsigned)MHO_WARN_STRONG_TWIST);
  if (status == MHO_OK && !cmd->quiet) mho_assumption_note(output, m, &s->junction);
  return status;
}

static mho_status draw(const command *cmd, const mho_table *table, mho_error *error)
{
  mho_buffer script = {0};
  if (cmd->twist.map) mho_figure_twist_map(&script, table, NULL);
  else mho_figure_twist(&script, table, 0);
  mho_status status = mho_buffer_check(&script, "cli", error);
  if (status == MHO_OK) status = figure_write(cmd, &script, error);
  mho_buffer_clear(&script);
  return status;
}

int command_twist(const command *cmd, mho_error *error)
{
  const mho_twist_question *q = &cmd->twist;
  const char *conflict = mho_twist_conflict(q, true);
  bool average = q->average || q->torsion.text[0];
  if (conflict) return usage_error(cmd->verb, "%s", conflict);
  if (average && cmd->measured.figure)
    return usage_error(cmd->verb, "--figure draws the angles or the map, not the average");
  int part = average ? MHO_TWIST_AVERAGE : q->map ? MHO_TWIST_MAP : MHO_TWIST_SWEEP;
  subjects list;
  mho_output output = {0};
  mho_status status = subjects_read(cmd, true, &list, error);
  for (int i = 0; status == MHO_OK && i < list.count; i++)
    status = add_molecule(cmd, &list.item[i], part, &output, error);
  if (!cmd->quiet && average)
    mho_output_note(&output, "motional average: <G> over exp(-V/kT), the bond turns faster than "
                             "anyone measures; frozen average: exp <ln G>, every junction keeps "
                             "its angle");
  if (status == MHO_OK) status = mho_output_check(&output, error);
  if (status == MHO_OK && cmd->measured.figure && q->map && list.count > 1)
    status = mho_fail(error, MHO_ERR_USAGE, "cli", "figure", "--figure draws the map of one molecule");
  if (status == MHO_OK && cmd->measured.figure) status = draw(cmd, &output.table[0], error);
  if (status == MHO_OK) status = output_write(cmd, &output, error);
  mho_output_clear(&output);
  subjects_free(&list);
  return exit_of(status);
}
