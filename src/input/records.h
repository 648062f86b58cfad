/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef MHOLECULE_INPUT_RECORDS_H
#define MHOLECULE_INPUT_RECORDS_H

#include <mho/molecule_file.h>

#include "molecule/records.h"

/* The next record as a molecule, as mho_molecule_read_structure has it, but
 * without a name of its own.  At the end record->number is 0. */
MHO_MUST_USE mho_status mho_molecule_read_record(mho_records *records,
                                                 const mho_settings *settings, int charge,
                                                 mho_molecule *molecule, mho_record *record,
                                                 mho_error *error);

#endif
