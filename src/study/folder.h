/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * A results folder that appears whole or not at all.  It is filled under a
 * hidden name beside its place and exchanged with what stands there.
 */
#ifndef MHOLECULE_STUDY_FOLDER_H
#define MHOLECULE_STUDY_FOLDER_H

#include <dirent.h>

#include <jansson.h>

#include <mho/status.h>

#include "base/buffer.h"

typedef struct {
  char *target;
  char *temporary; /* NULL once it is in place or removed */
  DIR *handle;     /* of the temporary folder: emptying it allocates nothing */
} mho_folder;

/* Refuses a target that is neither absent, nor empty, nor an earlier results
 * folder (one with provenance.json and nothing that it does not list); removes
 * what killed runs left; creates the temporary folder.  Errors: MHO_ERR_RANGE, MHO_ERR_WRITE. */
MHO_MUST_USE mho_status mho_folder_open(const char *target, mho_folder *folder,
                                        mho_error *error);
MHO_MUST_USE mho_status mho_folder_write(const mho_folder *folder, const char *name,
                                         const mho_buffer *content, mho_error *error);

/* Path of a file inside the temporary folder; the caller frees it. */
char *mho_folder_path(const mho_folder *folder, const char *name);
/* The names of the files that are in it, sorted; NULL without memory. */
json_t *mho_folder_list(const mho_folder *folder);
MHO_MUST_USE mho_status mho_folder_commit(mho_folder *folder, mho_error *error);

/* Removes what is not committed, and frees. */
void mho_folder_close(mho_folder *folder);

#endif
