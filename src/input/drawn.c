/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * A molecule that is drawn (SMILES), under the settings of files and commands.
 */
#include <mho/molecule_file.h>

#include <stdlib.h>

static int site_of_atom(const mho_molecule *molecule, const mho_structure *structure, int atom)
{
  for (int i = 0; i < molecule->site_count; i++)
    if (structure->site_atom[i] == atom) return i;
  return -1;
}

/* Linkers, notes and warnings outlive the structure. */
static mho_status keep_findings(mho_structure *structure, mho_molecule *molecule)
{
  molecule->linker = calloc((size_t)structure->linker_count + 1, sizeof *molecule->linker);
  if (!molecule->linker) return MHO_ERR_MEMORY;
  for (int i = 0; i < structure->linker_count; i++) {
    const mho_linker *linker = &structure->linker[i];
    int site = site_of_atom(molecule, structure, linker->atom[0]);
    if (site < 0) continue; /* outside the pi system that conducts */
    molecule->linker[molecule->linker_count++] =
        (mho_site_linker){mho_linker_name(linker->kind), site};
  }
  molecule->notes = structure->notes;
  molecule->warnings = structure->warnings;
  molecule->graph = structure->graph;
  molecule->site_atom = structure->site_atom;
  structure->notes = (mho_texts){0};
  mho_graph_init(&structure->graph);
  structure->site_atom = NULL;
  return MHO_OK;
}

static void set_options(const mho_settings *s, mho_structure_options *options)
{
  if (s->parameters) options->parameters = s->parameters;
  if (s->has_beta) options->beta_ev = s->beta_ev;
  if (s->has_alkyl) options->alkyl = s->alkyl;
  if (s->has_alternation) options->alternation = s->alternation;
  if (s->has_coupling) options->coupling_ev = s->coupling_ev;
  options->contacts_optional = s->contacts_optional;
}

mho_status mho_molecule_read_smiles(const char *text, const mho_place *place,
                                    const mho_settings *settings, int charge,
                                    mho_molecule *molecule, mho_error *error)
{
  static const mho_settings nothing = {0};
  const mho_settings *s = settings ? settings : &nothing;
  mho_structure_options options;
  mho_structure_options_init(&options);
  set_options(s, &options);
  options.charge = charge;
  if (place) options.place = *place;
  mho_twist_setting *twist = calloc((size_t)s->twist_count + 1, sizeof *twist);
  if (!twist) return mho_fail(error, MHO_ERR_MEMORY, "input", NULL, "out of memory");
  for (int i = 0; i < s->twist_count; i++)
    twist[i] = (mho_twist_setting){{s->twist[i].site[0], s->twist[i].site[1]},
                                   s->twist[i].angle_deg};
  options.twist = twist;
  options.twist_count = s->twist_count;
  mho_structure structure;
  mho_structure_init(&structure);
  mho_status status = mho_structure_read_smiles(text, &options, molecule, &structure, error);
  if (status == MHO_OK && keep_findings(&structure, molecule) != MHO_OK)
    status = mho_fail(error, MHO_ERR_MEMORY, "input", NULL, "out of memory");
  mho_structure_clear(&structure);
  free(twist);
  if (status != MHO_OK) return status;
  if (s->has_temperature) molecule->temperature_k = s->temperature_k;
  if (s->has_fermi) molecule->fermi = s->fermi;
  return MHO_OK;
}
