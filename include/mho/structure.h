/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * From a structure as a chemist draws it to a molecule of the model: pi
 * sites and their rows, electrons, contacts, twists, bond alternation.
 */
#ifndef MHOLECULE_STRUCTURE_H
#define MHOLECULE_STRUCTURE_H

#include <mho/graph.h>
#include <mho/linker.h>
#include <mho/molecule.h>
#include <mho/warning.h>

/* What an alkyl group does to the pi system: nothing; h of the carbon that
 * bears it shifts by -0.5; or it is a site of its own with h 2.0, k 0.7 and
 * two electrons (A. Streitwieser, 1961, values from memory). */
typedef enum {
  MHO_ALKYL_IGNORED,
  MHO_ALKYL_INDUCTIVE,
  MHO_ALKYL_HETEROATOM
} mho_alkyl;

/* Acyclic C-C bonds with k = 0.9 and 1.1 where every Kekule structure has
 * them single and double, or all with k = 1. */
typedef enum { MHO_ALTERNATION_FORMAL, MHO_ALTERNATION_NONE } mho_alternation;

/* Hopping of a C-C bond from the parameter set and the alternation, or from
 * its length: beta(r) = beta exp[-(r - 1.397 A)/0.2623 A] (J. Phys. Org. Chem.
 * 2020, poc.4153), which needs coordinates in space. */
typedef enum { MHO_HOPPING_TABLE, MHO_HOPPING_BOND_LENGTH } mho_hopping;

/* A dihedral angle that replaces the estimate; atoms by name, `C5`. */
typedef struct {
  const char *atom[2];
  double angle_deg;
} mho_twist_setting;

typedef struct {
  const mho_parameter_set *parameters;
  double beta_ev;
  mho_alkyl alkyl;
  mho_alternation alternation;
  mho_hopping hopping;
  double coupling_ev; /* of both contacts; 0 takes each linker's default */
  int charge;         /* on top of the charges that are drawn */
  int twist_count;
  const mho_twist_setting *twist;
  bool contacts_optional; /* without two linkers: no contacts, a note */
  bool quiet;             /* no notes, for long lists */
  mho_place place;        /* of the text, for messages */
} mho_structure_options;

/* What was understood on the way. */
typedef struct {
  mho_graph graph;
  int linker_count;
  mho_linker *linker;
  int *site_atom;   /* [site_count] atom of each site */
  mho_texts notes;  /* rules and estimates that the result rests on */
  unsigned warnings; /* MHO_WARN_METAL, _UNIFORM_BONDS, _NO_PI_PATH,
                        _DIFFERENT_FRAGMENTS */
} mho_structure;

MHO_BEGIN_DECLARATIONS

/* Van-Catledge's parameters, the default beta, no alkyl groups, formal
 * alternation, couplings of the linkers, contacts required. */
MHO_API void mho_structure_options_init(mho_structure_options *options);

MHO_API void mho_structure_init(mho_structure *structure);
MHO_API void mho_structure_clear(mho_structure *structure);

/* Reads a SMILES into an initialised molecule and structure, which the caller
 * clears, also after a failure.  Atom classes 1 and 2 mark the contacts, else
 * two linkers serve.  Sites are called by their atoms (`C5`).  The molecule
 * gets the text as its name where it has none; its electrons are explicit,
 * and its charge is what is drawn on the sites plus options->charge.
 * options may be NULL.  Errors: MHO_ERR_SYNTAX, MHO_ERR_LIMIT,
 * MHO_ERR_UNPARAMETERISED, MHO_ERR_CONTACTS, MHO_ERR_REFERENCE (a twist's
 * bond), MHO_ERR_RANGE, MHO_ERR_MEMORY. */
MHO_API MHO_MUST_USE mho_status mho_structure_read_smiles(
    const char *text, const mho_structure_options *options,
    mho_molecule *molecule, mho_structure *structure, mho_error *error);

/* The same for structure->graph, however it was read.  Of separate parts only
 * the largest conjugated one is taken, unless atom classes mark contacts in
 * several.  With coordinates in space, rotatable bonds have their dihedral
 * angles.  Errors besides: MHO_ERR_REFERENCE (hopping from lengths, and there
 * are no coordinates). */
MHO_API MHO_MUST_USE mho_status mho_molecule_from_graph(
    mho_structure *structure, const mho_structure_options *options,
    mho_molecule *molecule, mho_error *error);

MHO_END_DECLARATIONS

#endif
