/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * From a molecular graph to its pi system: one site a p orbital.
 */
#ifndef MHOLECULE_MOLECULE_PI_H
#define MHOLECULE_MOLECULE_PI_H

#include <mho/graph.h>

enum { MHO_ROW_SIZE = 12 };

typedef struct {
  int atom;
  int orbital;   /* 1 for the second p orbital of an sp atom, else 0 */
  int electrons; /* that it brings, as drawn */
  bool oxide;    /* N or O of a nitro group or an N-oxide */
  char row[MHO_ROW_SIZE]; /* of a parameter set: `N-pyridine`, `N+` ... */
} mho_pi_site;

typedef struct {
  int site[2];
  int bond;         /* of the graph */
  double strength;  /* formal alternation: 0.9, 1 or 1.1 */
  bool rotatable;
  double twist_deg; /* estimate, and what it rests on */
  const char *reason;
  const char *kind; /* of its torsion potential (mho/torsion.h), or NULL */
} mho_pi_bond;

typedef struct {
  int site_count, bond_count;
  mho_pi_site *site;
  mho_pi_bond *bond;
  int *site_of; /* [atoms] first site of an atom, -1 without p orbital */
  int charge;   /* formal charge of the sites, bound thiolate not counted */
} mho_pi;

/* Sites and bonds with strength 1 and no twist.  Atoms in `removed` do not
 * exist; `contact` has bit 1 for atoms of the left and bit 2 for atoms of the
 * right contact, whose lone pairs are sites even where they touch no other
 * (either may be NULL).  Notes (or NULL) say what was left out or counted
 * by a rule.  Errors: MHO_ERR_UNPARAMETERISED for an atom in a bonding
 * situation without a row, MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_pi_perceive(const mho_graph *graph,
                                        const bool *removed,
                                        const unsigned char *contact,
                                        const mho_place *place, mho_pi *pi,
                                        mho_texts *notes, mho_error *error);
void mho_pi_clear(mho_pi *pi);

/* Fills strength, rotatable, twist_deg, reason and kind of the bonds.
 * Errors: MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_pi_find_bonds(const mho_graph *graph, mho_pi *pi,
                                          mho_error *error);

/* Size of the smallest ring (up to 8) through an atom whose atoms all carry p
 * orbitals, 0 if there is none. */
int mho_pi_ring_size(const mho_graph *graph, const mho_pi *pi, int atom);

/* Dihedral angle in degrees for a single bond that joins two pi fragments,
 * and what the estimate rests on (in torsion.c). */
double mho_torsion_estimate(const mho_graph *graph, const mho_pi *pi,
                            const int atom[2], const char **reason);

/* Name of the torsion potential of such a bond, or NULL where there is none. */
const char *mho_torsion_kind(const mho_graph *graph, const mho_pi *pi, const int atom[2]);

#endif
