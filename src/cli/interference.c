/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <stdlib.h>

#include "cli/command.h"
#include "report/drawing.h"
#include "report/figure.h"
#include "report/stages.h"

/* Leaves the pairs with one site; its index into *from. */
static mho_status keep_from(const command *cmd, const mho_molecule *m, mho_interference *map,
                            int *from, mho_error *error)
{
  *from = mho_molecule_find_site(m, cmd->from);
  if (*from < 0)
    return mho_fail_at(error, MHO_ERR_REFERENCE, "cli", m->source ? m->source : m->name, 0, 0,
                       "from", "--from: there is no site '%.60s' in the pi system", cmd->from);
  size_t kept = 0;
  for (size_t p = 0; p < map->count; p++) {
    mho_pair swap = map->pair[p];
    if (swap.site[0] != *from && swap.site[1] != *from) {
      free(swap.magic);
      continue;
    }
    map->pair[kept++] = swap;
  }
  map->count = kept;
  return MHO_OK;
}

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

static mho_status add_molecule(const command *cmd, const subject *s, mho_output *output,
                               mho_table *table, mho_error *error)
{
  mho_interference map;
  mho_interference_options options = mho_interference_defaults(&s->molecule);
  options.every_site = cmd->every_site;
  if (cmd->rules) options.nodes = options.magic = false;
  mho_status status = mho_interference_map(&s->molecule, &s->junction, &options, &map, error);
  int from = -1;
  if (status == MHO_OK && cmd->from) status = keep_from(cmd, &s->molecule, &map, &from, error);
  if (status == MHO_OK && cmd->measured.figure)
    status = draw(cmd, &s->molecule, &map, from, error);
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
  if ((cmd->from || cmd->measured.figure) && cmd->modify)
    return usage_error(cmd->verb, "--from and --figure belong to pairs; --modify excludes them");
  if (cmd->measured.figure && cmd->files > 1)
    return usage_error(cmd->verb, "--figure draws one molecule");
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
