/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * What a study asks of a molecule beyond its conductance: sensitivities, twist,
 * interference, currents, orbitals; as tables, sentences and pictures.
 */
#ifndef MHOLECULE_STUDY_LEVERS_H
#define MHOLECULE_STUDY_LEVERS_H

#include "report/html.h"
#include "study/study.h"

typedef struct {
  mho_figure figure; /* svg: the picture, or */
  bool script;       /* the script of one */
} mho_lever_picture;

typedef struct {
  size_t pictures, remarks;
  mho_lever_picture *picture;
  mho_remark *remark;
} mho_levers;

/* Does the study ask for any? */
bool mho_levers_asked(const mho_study *study);

/* Everything that is asked of one molecule.  Errors: those of the stages. */
MHO_MUST_USE mho_status mho_levers_add(const mho_study *study, int molecule,
                                       const mho_junction *junction, mho_output *output,
                                       mho_levers *levers, mho_error *error);

/* Pictures of tables of all molecules.  Errors: MHO_ERR_MEMORY. */
MHO_MUST_USE mho_status mho_levers_finish(const mho_study *study, const mho_output *output,
                                          mho_levers *levers, mho_error *error);
void mho_levers_clear(mho_levers *levers);

#endif
