/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "study/levers.h"

#include <stdlib.h>
#include <string.h>

#include <mho/inside.h>
#include <mho/warning.h>

#include "base/text.h"
#include "report/drawing.h"
#include "report/figure.h"
#include "report/stages.h"
#include "study/measured.h"

enum { SCREEN_NAME = 80 };

typedef struct {
  const mho_study *study;
  int index;
  const mho_molecule *molecule;
  const mho_junction *junction;
  mho_output *output;
  mho_levers *levers;
} work;

static mho_status fail_memory(mho_error *error)
{
  return mho_fail(error, MHO_ERR_MEMORY, "study", NULL, "out of memory");
}

bool mho_levers_asked(const mho_study *s)
{
  return s->sensitivity || s->currents || s->orbitals || s->asks_twist || s->asks_interference;
}

void mho_levers_clear(mho_levers *levers)
{
  for (size_t i = 0; i < levers->pictures; i++) {
    mho_figure *figure = &levers->picture[i].figure;
    free(figure->file);
    free(figure->caption);
    mho_buffer_clear(&figure->svg);
  }
  for (size_t i = 0; i < levers->remarks; i++) free(levers->remark[i].text);
  free(levers->picture);
  free(levers->remark);
  *levers = (mho_levers){0};
}

/* One more picture, to be filled; file and caption are taken over. */
static mho_lever_picture *add_picture(mho_levers *levers, const char *section, char *file,
                                      char *caption, bool script)
{
  mho_lever_picture *larger =
      realloc(levers->picture, (levers->pictures + 1) * sizeof *larger);
  if (larger) levers->picture = larger;
  if (!larger || !file || !caption) {
    free(file);
    free(caption);
    return NULL;
  }
  mho_lever_picture *picture = &levers->picture[levers->pictures++];
  *picture = (mho_lever_picture){
      .figure = {.section = section, .file = file, .caption = caption}, .script = script};
  return picture;
}

/* A picture of this molecule, in `svg` on success. */
static mho_status open_picture(const work *w, const char *section, const char *stem,
                               const char *what, bool script, mho_buffer **svg, mho_error *error)
{
  mho_lever_picture *picture =
      add_picture(w->levers, section, mho_print_text("%s-%d.svg", stem, w->index + 1),
                  mho_print_text("%.*s: %s", SCREEN_NAME, w->molecule->name, what), script);
  *svg = picture ? &picture->figure.svg : NULL;
  return picture ? MHO_OK : fail_memory(error);
}

/* Notes become sentences of a section. */
static mho_status take_remarks(mho_output *words, const char *section, mho_levers *levers,
                               mho_error *error)
{
  mho_remark *larger =
      realloc(levers->remark, (levers->remarks + words->notes + 1) * sizeof *larger);
  if (larger) levers->remark = larger;
  if (!larger || words->failed) return fail_memory(error);
  for (size_t i = 0; i < words->notes; i++) {
    levers->remark[levers->remarks++] = (mho_remark){section, words->note[i]};
    words->note[i] = NULL;
  }
  words->notes = 0;
  return MHO_OK;
}

/* --- questions ------------------------------------------------------------ */

static mho_status add_sensitivity(const work *w, mho_error *error)
{
  mho_sensitivity result;
  mho_sensitivity_options options = mho_sensitivity_defaults();
  options.seed = MHO_STUDY_SEED;
  mho_table *table = mho_sensitivity_table(w->output);
  mho_buffer *svg;
  mho_status status =
      mho_sensitivity_compute(w->molecule, w->junction, &options, &result, error);
  if (status == MHO_OK) mho_sensitivity_rows(table, w->molecule, &result);
  if (status == MHO_OK)
    status = open_picture(w, "sensitivity", "sensitivity", "what to change. Shapes tell the sign.",
                          false, &svg, error);
  if (status == MHO_OK) status = mho_drawing_write_sensitivity(w->molecule, &result, svg, error);
  mho_sensitivity_clear(&result);
  return status;
}

