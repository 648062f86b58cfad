/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The main job: a study file becomes a results folder.
 */
#ifndef MHOLECULE_STUDY_H
#define MHOLECULE_STUDY_H

#include <mho/settings.h>
#include <mho/status.h>

typedef struct mho_study mho_study;

typedef struct {
  const char *folder;  /* results; NULL: STUDY-results beside the study */
  const char *command; /* for provenance.json; NULL for none */
  /* Called before each step; may be NULL. */
  void (*progress)(int done, int total, const char *step, void *user);
  /* Called in the end with each sentence that the report begins with; may be NULL. */
  void (*answer)(const char *sentence, void *user);
  void *user;
  /* The run ends cleanly, leaving nothing, soon after this becomes non-zero. */
  const volatile int *cancel;
} mho_run_options;

MHO_BEGIN_DECLARATIONS

/* Reads a study and all molecules it names.  `overrides` (may be NULL) stand
 * above the files.  All mistakes are reported together.  The caller frees. */
MHO_API MHO_MUST_USE mho_status mho_study_read(const char *path,
                                               const mho_settings *overrides,
                                               mho_study **study, mho_error *error);
MHO_API void mho_study_free(mho_study *study);

/* Computes everything and writes the results folder, which appears whole or
 * not at all; an existing folder is replaced only if it is empty or holds a
 * provenance.json.  Where gnuplot is missing, figures are left out and the
 * report says so.  *folder (may be NULL) is the path, which the caller frees.
 * Errors: MHO_ERR_RANGE (the folder is something else), MHO_ERR_WRITE,
 * MHO_ERR_CANCELLED, and those of the stages. */
MHO_API MHO_MUST_USE mho_status mho_study_run(const mho_study *study,
                                              const mho_run_options *options,
                                              char **folder, mho_error *error);

MHO_END_DECLARATIONS

#endif
