/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef MHOLECULE_SCREEN_ERRORS_H
#define MHOLECULE_SCREEN_ERRORS_H

#include <mho/screen.h>

/* Error of log10 G, what of it all candidates share, and what the twists do.
 * Follows mho_screen_count and the conductance. */
void mho_screen_set_errors(const mho_molecule *molecule, const mho_sensitivity *sensitivity,
                           double twist_sigma_deg, mho_screen_quantities *out);

#endif