static mho_status add_twist(const work *w, mho_error *error)
{
  const mho_twist_question *q = &w->study->twist;
  bool average = q->average || q->torsion.text[0];
  int parts = MHO_TWIST_SWEEP | (q->map ? MHO_TWIST_MAP : 0) | (average ? MHO_TWIST_AVERAGE : 0);
  mho_twist_bonds bonds;
  mho_output words = {0};
  double limit[2];
  char reason[480];
  mho_status status = mho_twist_choose(q, w->molecule, &bonds, reason, sizeof reason);
  if (status != MHO_OK) mho_fail(error, status, "study", "bond", "bond: %s", reason);
  else
    status = mho_twist_answer(q, w->molecule, w->junction, &bonds, parts, w->output, &words, limit,
                              error);
  mho_buffer *svg;
  if (status == MHO_OK)
    status = open_picture(w, "twist", "twist-limit", "how flat it must be.", false, &svg, error);
  if (status == MHO_OK)
    status = mho_drawing_write_twist(w->molecule, bonds.bond, bonds.count, limit, svg, error);
  mho_twist_bonds_clear(&bonds);
  if (status == MHO_OK) status = take_remarks(&words, "twist", w->levers, error);
  mho_output_clear(&words);
  mho_buffer *script;
  bool plane = q->bond.count == 2;
  if (status != MHO_OK || !q->map) return status;
  status = open_picture(w, "twist", "twist-map",
                        plane ? "log10 of T at the Fermi level against the angles of two bonds."
                              : "log10 of T against angle and energy.", true, &script, error);
  const mho_table *table = mho_output_find(w->output, plane ? "twist_plane" : "twist_map");
  if (status == MHO_OK) status = mho_output_check(w->output, error); /* cells may be missing */
  if (status == MHO_OK && table) mho_figure_twist_map(script, table, w->molecule->name);
  return status;
}

static mho_status draw_pairs(const work *w, const mho_interference *map, int from, mho_error *error)
{
  const mho_contact *left = &w->molecule->contact[MHO_LEFT];
  if (from < 0 && left->count > 0) from = left->site[0];
  mho_buffer *picture;
  mho_status status = open_picture(w, "interference", "pairs", "T from one site to every other.",
                                   false, &picture, error);
  if (status == MHO_OK)
    status = mho_drawing_write_pairs(w->molecule, map, from, picture, error);
  if (status == MHO_OK)
    status = open_picture(w, "interference", "pair-matrix",
                          "T of all pairs; + and − are the sign of the Green's function, o is a node.",
                          true, &picture, error);
  if (status == MHO_OK) mho_figure_pairs(picture, w->molecule, map);
  return status;
}

static mho_status add_modifications(const work *w, mho_output *words, mho_error *error)
{
  mho_modifications ranked;
  mho_buffer *svg;
  mho_table *table = mho_modify_table(w->output);
  mho_status status = mho_modify_rank(w->molecule, w->junction,
                                      mho_interference_window(&w->study->interference), &ranked,
                                      error);
  if (status == MHO_OK) {
    mho_modify_rows(table, w->molecule, &ranked);
    mho_modify_note(words, w->molecule, &ranked);
    status = open_picture(w, "interference", "modify",
                          "the single change with the largest effect at each site.", false, &svg,
                          error);
  }
  if (status == MHO_OK) status = mho_drawing_write_modifications(w->molecule, &ranked, svg, error);
  mho_modifications_clear(&ranked);
  return status;
}

