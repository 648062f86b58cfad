/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * A growing text.  Running out of memory is remembered, so that a writer
 * checks once at its end.
 */
#ifndef MHOLECULE_BASE_BUFFER_H
#define MHOLECULE_BASE_BUFFER_H

#include <mho/status.h>

typedef struct {
  char *data; /* NUL-terminated once anything was added */
  size_t size, capacity;
  bool failed;
} mho_buffer;

void mho_buffer_clear(mho_buffer *buffer);
void mho_buffer_add(mho_buffer *buffer, const char *text);
void mho_buffer_add_bytes(mho_buffer *buffer, const char *data, size_t size);
void mho_buffer_print(mho_buffer *buffer, const char *format, ...) MHO_PRINTF(2, 3);

/* A number without the locale (see mho_number_write). */
void mho_buffer_number(mho_buffer *buffer, int digits, double value);

/* Text with the five characters that HTML and XML reserve written as entities. */
void mho_buffer_escape(mho_buffer *buffer, const char *text);

/* MHO_ERR_MEMORY if any addition failed. */
MHO_MUST_USE mho_status mho_buffer_check(const mho_buffer *buffer, const char *stage,
                                         mho_error *error);

/* Writes to a path by way of a temporary file beside it and a rename, so that
 * the file is either the old or the whole new one.  Errors: MHO_ERR_WRITE. */
MHO_MUST_USE mho_status mho_buffer_save(const mho_buffer *buffer, const char *path,
                                        const char *stage, mho_error *error);

#endif
