/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Finds the linkers of a molecule and chooses its contacts.
 */
#ifndef MHOLECULE_MOLECULE_LINKER_H
#define MHOLECULE_MOLECULE_LINKER_H

#include <mho/linker.h>

typedef struct {
  int count;
  mho_linker *linker;
  /* [atoms] true for what stays in or is the electrode: gold, and the acetyl
   * of a thioacetate. */
  bool *removed;
} mho_linkers;

/* Atoms of one contact, and the linker they belong to (MHO_LINKER_KINDS where
 * an atom class marks something else). */
typedef struct {
  int count;
  int *atom;
  mho_linker_kind kind;
} mho_contact_atoms;

/* Linkers in the order of their first atom.  Errors: MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_linkers_find(const mho_graph *graph,
                                         mho_linkers *linkers);
void mho_linkers_clear(mho_linkers *linkers);

/* Atom classes 1 and 2 mark the left and the right contact; without classes
 * there must be two linkers: terminal ones first, ring nitrogen only where
 * fewer than two terminal ones exist.  The one that comes first in the input
 * is the left.  With `optional`, a molecule without classes and without two
 * linkers has no contacts.  Caller frees contact[].atom.
 * Errors: MHO_ERR_CONTACTS (lists what was found), MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_contacts_choose(const mho_graph *graph,
                                            const mho_linkers *linkers,
                                            bool optional,
                                            const mho_place *place,
                                            mho_contact_atoms contact[2],
                                            mho_error *error);

#endif
