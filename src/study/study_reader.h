/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * What the parts of the reader of study files share.
 */
#ifndef MHOLECULE_STUDY_STUDY_READER_H
#define MHOLECULE_STUDY_STUDY_READER_H

#include "input/yaml.h"
#include "study/study.h"

#define COUNT(array) (sizeof(array) / sizeof *(array))

enum { MOLECULES_MAX = 1000 };

typedef struct {
  mho_yaml yaml;
  mho_study *study;
  const mho_settings *overrides; /* or NULL */
} mho_study_reader;

void mho_study_no_memory(const mho_study_reader *r);

/* One more file whose hash goes into provenance.json. */
bool mho_study_add_input(mho_study_reader *r, const char *path, const char *name);

/* Index of the molecule a text names; a dangling name is an error. */
bool mho_study_find_molecule(mho_study_reader *r, const mho_yaml_node *node, const char *field,
                             int *index);

/* The key `questions`, once molecules and measured values are known. */
void mho_study_read_questions(mho_study_reader *r);

#endif
