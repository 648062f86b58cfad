/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Lists of molecules: `.smi` (SMILES, blank, name) and CSV with a header.
 */
#ifndef MHOLECULE_MOLECULE_LIST_H
#define MHOLECULE_MOLECULE_LIST_H

#include <mho/graph.h>

/* Largest list that is read, in bytes. */
#define MHO_LIST_LIMIT ((size_t)1 << 29)

typedef struct mho_list mho_list;

typedef struct {
  const char *smiles; /* NULL at the end of the list */
  const char *name;   /* "" where there is none; UTF-8 */
  mho_place place;    /* of the SMILES; columns count characters */
} mho_list_row;

/* Reads a file; CSV (`,` `;` or tab, quotes after RFC 4180) where its name
 * ends in .csv or .tsv, else .smi.  A byte order mark, CR LF and trailing
 * blanks are no part of the text; blank lines, lines that begin with # and a
 * header line `SMILES ...` of a .smi are passed over.  In a CSV the column
 * `smiles` (any case) is needed, and `name`, `id`, `title` or `molecule` names
 * the rows.  Errors: MHO_ERR_FILE, MHO_ERR_LIMIT, MHO_ERR_SYNTAX (encoding),
 * MHO_ERR_KEY (no SMILES column), MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_list_open(const char *path, mho_list **list,
                                      mho_error *error);
void mho_list_close(mho_list *list);

/* The next row; its texts live until the list is closed.  A bad row is
 * MHO_ERR_SYNTAX with its line and column; the one after it can be asked for
 * as if nothing had happened.  At the end MHO_OK and row->smiles NULL. */
MHO_MUST_USE mho_status mho_list_next(mho_list *list, mho_list_row *row,
                                      mho_error *error);

#endif
