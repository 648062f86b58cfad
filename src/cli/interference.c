/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "cli/command.h"
#include "report/drawing.h"
#include "report/figure.h"
#include "report/stages.h"

static mho_status draw(const command *cmd, const mho_molecule *m, const mho_interference *map,
                       int from, mho_error *error)
{
  mho_buffer picture = {0};
  mho_status status = MHO_OK;
  if (from >= 0) status = mho_drawing_write_pairs(m, map, from, &picture, error);
  else mho_figure_pairs(&picture, m, map);
  if (status == MHO_OK) status = mho_buffer_check(&picture, "cli", error);
  if (status == MHO_OK)
    status = from >= 0 ? mho_buffer_save(&picture, cmd->measured.figure, "cli", error)
                       : figure_write(cmd, &picture, error);
  mho_buffer_clear(&picture);
  return status;
}

static mho_status add_pairs(const command *cmd, const subject *s, mho_output *output,
                            mho_table *table, mho_error *error)
{
  const mho_interference_question *q = &cmd->interference;
  mho_interference map;
  int from;
  mho_status status = mho_molecule_require_wide_band(&s->molecule, "a map of all pairs", error);
  if (status != MHO_OK) return status;
  status = mho_interference_find(q, &s->molecule, &s->junction, !q->rules, &map, &from,
                                            error);
  if (status == MHO_OK && cmd->measured.figure)
    status = draw(cmd, &s->molecule, &map, from, error);
  if (status == MHO_OK && q->rules) mho_rules_rows(table, &s->molecule, &map);
  else if (status == MHO_OK) mho_interference_rows(table, &s->molecule, &map);
  if (status == MHO_OK && !cmd->quiet && q->rules) mho_rules_note(output, &s->molecule, &map);
  else if (status == MHO_OK && !cmd->quiet) mho_interference_note(output, &s->molecule, &map);
  mho_interference_clear(&map);
  return status;
}

static mho_status add_modifications(const command *cmd, const subject *s, mho_table *table,
                                    mho_error *error)
{
  mho_modifications ranked;
  mho_buffer svg = {0};
  mho_status status = mho_modify_rank(&s->molecule, &s->junction,
                                      mho_interference_window(&cmd->interference), &ranked, error);
  if (status == MHO_OK) mho_modify_rows(table, &s->molecule, &ranked);
  if (status == MHO_OK && cmd->measured.figure) {
    status = mho_drawing_write_modifications(&s->molecule, &ranked, &svg, error);
    if (status == MHO_OK) status = mho_buffer_save(&svg, cmd->measured.figure, "cli", error);
  }
  mho_buffer_clear(&svg);
  mho_modifications_clear(&ranked);
  return status;
}

static void add_note(const command *cmd, mho_output *output)
{
  const mho_interference_question *q = &cmd->interference;
  if (q->modify)
    mho_output_note(output, "changes of log10 of the thermal conductance with the Fermi level held; "
                            "the window values are the 5 %% and 95 %% quantiles of the change over "
                            "+-%g eV around it", mho_interference_window(q));
  else if (!q->rules)
    mho_output_note(output, "a pair conducts where its Green's function is at least a tenth of the "
                            "largest among pairs as far apart; the overturning shift is the "
                            "smallest move of the Fermi level that turns this");
}

int command_interference(const command *cmd, mho_error *error)
{
  const mho_interference_question *q = &cmd->interference;
  const char *conflict = mho_interference_conflict(q, true);
  if (conflict) return usage_error(cmd->verb, "%s", conflict);
  if (cmd->measured.figure && cmd->files > 1)
    return usage_error(cmd->verb, "--figure draws one molecule");
  command lenient = *cmd; /* contacts are what is asked for */
  lenient.overrides.contacts_optional = !q->modify;
  subjects list;
  mho_output output = {0};
  mho_status status = subjects_read(&lenient, q->modify, &list, error);
  mho_table *table = q->modify  ? mho_modify_table(&output)
                     : q->rules ? mho_rules_table(&output)
                                : mho_interference_table(&output);
  for (int i = 0; status == MHO_OK && table && i < list.count; i++) {
    const subject *s = &list.item[i];
    status = q->modify ? add_modifications(cmd, s, table, error)
                       : add_pairs(cmd, s, &output, table, error);
    mho_output_warn(&output, s->molecule.name, s->warnings);
    if (status == MHO_OK && !cmd->quiet) mho_assumption_note(&output, &s->molecule, &s->junction);
  }
  if (!cmd->quiet) add_note(cmd, &output);
  if (status == MHO_OK) status = output_write(cmd, &output, error);
  mho_output_clear(&output);
  subjects_free(&list);
  return exit_of(status);
}
