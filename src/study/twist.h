/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The question "how flat must it be?" as the command line and a study ask it.
 */
#ifndef MHOLECULE_STUDY_TWIST_H
#define MHOLECULE_STUDY_TWIST_H

#include <mho/twist.h>

#include "input/options.h"
#include "report/table.h"

typedef struct {
  mho_option_list bond; /* none: the only one that can turn; or `all` */
  mho_option_range angles, energies;
  mho_option_count samples;
  mho_option_quantity at;
  bool map;     /* T against angle and energy, or against two angles */
  bool average; /* over the thermal motion; also where a torsion is given */
  mho_option_text torsion; /* "": of the molecule file, else of the kind of bond */
} mho_twist_question;

const mho_option *mho_twist_options(size_t *count);

/* What is wrong with options that exclude each other, or NULL; a study may ask
 * for several tables at once. */
const char *mho_twist_conflict(const mho_twist_question *question, bool one_table);

/* The bonds that turn together, and what they are called. */
typedef struct {
  int count, bond[MHO_TWIST_BONDS_MAX];
  char *name; /* owned; MHO_TWIST_BONDS_MAX names may be long */
} mho_twist_bonds;

/* Errors: MHO_ERR_REFERENCE, in `reason` what is wrong and what can turn;
 * MHO_ERR_MEMORY.  Clear, also after a failure. */
MHO_MUST_USE mho_status mho_twist_choose(const mho_twist_question *question,
                                         const mho_molecule *molecule, mho_twist_bonds *bonds,
                                         char *reason, size_t size);
void mho_twist_bonds_clear(mho_twist_bonds *bonds);

/* Potential torsion[MHO_TWIST_AVERAGE_BONDS_MAX] of each bond; their names in
 * one text, which the caller frees.  Errors: MHO_ERR_SIZE (too many bonds),
 * MHO_ERR_REFERENCE (no potential is known), those of mho_torsion_read. */
MHO_MUST_USE mho_status mho_twist_potentials(const mho_twist_question *question,
                                             const mho_molecule *molecule,
                                             const mho_twist_bonds *bonds, mho_torsion *torsion,
                                             char **names, mho_error *error);

/* Does any bond turn? */
bool mho_twist_applies(const mho_molecule *molecule);

enum { MHO_TWIST_SWEEP = 1, MHO_TWIST_MAP = 2, MHO_TWIST_AVERAGE = 4 };

/* Fills the tables of `parts` in output, opened where they are not yet there,
 * and what they say as notes of `words` (may be output; NULL: none).  With
 * words and a sweep limit_deg[2] (may be NULL) are the angles within which the
 * conductance keeps 80 % and half of its planar value. */
MHO_MUST_USE mho_status mho_twist_answer(const mho_twist_question *question,
                                         const mho_molecule *molecule,
                                         const mho_junction *junction,
                                         const mho_twist_bonds *bonds, int parts,
                                         mho_output *output, mho_output *words,
                                         double *limit_deg, mho_error *error);

#endif
