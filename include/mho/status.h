/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Status codes and the error object.
 *
 * Every function that can fail returns a mho_status.  Where it happened (file,
 * line, column, field) and what is allowed goes into a mho_error that the
 * caller owns; passing NULL is allowed and drops the details.  An error object
 * collects up to MHO_ERROR_CAPACITY causes, so a reader can report every
 * mistake of a file at once.
 */
#ifndef MHOLECULE_STATUS_H
#define MHOLECULE_STATUS_H

#include <stdbool.h>
#include <stddef.h>

#include <mho/version.h>

/* X(code, text, input): input is true where the user's input is at fault. */
#define MHO_STATUS_LIST(X)                                                     \
  X(MHO_OK, "done", false)                                                     \
  X(MHO_ERR_USAGE, "the command line is not understood", true)                 \
  X(MHO_ERR_FILE, "a file cannot be read", true)                               \
  X(MHO_ERR_SYNTAX, "the text does not follow the grammar of its format", true)\
  X(MHO_ERR_KEY, "a key is unknown, missing or given twice", true)             \
  X(MHO_ERR_UNIT, "a quantity lacks its unit or has one of another kind", true)\
  X(MHO_ERR_RANGE, "a value lies outside the range that is allowed", true)     \
  X(MHO_ERR_REFERENCE, "a name does not refer to anything", true)              \
  X(MHO_ERR_LIMIT, "the input is larger than the limit", true)                 \
  X(MHO_ERR_UNPARAMETERISED, "the parameter set has no value for this", true)  \
  X(MHO_ERR_FRONTIER, "the frontier is open or partly filled", true)           \
  X(MHO_ERR_CONTACTS, "the molecule does not have two contacts", true)         \
  X(MHO_ERR_SIZE, "an array has the wrong size", false)                        \
  X(MHO_ERR_MEMORY, "out of memory", false)                                    \
  X(MHO_ERR_WRITE, "a file cannot be written", false)                          \
  X(MHO_ERR_LINEAR_ALGEBRA, "a linear algebra routine failed", false)          \
  X(MHO_ERR_NOT_FINITE, "a result is not a finite number", false)              \
  X(MHO_ERR_NOT_CONVERGED, "an iteration did not converge", false)             \
  X(MHO_ERR_CANCELLED, "interrupted", false)

typedef enum {
#define MHO_STATUS_CODE(code, text, input) code,
  MHO_STATUS_LIST(MHO_STATUS_CODE)
#undef MHO_STATUS_CODE
} mho_status;

#define MHO_ERROR_CAPACITY 10

typedef struct {
  mho_status status;
  char stage[16];    /* part of the library that found it, e.g. "input" */
  char file[512];    /* as the caller named it; empty when there is none */
  long line, column; /* from 1; 0 when there is none */
  char field[64];    /* key, option or argument; empty when there is none */
  char message[512]; /* what is wrong; what is allowed */
} mho_cause;

typedef struct {
  int count;      /* causes held */
  int suppressed; /* causes beyond the capacity */
  mho_cause cause[MHO_ERROR_CAPACITY];
} mho_error;

MHO_BEGIN_DECLARATIONS

/* One sentence for a code; never NULL. */
MHO_API const char *mho_status_text(mho_status status);

/* True where the user's input caused it (the command then exits with 2). */
MHO_API bool mho_status_is_input(mho_status status);

/* Empties an error object.  The caller holds it, usually on the stack. */
MHO_API void mho_error_init(mho_error *error);

/* Adds a cause and returns its status, so that a function can end with
 * `return mho_fail(error, MHO_ERR_RANGE, "model", "angle", "...")`.
 * error may be NULL. */
MHO_API mho_status mho_fail(mho_error *error, mho_status status,
                            const char *stage, const char *field,
                            const char *format, ...) MHO_PRINTF(5, 6);

/* The same, at a place in a file (line and column from 1; 0 for none). */
MHO_API mho_status mho_fail_at(mho_error *error, mho_status status,
                               const char *stage, const char *file, long line,
                               long column, const char *field,
                               const char *format, ...) MHO_PRINTF(8, 9);

/* Writes one line `file:line:column: message` (or what of it exists) without
 * a line end; returns the length as snprintf does. */
MHO_API int mho_cause_format(const mho_cause *cause, char *buffer, size_t size);

MHO_END_DECLARATIONS

#endif
