/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The question "where should the linkers go?" as the command line and a study
 * ask it.
 */
#ifndef MHOLECULE_STUDY_INTERFERENCE_H
#define MHOLECULE_STUDY_INTERFERENCE_H

#include <mho/interference.h>
#include <mho/modify.h>

#include "input/options.h"
#include "report/table.h"

typedef struct {
  bool rules, modify, every_site;
  mho_option_text from;       /* only pairs with this site */
  mho_option_quantity window; /* half width, of modify */
} mho_interference_question;

const mho_option *mho_interference_question_options(size_t *count);

/* What is wrong with options that exclude each other, or NULL; a study may ask
 * for several tables at once. */
const char *mho_interference_conflict(const mho_interference_question *question, bool one_table);

double mho_interference_window(const mho_interference_question *question);

/* The pairs that are asked for, with nodes and magic integers where `full`;
 * *from is the index of `from`, or -1.  The caller clears the map, also after
 * a failure.  Errors: MHO_ERR_REFERENCE (from), those of mho_interference_map. */
MHO_MUST_USE mho_status mho_interference_find(const mho_interference_question *question,
                                              const mho_molecule *molecule,
                                              const mho_junction *junction, bool full,
                                              mho_interference *map, int *from,
                                              mho_error *error);

#endif
