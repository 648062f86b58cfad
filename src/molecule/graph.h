/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * How a reader builds a molecular graph.
 */
#ifndef MHOLECULE_MOLECULE_GRAPH_H
#define MHOLECULE_MOLECULE_GRAPH_H

#include <mho/graph.h>

#define MOLECULE_STAGE "molecule"

/* Room for a graph of that size. */
MHO_MUST_USE mho_status mho_graph_reserve(mho_graph *graph, int atoms,
                                          int bonds);

/* Fills start and link from the bonds. */
void mho_graph_link_atoms(mho_graph *graph);

/* Atoms and bonds are in place (aromatic bonds with order 1): finds
 * neighbours and rings, gives aromatic bonds their orders and atoms their
 * hydrogens and radicals.  Errors: MHO_ERR_SYNTAX, MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_graph_complete(mho_graph *graph,
                                           const mho_place *place,
                                           mho_error *error);

/* The second half of it, in kekule.c. */
MHO_MUST_USE mho_status mho_graph_kekulise(mho_graph *graph,
                                           const mho_place *place,
                                           mho_error *error);

/* Adds a cause at a column of a text; the message begins `column 7: `.  For a
 * record of a file it stands at the record. */
mho_status mho_fail_column(mho_error *error, mho_status status,
                           const mho_place *place, long column,
                           const char *format, ...) MHO_PRINTF(5, 6);

/* The same at an atom, in a record at the atom's own line. */
mho_status mho_fail_atom(mho_error *error, mho_status status,
                         const mho_place *place, const mho_graph *graph,
                         int atom, const char *format, ...) MHO_PRINTF(6, 7);

#endif
