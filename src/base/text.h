/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Small helpers for text and files that every stage may use.
 */
#ifndef MHOLECULE_BASE_TEXT_H
#define MHOLECULE_BASE_TEXT_H

#include <mho/status.h>

/* Of count candidates the one nearest to word (Levenshtein distance at most a
 * third of its length, at least 1), or NULL. */
const char *mho_nearest_word(const char *word, const char *const *candidates,
                             size_t count);

/* The candidates as `a, b or c` in buffer; returns buffer. */
const char *mho_join_words(const char *const *candidates, size_t count,
                           char *buffer, size_t size);

/* A copy that the caller frees, or NULL without memory. */
MHO_MUST_USE char *mho_copy_text(const char *text);
MHO_MUST_USE char *mho_print_text(const char *format, ...) MHO_PRINTF(1, 2);

/* `name` as seen from the folder of the file `beside` (NULL: from here); the
 * caller frees it. */
MHO_MUST_USE char *mho_path_beside(const char *beside, const char *name);

/* Reads a whole regular file of at most limit bytes; *text is NUL-terminated
 * and the caller frees it.  Errors: MHO_ERR_FILE, MHO_ERR_LIMIT,
 * MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_read_file(const char *path, size_t limit,
                                      const char *stage, char **text,
                                      size_t *size, mho_error *error);

/* Length of the valid UTF-8 prefix of text. */
size_t mho_utf8_prefix(const char *text, size_t size);

#endif
