/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef MHOLECULE_MOLECULE_FRAGMENT_H
#define MHOLECULE_MOLECULE_FRAGMENT_H

#include "molecule/linker.h"

/* Salts and solvents: of separate parts the one with most atoms at multiple
 * bonds stays; the atoms of the others become removed, their linkers are
 * dropped, and a note (notes may be NULL) says so.  Nothing happens where no
 * part is unsaturated or atom classes stand in several.  Errors:
 * MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_fragment_choose(const mho_graph *graph, mho_linkers *linkers,
                                            mho_texts *notes);

#endif