static mho_status add_interference(const work *w, mho_error *error)
{
  const mho_interference_question *q = &w->study->interference;
  mho_interference map;
  mho_output words = {0};
  int from;
  mho_status status = mho_interference_find(q, w->molecule, w->junction, true, &map, &from, error);
  if (status == MHO_OK) {
    mho_table *table = mho_interference_table(w->output);
    mho_interference_rows(table, w->molecule, &map);
    mho_interference_note(&words, w->molecule, &map);
  }
  if (status == MHO_OK && q->rules) {
    mho_table *table = mho_rules_table(w->output);
    mho_rules_rows(table, w->molecule, &map);
    mho_rules_note(&words, w->molecule, &map);
  }
  if (status == MHO_OK) status = draw_pairs(w, &map, from, error);
  mho_interference_clear(&map);
  if (status == MHO_OK && q->modify) status = add_modifications(w, &words, error);
  if (status == MHO_OK) status = take_remarks(&words, "interference", w->levers, error);
  mho_output_clear(&words);
  return status;
}

static mho_status draw_currents(const work *w, const mho_inside *inside, mho_error *error)
{
  mho_output words = {0};
  mho_buffer *svg;
  mho_status status;
  if (inside->flows) {
    status = open_picture(w, "currents", "currents", "currents at the Fermi level.", false, &svg,
                          error);
    return status == MHO_OK ? mho_drawing_write_currents(w->molecule, inside, svg, error) : status;
  }
  mho_output_note(&words, "%s: %s, so no current is told", w->molecule->name,
                  inside->outside_band ? "the Fermi level lies outside the band of an electrode"
                                       : "T has a node at the Fermi level");
  status = take_remarks(&words, "currents", w->levers, error);
  mho_output_clear(&words);
  return status;
}

static mho_status add_inside(const work *w, mho_error *error)
{
  double energy = w->junction->fermi_ev;
  mho_plan *plan = NULL;
  mho_inside inside = {0};
  mho_status status = mho_plan_create(w->junction, &plan, error);
  if (status == MHO_OK) status = mho_inside_compute(w->junction, plan, energy, &inside, error);
  if (status == MHO_OK && w->study->orbitals)
    mho_orbitals_rows(mho_orbitals_table(w->output), w->molecule->name, energy, &inside);
  if (status == MHO_OK && w->study->currents) {
    mho_currents_rows(mho_currents_table(w->output), w->molecule, &inside);
    status = draw_currents(w, &inside, error);
  }
  mho_inside_clear(&inside);
  mho_plan_free(plan);
  return status;
}

mho_status mho_levers_add(const mho_study *study, int index, const mho_junction *junction,
                          mho_output *output, mho_levers *levers, mho_error *error)
{
  const work w = {study, index, &study->molecule[index], junction, output, levers};
  mho_status status = MHO_OK;
  if (study->sensitivity) status = add_sensitivity(&w, error);
  if (status == MHO_OK && study->asks_twist && study->asks_twist[index])
    status = add_twist(&w, error);
  if (status == MHO_OK && study->asks_interference && study->asks_interference[index])
    status = add_interference(&w, error);
  if (status == MHO_OK && (study->currents || study->orbitals)) status = add_inside(&w, error);
  return status;
}

mho_status mho_levers_finish(const mho_study *study, const mho_output *output, mho_levers *levers,
                             mho_error *error)
{
  const mho_table *table = mho_output_find(output, "twist");
  mho_status status = mho_output_check(output, error);
  if (status != MHO_OK || !table || study->twist.at.given) return status;
  for (int first = 0, drawn; ; first += drawn) {
    mho_buffer script = {0};
    drawn = mho_figure_twist(&script, table, first);
    mho_lever_picture *picture = NULL;
    if (drawn > 0)
      picture = add_picture(levers, "twist", mho_print_text("twist-%d.svg", first / MHO_CURVES_MAX + 1),
                            mho_copy_text("Thermal conductance against the angle of the bond."), true);
    if (!picture) mho_buffer_clear(&script);
    if (drawn == 0) return MHO_OK;
    if (!picture) return fail_memory(error);
    picture->figure.svg = script;
    mho_lever_picture curves = *picture; /* before the maps of single molecules */
    memmove(levers->picture + 1, levers->picture, (levers->pictures - 1) * sizeof curves);
    levers->picture[0] = curves;
  }
}
