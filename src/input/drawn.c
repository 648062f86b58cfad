/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * A molecule that is drawn (SMILES, files), under the settings of files and commands.
 */
#include <mho/molecule_file.h>

#include <stdlib.h>
#include <string.h>

#include "base/text.h"
#include "input/records.h"
#include "molecule/texts.h"

static mho_status no_memory(mho_error *error)
{
  return mho_fail(error, MHO_ERR_MEMORY, "input", NULL, "out of memory");
}

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
  if (s->has_hopping) options->hopping = s->hopping;
  if (s->has_alternation) options->alternation = s->alternation;
  if (s->has_coupling) options->coupling_ev = s->coupling_ev;
  options->contacts_optional = s->contacts_optional;
}

/* Turns the text, or else structure->graph, into the molecule. */
static mho_status convert(const char *text, const mho_place *place, const mho_settings *s,
                          int charge, mho_structure *structure, mho_molecule *molecule,
                          mho_error *error)
{
  mho_structure_options options;
  mho_structure_options_init(&options);
  set_options(s, &options);
  options.charge = charge;
  if (place) options.place = *place;
  mho_twist_setting *twist = calloc((size_t)s->twist_count + 1, sizeof *twist);
  if (!twist) return no_memory(error);
  for (int i = 0; i < s->twist_count; i++)
    twist[i] = (mho_twist_setting){{s->twist[i].site[0], s->twist[i].site[1]},
                                   s->twist[i].angle_deg};
  options.twist = twist;
  options.twist_count = s->twist_count;
  mho_status status =
      text ? mho_structure_read_smiles(text, &options, molecule, structure, error)
           : mho_molecule_from_graph(structure, &options, molecule, error);
  free(twist);
  if (status != MHO_OK) return status;
  if (s->has_temperature) molecule->temperature_k = s->temperature_k;
  if (s->has_fermi) molecule->fermi = s->fermi;
  if (keep_findings(structure, molecule) != MHO_OK ||
      mho_molecule_warn_length(molecule) != MHO_OK)
    return no_memory(error);
  return MHO_OK;
}

static const mho_settings nothing = {0};

mho_status mho_molecule_read_smiles(const char *text, const mho_place *place,
                                    const mho_settings *settings, int charge,
                                    mho_molecule *molecule, mho_error *error)
{
  mho_structure structure;
  mho_structure_init(&structure);
  mho_status status = convert(text, place, settings ? settings : &nothing, charge, &structure,
                              molecule, error);
  mho_structure_clear(&structure);
  return status;
}

/* The notes of the reader go before those of the conversion. */
static mho_status join_notes(mho_texts *first, mho_texts *second)
{
  for (int i = 0; i < second->count; i++)
    if (mho_texts_add(first, "%s", second->text[i]) != MHO_OK) return MHO_ERR_MEMORY;
  mho_texts_clear(second);
  *second = *first;
  *first = (mho_texts){0};
  return MHO_OK;
}

mho_status mho_molecule_read_record(mho_records *records, const mho_settings *settings,
                                    int charge, mho_molecule *molecule, mho_record *record,
                                    mho_error *error)
{
  mho_structure structure;
  mho_texts notes = {0};
  mho_structure_init(&structure);
  mho_status status = mho_records_next(records, &structure.graph, record, &notes, error);
  if (status == MHO_OK && record->number)
    status = convert(NULL, &record->place, settings ? settings : &nothing, charge, &structure,
                     molecule, error);
  if (status == MHO_OK && join_notes(&notes, &molecule->notes) != MHO_OK)
    status = no_memory(error);
  mho_texts_clear(&notes);
  mho_structure_clear(&structure);
  return status;
}

static mho_status fail_record(const char *path, long asked, long found, mho_error *error)
{
  if (asked)
    return mho_fail_at(error, MHO_ERR_RANGE, "input", path, 0, 0, "record",
                       "record %ld does not exist; there are %ld", asked, found);
  return mho_fail_at(error, MHO_ERR_RANGE, "input", path, 0, 0, "record",
                     "the file holds %ld records; name one, such as 'record: 1'", found);
}

/* Name of a molecule after its record, or after the file. */
static mho_status set_name(mho_molecule *molecule, const char *name, const char *path)
{
  const char *slash = strrchr(path, '/'), *stem = slash ? slash + 1 : path;
  const char *dot = strrchr(stem, '.');
  if (molecule->name) return MHO_OK;
  molecule->name = *name ? mho_copy_text(name)
                         : mho_print_text("%.*s", dot && dot > stem ? (int)(dot - stem)
                                                                    : (int)strlen(stem), stem);
  return molecule->name ? MHO_OK : MHO_ERR_MEMORY;
}

mho_status mho_molecule_read_structure(const char *path, long record, const mho_settings *settings,
                                       int charge, mho_molecule *molecule, mho_error *error)
{
  mho_records *records;
  mho_record at = {.name = ""}, further;
  mho_status status = mho_records_open(path, &records, error);
  if (status != MHO_OK) return status;
  long number = record ? record : 1, found = 0;
  for (at.number = 1; found + 1 < number && at.number;) {
    mho_records_skip(records, &at);
    found += at.number > 0;
  }
  if (at.number) status = mho_molecule_read_record(records, settings, charge, molecule, &at, error);
  if (status == MHO_OK && set_name(molecule, at.name, path) != MHO_OK) status = no_memory(error);
  if (at.number == 0) status = fail_record(path, number, found, error);
  if (status == MHO_OK && !record) {
    for (found = 1, mho_records_skip(records, &further); further.number; found++)
      mho_records_skip(records, &further);
    if (found > 1) status = fail_record(path, 0, found, error);
  }
  mho_records_close(records);
  return status;
}
