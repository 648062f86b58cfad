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

static mho_status add_modifications(const command *cmd, const subject *s, mho_output *output,
                                    mho_table *table, mho_error *error)
{
  mho_modifications ranked;
  mho_status status =
      mho_modify_rank(&s->molecule, &s->junction, cmd->window_ev, &ranked, error);
  if (status == MHO_OK) mho_modify_rows(table, &s->molecule, &ranked);
  mho_modifications_clear(&ranked);
  mho_output_warn(output, s->molecule.name, s->warnings);
  if (status == MHO_OK && !cmd->quiet) mho_assumption_note(output, &s->molecule, &s->junction);
  return status;
}

static int check_options(const command *cmd)
{
  if (cmd->modify && (cmd->rules || cmd->every_site))
    return usage_error(cmd->verb, "--modify keeps the contacts; it excludes --rules and "
                                  "--every-site");
  if (cmd->has_window && !cmd->modify)
    return usage_error(cmd->verb, "--window belongs to --modify");
  return EXIT_DONE;
}

static void add_note(const command *cmd, mho_output *output)
{
  if (cmd->modify)
    mho_output_note(output, "changes of log10 of the thermal conductance with the Fermi level held; "
                            "the window values are the 5 %% and 95 %% quantiles of the change over "
                            "+-%g eV around it", cmd->window_ev);
  else if (!cmd->rules)
    mho_output_note(output, "a pair conducts where its Green's function is at least a tenth of the "
                            "largest among pairs as far apart; the overturning shift is the "
                            "smallest move of the Fermi level that turns this");
}

int command_interference(const command *cmd, mho_error *error)
{
  int code = check_options(cmd);
  if (code != EXIT_DONE) return code;
  command lenient = *cmd; /* contacts are what is asked for */
  lenient.overrides.contacts_optional = !cmd->modify;
  subjects list;
  mho_output output = {0};
  mho_status status = subjects_read(&lenient, cmd->modify, &list, error);
  mho_table *table = cmd->modify  ? mho_modify_table(&output)
                     : cmd->rules ? mho_rules_table(&output)
                                  : mho_interference_table(&output);
  for (int i = 0; status == MHO_OK && table && i < list.count; i++)
    status = cmd->modify ? add_modifications(cmd, &list.item[i], &output, table, error)
                         : add_molecule(cmd, &list.item[i], &output, table, error);
  if (!cmd->quiet) add_note(cmd, &output);
  if (status == MHO_OK) status = output_write(cmd, &output, error);
  mho_output_clear(&output);
  subjects_free(&list);
  return exit_of(status);
}
