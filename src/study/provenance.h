/* SPDX-License-Identifier: GPL-3.0-or-later */
#ifndef MHOLECULE_STUDY_PROVENANCE_H
#define MHOLECULE_STUDY_PROVENANCE_H

#include <jansson.h>

#include "base/buffer.h"
#include "study/study.h"

/* `files` are the results, a list that it takes; NULL is a lack of memory.
 * Errors: MHO_ERR_FILE (an input vanished), MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_write_provenance(const mho_study *study, const char *command, json_t *files,
                                             mho_buffer *buffer, mho_error *error);

#endif
