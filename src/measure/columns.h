/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * What the columns of a trace file hold.
 */
#ifndef MHOLECULE_MEASURE_COLUMNS_H
#define MHOLECULE_MEASURE_COLUMNS_H

#include <mho/traces.h>

typedef struct {
  int count;             /* columns of a line */
  int value, x, number;  /* their indices, -1 for none */
  mho_trace_quantity quantity;
  double value_scale;    /* to G0, S, A */
  mho_abscissa abscissa;
  double x_scale;        /* to nm or s */
} mho_columns;

/* Reads names that a separator (`,`, `;`, tab, or blank for blanks) parts.
 * `line` is where they stand, 0 for the option.
 * Errors: MHO_ERR_KEY, MHO_ERR_UNIT, MHO_ERR_LIMIT. */
MHO_MUST_USE mho_status mho_columns_named(mho_columns *columns, const char *text,
                                          size_t size, char separator,
                                          mho_abscissa wanted, const char *path,
                                          long line, mho_error *error);

/* Columns that no header names. */
MHO_MUST_USE mho_status mho_columns_guess(mho_columns *columns, int count,
                                          const mho_trace_options *options,
                                          const char *path, long line,
                                          mho_error *error);

/* Separator of a line: the first of `;`, `,`, tab in it, else a blank. */
char mho_columns_separator(const char *text, size_t size);

#endif
