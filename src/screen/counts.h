/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef MHOLECULE_SCREEN_COUNTS_H
#define MHOLECULE_SCREEN_COUNTS_H

#include <mho/screen.h>

/* What can be counted in the structure as it is drawn: atoms, rings, linkers.
 * Errors: MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_screen_count(const mho_molecule *molecule, mho_screen_quantities *out);

#endif
