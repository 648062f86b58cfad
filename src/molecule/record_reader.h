/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * What the readers of the formats share: the lines of one record.
 */
#ifndef MHOLECULE_MOLECULE_RECORD_READER_H
#define MHOLECULE_MOLECULE_RECORD_READER_H

#include "molecule/graph.h"

typedef struct {
  const char *at, *end; /* of the record */
  long number;          /* of the current line in the file, from 1 */
  const char *line;     /* current line, without its end and trailing blanks */
  int length;
  const mho_place *place; /* of the record */
  mho_graph *graph;
  mho_texts *notes; /* or NULL */
  mho_error *error;
} mho_record_reader;

/* Goes to the next line; false at the end of the record, where the line is
 * empty. */
bool mho_record_line(mho_record_reader *r);

/* Adds a cause at a column of the current line. */
mho_status mho_record_fail(mho_record_reader *r, mho_status status, int column,
                           const char *format, ...) MHO_PRINTF(4, 5);

/* A whole number, blank for 0, in the columns [start, start + width) from 0;
 * a line may be shorter.  False where something else stands there. */
bool mho_record_integer(const mho_record_reader *r, int start, int width, int *value);

/* The same for a decimal number, which must be there and finite. */
bool mho_record_decimal(const char *text, int length, double *value);

/* Element of a symbol as files have it (D and T are hydrogen); *isotope may be
 * set.  Errors: MHO_ERR_UNPARAMETERISED for R-groups and query atoms,
 * MHO_ERR_SYNTAX. */
MHO_MUST_USE mho_status mho_record_element(mho_record_reader *r, const char *symbol,
                                           int length, int column,
                                           mho_graph_atom *atom);

/* Adds a bond between atoms counted from 1, of a type of the CTfile formats. */
MHO_MUST_USE mho_status mho_record_bond(mho_record_reader *r, int type, int first,
                                        int second, int column);

/* Charge, radical (CTfile: 1 singlet, 2 doublet, 3 triplet) and valence (0
 * none, 15 or -1 zero) of atoms, kept until the bonds are known. */
typedef struct {
  int radical, valence;
} mho_record_state;

/* Coordinates, valences, neighbours, Kekule structure.  state[atoms]; spatial:
 * the file says that it has coordinates in space, as z tells otherwise. */
MHO_MUST_USE mho_status mho_record_complete(mho_record_reader *r,
                                            const mho_record_state *state,
                                            bool spatial);

/* The counts line has been read: the rest of the record. */
MHO_MUST_USE mho_status mho_molfile_v2000(mho_record_reader *r, bool spatial);
MHO_MUST_USE mho_status mho_molfile_v3000(mho_record_reader *r, bool spatial);
MHO_MUST_USE mho_status mho_xyz_read(mho_record_reader *r);

#endif
