/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The molecular graph as a chemist draws it: atoms, bonds, rings and one
 * Kekule structure.  Readers of SMILES and of files fill it.
 */
#ifndef MHOLECULE_GRAPH_H
#define MHOLECULE_GRAPH_H

#include <mho/status.h>

/* Largest input: characters of one SMILES, atoms of one graph. */
enum { MHO_SMILES_LIMIT = 65536, MHO_ATOM_LIMIT = 10000 };

typedef struct {
  int element;    /* atomic number; 0 for the wildcard `*` */
  int isotope;    /* mass number, 0 where none is given */
  int charge;
  int hydrogens;  /* attached and not atoms of their own */
  int radical;    /* valences left open */
  int atom_class; /* 0 where none is given */
  bool aromatic;  /* as written */
  bool bracket;   /* hydrogens are as written, none is implied */
  long line;      /* in its file; 0 in a SMILES */
  long column;    /* of its first character in the text, from 1 */
} mho_graph_atom;

typedef struct {
  int atom[2];
  int order;     /* 1 to 4, in one Kekule structure */
  bool aromatic; /* as written */
  bool ring;     /* lies in a ring */
} mho_graph_bond;

/* One end of a bond as its other atom sees it. */
typedef struct {
  int atom, bond;
} mho_graph_link;

typedef struct {
  int atom_count, bond_count;
  mho_graph_atom *atom;
  mho_graph_bond *bond;
  int *start;           /* [atom_count + 1] into link */
  mho_graph_link *link; /* [2 * bond_count], in the order of the bonds */
  double (*position)[3]; /* [atom_count] in angstrom where the structure is_3d,
                            in the units of a drawing where not; or NULL */
  bool is_3d;
} mho_graph;

/* Where a text stands: file (or NULL), and line and column of its first
 * character (0 where there is none). */
typedef struct {
  const char *file;
  long line, column;
  bool record; /* of a file of structures: atoms have lines of their own */
} mho_place;

/* Texts that a result owns: notes, warnings. */
typedef struct {
  int count;
  char **text;
} mho_texts;

MHO_BEGIN_DECLARATIONS

/* An empty graph; clear frees what it owns. */
MHO_API void mho_graph_init(mho_graph *graph);
MHO_API void mho_graph_clear(mho_graph *graph);

/* Reads a SMILES (OpenSMILES 1.0, all of its grammar) into an initialised
 * graph; stereochemistry is read and dropped.  Aromatic bonds receive orders
 * by a maximum matching on the general graph (J. Edmonds, Can. J. Math. 17,
 * 449 (1965)).  A cause gives file, line and column where place has them, and
 * the column in the SMILES in its message.  The graph is empty on failure.
 * place and error may be NULL.
 * Errors: MHO_ERR_SYNTAX, MHO_ERR_LIMIT, MHO_ERR_MEMORY. */
MHO_API MHO_MUST_USE mho_status mho_smiles_read(const char *text,
                                                const mho_place *place,
                                                mho_graph *graph,
                                                mho_error *error);

/* `C`, `Au` ...; `*` for 0; NULL outside the periodic table. */
MHO_API const char *mho_element_symbol(int element);

/* Name of an atom: element and position in the input from 1, `C5`. */
MHO_API int mho_graph_atom_name(const mho_graph *graph, int atom, char *buffer,
                                size_t size);

/* Hydrogens of an atom, those written as atoms included; bonded neighbours
 * of other elements. */
MHO_API int mho_graph_hydrogens(const mho_graph *graph, int atom);
MHO_API int mho_graph_degree(const mho_graph *graph, int atom);

/* Connected parts; independent rings (bonds - atoms + parts).  -1 without
 * memory. */
MHO_API int mho_graph_parts(const mho_graph *graph);
MHO_API int mho_graph_rings(const mho_graph *graph);

/* Formula in the order of E. A. Hill (C, H, then the alphabet) with the
 * charge, `C6H8N2`; length as snprintf gives it. */
MHO_API int mho_graph_formula(const mho_graph *graph, char *buffer,
                              size_t size);

MHO_END_DECLARATIONS

#endif
