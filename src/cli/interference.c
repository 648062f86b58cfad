/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "cli/command.h"
#include "report/stages.h"

static mho_status add_molecule(const command *cmd, const subject *s, mho_output *output,
                               mho_table *table, mho_error *error)
{
  mho_interference map;
  mho_interference_options options = mho_interference_defaults(&s->molecule);
  options.every_site = cmd->every_site;
  if (cmd->rules) options.nodes = options.magic = false;
  mho_status status = mho_interference_map(&s->molecule, &s->junction, &options, &map, error);
  if (status == MHO_OK && cmd->rules) mho_rules_rows(table, &s->molecule, &map);
  else if (status == MHO_OK) mho_interference_rows(table, &s->molecule, &map);
  mho_output_warn(output, s->molecule.name, s->warnings);
  if (status == MHO_OK && !cmd->quiet) {
    if (cmd->rules) mho_rules_note(output, &s->molecule, &map);
    mho_assumption_note(output, &s->molecule, &s->junction);
  }
  mho_interference_clear(&map);
  return status;
}

int command_interference(const command *cmd, mho_error *error)
{
  command lenient = *cmd; /* contacts are what is asked for */
  lenient.overrides.contacts_optional = true;
  subjects list;
  mho_output output = {0};
  mho_status status = subjects_read(&lenient, false, &list, error);
  mho_table *table =
      cmd->rules ? mho_rules_table(&output) : mho_interference_table(&output);
  for (int i = 0; status == MHO_OK && table && i < list.count; i++)
    status = add_molecule(cmd, &list.item[i], &output, table, error);
  if (!cmd->quiet && !cmd->rules)
    mho_output_note(&output, "a pair conducts where its Green's function is at least a tenth of the "
                             "largest among pairs as far apart; the overturning shift is the "
                             "smallest move of the Fermi level that turns this");
  if (status == MHO_OK) status = output_write(cmd, &output, error);
  mho_output_clear(&output);
  subjects_free(&list);
  return exit_of(status);
}
