/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Linkers: the groups by which a molecule binds to a gold electrode.
 */
#ifndef MHOLECULE_LINKER_H
#define MHOLECULE_LINKER_H

#include <mho/graph.h>

/* X(code, name, coupling in eV): the full width Gamma that a linker gives its
 * contact.  Common practice: the values put the oligophenyl diamines at their
 * measured conductances with the Fermi level at alpha; thiolate and
 * thioacetate bind as the thiol does. */
#define MHO_LINKER_LIST(X)             \
  X(THIOL, "thiol", 1.0)               \
  X(THIOLATE, "thiolate", 1.0)         \
  X(THIOACETATE, "thioacetate", 1.0)   \
  X(THIOETHER, "thioether", 1.0)       \
  X(AMINE, "amine", 1.0)               \
  X(PYRIDINE, "pyridine", 0.3)         \
  X(NITRILE, "nitrile", 0.3)           \
  X(ISONITRILE, "isonitrile", 0.5)     \
  X(CARBOXYL, "carboxyl", 0.5)         \
  X(NITRO, "nitro", 0.5)               \
  X(ETHYNYL, "ethynyl", 0.5)           \
  X(GOLD_CARBON, "gold-carbon", 0.5)

typedef enum {
#define MHO_LINKER_CODE(code, name, coupling) MHO_LINKER_##code,
  MHO_LINKER_LIST(MHO_LINKER_CODE)
#undef MHO_LINKER_CODE
  MHO_LINKER_KINDS /* none of them */
} mho_linker_kind;

/* Atoms that touch the electrode: two oxygens of carboxyl and nitro, else
 * one. */
typedef struct {
  mho_linker_kind kind;
  int atom_count;
  int atom[2];
} mho_linker;

MHO_BEGIN_DECLARATIONS

/* `thiol`, `amine` ...; `other` for MHO_LINKER_KINDS. */
MHO_API const char *mho_linker_name(mho_linker_kind kind);

/* Default Gamma in eV. */
MHO_API double mho_linker_coupling_ev(mho_linker_kind kind);

MHO_END_DECLARATIONS

#endif
