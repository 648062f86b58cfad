/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * A store of a screening, ranked: what `mho screen` shows and a study asks.
 */
#ifndef MHOLECULE_STUDY_SCREENING_H
#define MHOLECULE_STUDY_SCREENING_H

#include <mho/screen.h>

#include "report/table.h"

enum { SCREENING_REQUIREMENTS_MAX = 32 };

/* What is wanted; what is not said follows from the store. */
typedef struct {
  bool has_goal, has_top, has_seed;
  mho_screen_goal goal;
  int requirements;
  mho_screen_requirement requirement[SCREENING_REQUIREMENTS_MAX];
  long top;
  uint64_t seed; /* of the draws by which ranks are judged */
} mho_screening_question;

/* How it is listed. */
typedef struct {
  bool all;     /* every ranked candidate, not only the first ones */
  bool eye;     /* for the screen: warnings below, not beside */
  int width;    /* of the screen; 0: names whole */
  bool remarks; /* how it was ranked, and how far the list has come */
} mho_screening_view;

/* Table `screening` of the store at `path`; *answer (may be NULL) is a sentence
 * with the first few names, and the caller's.
 * Errors: those of mho_screen_store_open and _load, MHO_ERR_RANGE, MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_screening_list(const mho_screening_question *question,
                                           const char *path, const mho_screening_view *view,
                                           mho_output *output, char **answer, mho_error *error);

/* Table `failures` of the bad rows. */
MHO_MUST_USE mho_status mho_screening_failures(const char *path, mho_output *output,
                                               mho_error *error);

#endif
