/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The p orbital of one atom in its bonding situation.
 */
#ifndef MHOLECULE_MOLECULE_ORBITAL_H
#define MHOLECULE_MOLECULE_ORBITAL_H

#include "molecule/pi.h"

typedef enum {
  ORBITAL_NONE,
  ORBITAL_OWN,    /* takes part in a pi bond, or a half filled or empty p */
  ORBITAL_LENT,   /* lone pair, or empty p of boron: where it touches others */
  ORBITAL_REFUSED /* no row for it; an error where it touches others */
} mho_orbital_kind;

typedef struct {
  mho_orbital_kind kind;
  bool sp;            /* two orthogonal p orbitals */
  int electrons;      /* of each orbital */
  char row[MHO_ROW_SIZE];
  bool oxide;         /* N or O of a nitro group or an N-oxide */
  bool bound;         /* thiolate or carboxylate, counted as neutral */
  const char *reason; /* of a refusal */
} mho_orbital;

mho_orbital mho_orbital_of(const mho_graph *graph, const bool *removed,
                           int atom);

#endif
