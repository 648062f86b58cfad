/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * What a study found, in sentences: the head of its report and `answer` of
 * results.json.
 */
#ifndef MHOLECULE_STUDY_ANSWERS_H
#define MHOLECULE_STUDY_ANSWERS_H

#include <mho/compare.h>
#include <mho/conductance.h>
#include <mho/study.h>

#include "study/levers.h"

enum { ANSWERS_MAX = 40, ANSWER_NAME = 80 }; /* further ones are left out */

typedef struct {
  char *sentence[ANSWERS_MAX];
  size_t count;
  bool failed; /* memory ran out */
} mho_answers;

void mho_answers_clear(mho_answers *answers);

/* One more; it takes the text, NULL is a lack of memory. */
void mho_answers_add(mho_answers *answers, char *sentence);

/* Best and least conductor, and how many have no value; conductance[molecule_count]. */
void mho_answers_conductance(mho_answers *answers, const mho_study *study,
                             const mho_conductance *conductance);

/* How far computed ratios are from measured ones, and the order of pairs. */
void mho_answers_agreement(mho_answers *answers, const mho_study *study,
                           const mho_agreement *agreement);

/* The first remark of each question of each molecule. */
void mho_answers_levers(mho_answers *answers, const mho_levers *levers);

#endif
