/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * What should I change?  Every single replacement of CH by N and every
 * substituent of a short table at every carbon that has a hydrogen to give,
 * the Fermi level held, each computed exactly.
 */
#ifndef MHOLECULE_MODIFY_H
#define MHOLECULE_MODIFY_H

#include <mho/junction.h>

/* A substituent: pi sites by their rows of the parameter set, the first one
 * bonded to the molecule; or a change of h at the carbon itself. */
typedef struct {
  const char *name, *source;
  const char *row[2];      /* NULL: no such site */
  bool replaces;           /* row[0] takes the place of the carbon */
  double inductive_h;      /* added to h of the carbon */
} mho_substituent;

typedef struct {
  int site;
  const mho_substituent *substituent;
  bool has_log;       /* false where the conductance is exactly zero */
  double log10_g0;    /* thermal, at the Fermi level */
  bool has_change;    /* false where it is zero before or after */
  double change_decades;
  bool has_window;    /* quantiles of the change over the alignment window */
  double window_low_decades, window_high_decades; /* 5 % and 95 % */
} mho_modification;

typedef struct {
  size_t count;
  mho_modification *row; /* largest |change| first; without one, by log10_g0 */
} mho_modifications;

MHO_BEGIN_DECLARATIONS

MHO_API const mho_substituent *mho_substituents(size_t *count);

/* Modifications at carbons with two bonds in the pi system that no contact
 * sits on.  A substituent whose rows the parameter set lacks is left out.  The
 * change is taken at each of 101 Fermi levels over +-window_ev before its
 * quantiles are.  Each change is a change of H in one row and column, so that one
 * Green's function an energy serves all of them; where that would miss 1e-8 of
 * the conductance, the changed molecule is computed by itself.  The caller clears the result, also after a failure.
 * Errors: MHO_ERR_RANGE (window), MHO_ERR_CONTACTS, MHO_ERR_MEMORY,
 * MHO_ERR_LINEAR_ALGEBRA. */
MHO_API MHO_MUST_USE mho_status mho_modify_rank(const mho_molecule *molecule,
                                                const mho_junction *junction,
                                                double window_ev,
                                                mho_modifications *result,
                                                mho_error *error);
MHO_API void mho_modifications_clear(mho_modifications *result);

MHO_END_DECLARATIONS

#endif
