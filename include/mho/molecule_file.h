/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Molecule files (YAML).
 */
#ifndef MHOLECULE_MOLECULE_FILE_H
#define MHOLECULE_MOLECULE_FILE_H

#include <mho/molecule.h>
#include <mho/settings.h>
#include <mho/status.h>

MHO_BEGIN_DECLARATIONS

/* Reads a molecule file.  `defaults` stand below what the file says and
 * `overrides` above it; either may be NULL.  The caller clears the molecule,
 * also after a failure.  All mistakes of the file are reported together, each
 * with line and column.  A file without `name` is called by its file name.
 * Errors: any that mho_status_is_input tells, MHO_ERR_MEMORY. */
MHO_API MHO_MUST_USE mho_status mho_molecule_read(const char *path,
                                                  const mho_settings *defaults,
                                                  const mho_settings *overrides,
                                                  mho_molecule *molecule,
                                                  mho_error *error);

/* The molecule that a SMILES draws, under `settings` (may be NULL), with
 * `charge` on top of the charges that are drawn.  The molecule is initialised;
 * it may have a name already and is called by the text otherwise.  place (may
 * be NULL) is where the text stands.  Errors: as mho_structure_read_smiles,
 * and as mho_settings_apply. */
MHO_API MHO_MUST_USE mho_status mho_molecule_read_smiles(
    const char *text, const mho_place *place, const mho_settings *settings,
    int charge, mho_molecule *molecule, mho_error *error);

/* The molecule of one record (from 1; 0 is the only one) of a molfile, an SDF or
 * an XYZ file, by its ending.  It is called by the record's name, or by the file's, and
 * its notes say what was done.  Errors besides: MHO_ERR_FILE, MHO_ERR_RANGE
 * (there is no such record, or there are several and none is named). */
MHO_API MHO_MUST_USE mho_status mho_molecule_read_structure(
    const char *path, long record, const mho_settings *settings, int charge,
    mho_molecule *molecule, mho_error *error);

/* Reads a parameter set (YAML): `name`, `source`, optionally `base` (a
 * built-in set to start from, van-catledge by default), `rows` of {element, h,
 * k, electrons} with k to carbon, and `pairs` of {between: [A, B], k}.  The
 * caller frees the set with mho_parameters_free. */
MHO_API MHO_MUST_USE mho_status mho_parameters_read(const char *path,
                                                    mho_parameter_set **set,
                                                    mho_error *error);

MHO_END_DECLARATIONS

#endif
