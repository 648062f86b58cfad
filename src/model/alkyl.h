/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef MHOLECULE_MODEL_ALKYL_H
#define MHOLECULE_MODEL_ALKYL_H

#include <mho/structure.h>

#include "molecule/pi.h"

/* Applies options->alkyl to a molecule whose sites are those of pi; the
 * molecule has room for a site an atom and a bond a bond of the graph more.
 * Errors: MHO_ERR_MEMORY, MHO_ERR_LIMIT. */
MHO_MUST_USE mho_status mho_alkyl_apply(const mho_pi *pi, const bool *removed,
                                        const mho_structure_options *options,
                                        mho_molecule *molecule,
                                        mho_structure *structure,
                                        mho_error *error);

#endif
