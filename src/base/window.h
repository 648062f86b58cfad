/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * A file that is read forwards: memory holds what is being looked at, however
 * large the file is.
 */
#ifndef MHOLECULE_BASE_WINDOW_H
#define MHOLECULE_BASE_WINDOW_H

#include <stdio.h>

#include <mho/status.h>

typedef struct {
  FILE *file;
  char *path, *text;
  char *at, *end;  /* what is left of the window; *end is NUL */
  size_t capacity, limit;
  const char *stage;
  bool at_end; /* nothing follows the window */
} mho_window;

/* Opens a regular file and reads the first piece; at most `limit` bytes are
 * held at a time.  The caller closes, also after a failure.
 * Errors: MHO_ERR_FILE, MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_window_open(mho_window *window, const char *path, size_t limit,
                                        const char *stage, mho_error *error);
void mho_window_close(mho_window *window);

/* Reads a further piece behind `end` and forgets what lies before `at`, which
 * moves.  Not to be called at_end.  Errors: MHO_ERR_LIMIT without a cause (the
 * window is full), MHO_ERR_FILE and MHO_ERR_MEMORY, after which it is at_end. */
MHO_MUST_USE mho_status mho_window_more(mho_window *window, mho_error *error);

#endif
