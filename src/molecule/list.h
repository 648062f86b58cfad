/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Lists of molecules: `.smi` (SMILES, blank, name) and CSV with a header.
 */
#ifndef MHOLECULE_MOLECULE_LIST_H
#define MHOLECULE_MOLECULE_LIST_H

#include <mho/graph.h>

/* Longest row, in bytes; a list may be of any length. */
#define MHO_LIST_ROW_LIMIT ((size_t)1 << 20)

typedef struct mho_list mho_list;

typedef struct {
  const char *smiles; /* NULL at the end of the list */
  const char *name;   /* "" where there is none; UTF-8 */
  mho_place place;    /* of the SMILES; columns count characters */
} mho_list_row;

/* Opens a file, of which a row is held at a time; CSV (`,` `;` or tab, quotes after RFC 4180) where its name
 * ends in .csv or .tsv, else .smi.  A byte order mark, CR LF and trailing
 * blanks are no part of the text; blank lines, lines that begin with # and a
 * header line `SMILES ...` of a .smi are passed over.  In a CSV the column
 * `smiles` (any case) is needed, and `name`, `id`, `title` or `molecule` names
 * the rows.  Errors: MHO_ERR_FILE, MHO_ERR_SYNTAX (encoding),
 * MHO_ERR_KEY (no SMILES column), MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_list_open(const char *path, mho_list **list,
                                      mho_error *error);
void mho_list_close(mho_list *list);

/* The next row; its texts live until the next call.  A bad row is
 * MHO_ERR_SYNTAX with its line and column; the one after it can be asked for
 * as if nothing had happened: it begins on the next line, also where a quote
 * was left open.  At the end MHO_OK and row->smiles NULL.  MHO_ERR_FILE: the
 * file cannot be read further, and the list is at its end. */
MHO_MUST_USE mho_status mho_list_next(mho_list *list, mho_list_row *row,
                                      mho_error *error);

#endif
