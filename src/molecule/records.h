/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Files of structures, record by record: MDL molfiles V2000 and V3000 (one, or
 * many in an SDF) and XYZ.  The formats: Dassault Systemes, CTfile Formats
 * (2020); XYZ as common practice has it (atom count, comment, symbol and
 * coordinates in angstrom), many frames being many records.
 */
#ifndef MHOLECULE_MOLECULE_RECORDS_H
#define MHOLECULE_MOLECULE_RECORDS_H

#include <mho/graph.h>

typedef struct mho_records mho_records;

typedef struct {
  long number;      /* from 1; 0 at the end of the file */
  const char *name; /* "" where there is none; UTF-8; until the next record */
  mho_place place;  /* of its first line */
} mho_record;

/* .mol, .sdf, .sd, .mdl or .xyz, in any case. */
bool mho_records_is_file_name(const char *path);

/* Opens a file, of which a record is held at a time.  Errors: MHO_ERR_FILE,
 * MHO_ERR_SYNTAX (encoding, an empty file), MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_records_open(const char *path, mho_records **records,
                                         mho_error *error);
void mho_records_close(mho_records *records);

/* Reads the next record into an initialised graph; notes (or NULL) say what
 * was done.  A bad record is an error with its line and column; the one after
 * it can be asked for as if nothing had happened.  Errors: MHO_ERR_SYNTAX,
 * MHO_ERR_LIMIT, MHO_ERR_UNPARAMETERISED (R-groups, query atoms), MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_records_next(mho_records *records, mho_graph *graph,
                                         mho_record *record, mho_texts *notes,
                                         mho_error *error);

/* Passes over the next record without reading it; record->number as above. */
void mho_records_skip(mho_records *records, mho_record *record);

#endif
