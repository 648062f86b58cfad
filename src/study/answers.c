/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "study/answers.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/text.h"
#include "study/study.h"

void mho_answers_clear(mho_answers *answers)
{
  for (size_t i = 0; i < answers->count; i++) free(answers->sentence[i]);
  *answers = (mho_answers){0};
}

void mho_answers_add(mho_answers *answers, char *sentence)
{
  if (!sentence) answers->failed = true;
  else if (answers->count < ANSWERS_MAX) answers->sentence[answers->count++] = sentence;
  else free(sentence);
}

void mho_answers_conductance(mho_answers *answers, const mho_study *s,
                             const mho_conductance *conductance)
{
  int best = -1, worst = -1, nodes = 0;
  for (int i = 0; i < s->molecule_count; i++) {
    const mho_conductance *g = &conductance[i];
    if (!g->has_log || g->warnings & (MHO_WARN_NEAR_NODE | MHO_WARN_NO_PI_PATH)) {
      nodes++;
      continue;
    }
    if (best < 0 || g->log10_g0 > conductance[best].log10_g0) best = i;
    if (worst < 0 || g->log10_g0 < conductance[worst].log10_g0) worst = i;
  }
  if (best >= 0 && best != worst)
    mho_answers_add(answers, mho_print_text("Best conductor by the model: %.*s, %.2g G0. Least: %.*s, "
                                            "%.2g G0.",
                                            ANSWER_NAME, s->molecule[best].name,
                                            conductance[best].conductance_g0, ANSWER_NAME,
                                            s->molecule[worst].name, conductance[worst].conductance_g0));
  else if (best >= 0)
    mho_answers_add(answers, mho_print_text("%.*s: %.2g G0 by the model.", ANSWER_NAME,
                                            s->molecule[best].name, conductance[best].conductance_g0));
  if (nodes > 0)
    mho_answers_add(answers, mho_print_text("%d of %d molecule%s %s a node or no pi path at the Fermi "
                                            "level: no value is predicted for %s.",
                                            nodes, s->molecule_count, s->molecule_count == 1 ? "" : "s",
                                            nodes > 1 ? "have" : "has", nodes > 1 ? "them" : "it"));
}

void mho_answers_agreement(mho_answers *answers, const mho_study *s, const mho_agreement *a)
{
  const mho_molecule *molecule = s->molecule;
  if (a->compared == 1)
    mho_answers_add(answers, mho_print_text("Computed and measured ratio of %.*s to %.*s differ by %.2f "
                                            "decades, a factor of %.1f.",
                                            ANSWER_NAME, molecule[a->largest].name, ANSWER_NAME,
                                            molecule[a->reference].name, a->rms_decades,
                                            pow(10, a->rms_decades)));
  else if (a->compared > 1)
    mho_answers_add(answers,
                    mho_print_text("Relative to %.*s, computed and measured ratios of %d molecules differ "
                                   "by %.2f decades (root mean square), a factor of %.1f; most for %.*s "
                                   "(%.2f decades).",
                                   ANSWER_NAME, molecule[a->reference].name, a->compared,
                                   a->rms_decades, pow(10, a->rms_decades), ANSWER_NAME,
                                   molecule[a->largest].name, a->largest_decades));
  if (a->pairs > 0)
    mho_answers_add(answers, mho_print_text("Of %d pair%s that the measurement tells apart, the model puts "
                                            "%d in the measured order.",
                                            a->pairs, a->pairs == 1 ? "" : "s", a->ordered));
}

void mho_answers_levers(mho_answers *answers, const mho_levers *levers)
{
  for (size_t i = 0; i < levers->remarks; i++) {
    const mho_remark *remark = &levers->remark[i];
    const char *colon = strchr(remark->text, ':');
    size_t name = colon ? (size_t)(colon - remark->text) : 0;
    bool first = i == 0 || strcmp(remark->section, remark[-1].section) ||
                 strncmp(remark->text, remark[-1].text, name + 1);
    if (first && strcmp(remark->section, "currents"))
      mho_answers_add(answers, mho_print_text("%s.", remark->text));
  }
}
