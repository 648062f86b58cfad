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

MHO_END_DECLARATIONS

#endif
