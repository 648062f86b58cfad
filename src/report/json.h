/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Pieces of JSON that several writers share.  The functions return new
 * objects; jansson refuses numbers that are not finite.
 */
#ifndef MHOLECULE_REPORT_JSON_H
#define MHOLECULE_REPORT_JSON_H

#include <jansson.h>

#include "report/stages.h"
#include "report/table.h"

#define MHO_JSON_SCHEMA "mholecule-1"

/* A string; bytes that are not UTF-8 (in the name of a file) become '?'. */
json_t *mho_json_text(const char *text);

/* `object` with one more value, or NULL where anything before failed: a chain
 * of these ends in NULL if memory ran out anywhere.  Both take their arguments
 * over. */
MHO_MUST_USE json_t *mho_json_with(json_t *object, const char *key, json_t *value);
MHO_MUST_USE json_t *mho_json_append(json_t *list, json_t *value);

json_t *mho_json_tables(const mho_output *output);
json_t *mho_json_warnings(const mho_output *output);
json_t *mho_json_warning_words(unsigned warnings);
json_t *mho_json_notes(const mho_output *output);

/* {centre_eV, hopping_eV, joint_eV} */
json_t *mho_json_chain(const mho_chain_electrode *chain);

/* What was understood of molecules, as in `mho check --json`. */
json_t *mho_json_molecules(const mho_checked *checked, size_t count);

/* Appends the text of an object, which it takes over, to the buffer. */
MHO_MUST_USE mho_status mho_json_write(json_t *object, mho_buffer *buffer, mho_error *error);

#endif
