/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Tables: what every stage's result becomes before it is written.  Columns
 * carry their unit in the name.  Cells are added row by row; a cell that is
 * not finite, or memory that runs out, is remembered and refused by every
 * writer, so that no such number leaves the library.
 */
#ifndef MHOLECULE_REPORT_TABLE_H
#define MHOLECULE_REPORT_TABLE_H

#include <mho/status.h>

#include "base/buffer.h"

typedef enum {
  MHO_CELL_EMPTY,
  MHO_CELL_NUMBER,
  MHO_CELL_INTEGER,
  MHO_CELL_TEXT,
  MHO_CELL_NODE /* a transmission that is exactly zero */
} mho_cell_kind;

typedef struct {
  mho_cell_kind kind;
  double number;
  long integer;
  char *text;
} mho_cell;

typedef struct {
  const char *name;          /* static text */
  const char *const *column; /* static texts */
  size_t columns, cells, capacity;
  mho_cell *cell; /* [rows][columns] */
  unsigned left; /* bits of the columns, beside the first, that are set to the left for the eye */
  mho_status failed;
} mho_table;

/* A warning of one molecule, and remarks that belong to the whole output. */
typedef struct {
  char *molecule;
  unsigned warnings;
} mho_molecule_warning;

/* Everything one command has to say. */
typedef struct {
  mho_table *table;
  size_t tables;
  mho_molecule_warning *warning;
  size_t warnings;
  char **note;
  size_t notes;
  bool failed; /* out of memory */
} mho_output;

void mho_output_clear(mho_output *output);

/* A new table of the output, or NULL (and output->failed).  The pointer holds
 * until the next call. */
mho_table *mho_output_table(mho_output *output, const char *name,
                            const char *const *column, size_t columns);
void mho_output_warn(mho_output *output, const char *molecule, unsigned warnings);
void mho_output_note(mho_output *output, const char *format, ...) MHO_PRINTF(2, 3);

void mho_table_number(mho_table *table, double value);
void mho_table_optional(mho_table *table, bool present, double value);
void mho_table_integer(mho_table *table, long value);
void mho_table_text(mho_table *table, const char *text);
void mho_table_node(mho_table *table);
void mho_table_empty(mho_table *table);
size_t mho_table_rows(const mho_table *table);

/* MHO_OK, or what went wrong while the output was built. */
MHO_MUST_USE mho_status mho_output_check(const mho_output *output, mho_error *error);

/* Words of a set of warnings, joined by blanks. */
void mho_write_warning_words(mho_buffer *buffer, unsigned warnings);

/* Writers; digits is 6, or 17 for exact.  JSON always has 17. */
MHO_MUST_USE mho_status mho_write_csv(const mho_table *table, int digits,
                                      mho_buffer *buffer, mho_error *error);
MHO_MUST_USE mho_status mho_write_json(const mho_output *output, mho_buffer *buffer,
                                       mho_error *error);

/* For the eye: a grid, or one block a row where the grid is wider than
 * `width` characters; then notes, then warnings in words. */
MHO_MUST_USE mho_status mho_write_screen(const mho_output *output, int digits, int width,
                                         mho_buffer *buffer, mho_error *error);

#endif
