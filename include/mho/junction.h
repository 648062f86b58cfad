/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * A junction: the numbers of a molecule between two contacts.
 *
 *   H_ii = eps_i,  H_ij = t_ij cos(theta_ij)      real symmetric
 *   Sigma_side = sum_c (shift_c - i Gamma_c/2) v_c v_c^T    wide band, or a chain
 *
 * A contact of independent channels has one unit vector a site; a contact of
 * one channel has the amplitudes of its sites as its only vector.
 */
#ifndef MHOLECULE_JUNCTION_H
#define MHOLECULE_JUNCTION_H

#include <mho/molecule.h>
#include <mho/status.h>

typedef struct {
  int channels;        /* 0 where the molecule has no such contact */
  double *coupling_ev; /* Gamma_c [channels] */
  double *shift_ev;    /* [channels] */
  double *vector;      /* v_c, [channels][sites] */
  /* NULL: wide band.  Else every channel has such a chain, and coupling_ev and
   * shift_ev are not used.  A junction has a copy of its own. */
  const mho_chain_electrode *chain;
} mho_lead;

typedef struct {
  int sites;
  double *hamiltonian_ev; /* [sites*sites] */
  double *level_ev;       /* eigenvalues of the bare molecule, ascending */
  double *orbital;        /* eigenvectors, column k belongs to level k */
  int electrons;
  bool has_homo, has_lumo;
  bool open_shell; /* odd electrons, or a degenerate frontier partly filled */
  double homo_ev, lumo_ev;
  double fermi_ev; /* resolved once, on the scale of alpha */
  double temperature_k;
  mho_lead lead[2]; /* MHO_LEFT, MHO_RIGHT */
} mho_junction;

MHO_BEGIN_DECLARATIONS

/* Builds the Hamiltonian, its levels and the leads, and resolves the Fermi
 * level.  Contacts may be missing (then their lead has no channels); see
 * mho_junction_require_contacts.  The caller clears the result, also after a
 * failure.
 * Errors: MHO_ERR_FRONTIER (the Fermi level is given by a frontier that is
 * open, partly filled or absent), MHO_ERR_MEMORY, MHO_ERR_LINEAR_ALGEBRA. */
MHO_API MHO_MUST_USE mho_status mho_junction_build(const mho_molecule *molecule,
                                                   mho_junction *junction,
                                                   mho_error *error);

/* The same for a Hamiltonian of one's own: hamiltonian_ev[sites*sites] real
 * symmetric, leads with vectors of that length (copied; NULL for none), and
 * the Fermi level as an energy.  Errors: MHO_ERR_SIZE (sites, electrons),
 * MHO_ERR_NOT_FINITE (an entry; or the matrix is not symmetric),
 * MHO_ERR_MEMORY, MHO_ERR_LINEAR_ALGEBRA. */
MHO_API MHO_MUST_USE mho_status mho_junction_from_hamiltonian(
    int sites, const double *hamiltonian_ev, int electrons, double fermi_ev,
    const mho_lead *left, const mho_lead *right, mho_junction *junction,
    mho_error *error);
MHO_API void mho_junction_clear(mho_junction *junction);

/* MHO_ERR_CONTACTS unless both contacts exist; the message names the molecule. */
MHO_API MHO_MUST_USE mho_status mho_junction_require_contacts(
    const mho_junction *junction, const mho_molecule *molecule,
    mho_error *error);

/* MHO_ERR_RANGE where a contact of the molecule is a chain and `what` (`--poles`,
 * `a screening` ...) needs a wide band; the message says where the file gives it. */
MHO_API MHO_MUST_USE mho_status mho_molecule_require_wide_band(
    const mho_molecule *molecule, const char *what, mho_error *error);

/* *connected is true if some chain of non-zero hoppings joins the contacts.
 * Errors: MHO_ERR_MEMORY. */
MHO_API MHO_MUST_USE mho_status mho_junction_is_connected(
    const mho_junction *junction, bool *connected, mho_error *error);

MHO_END_DECLARATIONS

#endif
