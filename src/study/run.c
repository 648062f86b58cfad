/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Runs a study: every molecule through the stages, the results as tables,
 * figures and a report, and all of it into one folder.
 */
#include <mho/study.h>
#include <mho/warning.h>

#include <stdlib.h>
#include <string.h>

#include "base/text.h"
#include "report/drawing.h"
#include "report/figure.h"
#include "report/html.h"
#include "report/json.h"
#include "report/stages.h"
#include "study/answers.h"
#include "study/folder.h"
#include "study/gallery.h"
#include "study/levers.h"
#include "study/measured.h"
#include "study/provenance.h"
#include "study/study.h"

enum { EVEN_POINTS = 401, TABLE_DIGITS = 6 };

/* What was computed for one molecule. */
typedef struct {
  mho_junction junction;
  unsigned warnings;
  size_t count;
  double *energy_ev; /* above the Fermi level */
  mho_point *point;
  size_t nodes;
  double *node_ev;
} outcome;

typedef struct {
  const mho_study *study;
  const mho_run_options *options;
  mho_folder folder;
  outcome *outcome;
  mho_conductance *conductance;
  mho_comparison *comparison;
  double *error_decades; /* of log10 G, -1 unknown; for the comparison */
  mho_agreement agreement;
  mho_measured_traces *measured; /* [traces_count of the study] */
  mho_measured_peak *peak;       /* those of the study, then those of traces */
  int peak_count;
  bool compare;
  mho_output output;
  mho_answers answers;
  mho_levers levers;
  mho_portrait *portrait; /* [molecule_count] */
  mho_gallery gallery;
  int steps_done, steps;
} run;

static mho_status fail_memory(mho_error *error)
{
  return mho_fail(error, MHO_ERR_MEMORY, "study", NULL, "out of memory");
}

/* Tells the progress; MHO_ERR_CANCELLED where the run was interrupted. */
static mho_status step(run *r, const char *what, mho_error *error)
{
  const mho_run_options *o = r->options;
  if (o->cancel && *o->cancel)
    return mho_fail(error, MHO_ERR_CANCELLED, "study", NULL,
                    "interrupted; nothing was written");
  if (o->progress) o->progress(r->steps_done, r->steps, what, o->user);
  r->steps_done++;
  return MHO_OK;
}

static mho_status choose_energies(const mho_study *s, const mho_plan *plan, double fermi,
                                  outcome *o, mho_error *error)
{
  if (s->samples == 0) {
    mho_status status =
        mho_energy_grid(plan, fermi + s->energy_low_ev, fermi + s->energy_high_ev, EVEN_POINTS,
                        &o->energy_ev, &o->count, error);
    for (size_t i = 0; status == MHO_OK && i < o->count; i++) o->energy_ev[i] -= fermi;
    return status;
  }
  o->count = (size_t)s->samples;
  o->energy_ev = malloc(o->count * sizeof *o->energy_ev);
  if (!o->energy_ev) return fail_memory(error);
  double width = s->energy_high_ev - s->energy_low_ev;
  for (size_t i = 0; i < o->count; i++)
    o->energy_ev[i] = s->energy_low_ev + width * (double)i / (double)(o->count - 1);
  return MHO_OK;
}

static mho_status sweep(const mho_study *s, const mho_plan *plan, outcome *o, mho_error *error)
{
  double fermi = o->junction.fermi_ev;
  mho_status status = choose_energies(s, plan, fermi, o, error);
  if (status != MHO_OK) return status;
  double *absolute = malloc(o->count * sizeof *absolute);
  o->point = malloc(o->count * sizeof *o->point);
  if (!absolute || !o->point) status = fail_memory(error);
  for (size_t i = 0; status == MHO_OK && i < o->count; i++) absolute[i] = fermi + o->energy_ev[i];
  if (status == MHO_OK)
    status = mho_transmission_sweep(plan, o->count, absolute, o->point, error);
  free(absolute);
  return status;
}

static mho_status compute_molecule(run *r, int index, mho_error *error)
{
  const mho_study *s = r->study;
  const mho_molecule *molecule = &s->molecule[index];
  outcome *o = &r->outcome[index];
  mho_conductance *g = &r->conductance[index];
  mho_conductance_options options = {.window_ev = s->window_ev};
  mho_plan *plan = NULL;
  mho_status status = step(r, molecule->name, error);
  if (status == MHO_OK) status = mho_plan_create(&o->junction, &plan, error);
  if (status == MHO_OK)
    status = mho_conductance_compute(plan, o->junction.fermi_ev, o->junction.temperature_k,
                                     &options, g, error);
  if (status == MHO_OK) status = sweep(s, plan, o, error);
  if (status == MHO_OK)
    status = mho_figure_nodes(plan, o->junction.fermi_ev, &o->node_ev, &o->nodes, error);
  mho_plan_free(plan);
  if (status == MHO_OK) o->warnings = g->warnings | mho_molecule_warnings(molecule, &o->junction);
  return status;
}

/* Some questions know no chains as electrodes. */
static mho_status require_wide_band(const mho_study *s, int index, mho_error *error)
{
  bool pairs = s->asks_interference && s->asks_interference[index];
  if (!s->sensitivity && !pairs) return MHO_OK;
  return mho_molecule_require_wide_band(&s->molecule[index],
                                        pairs ? "the question 'interference'"
                                              : "'sensitivity' of the question 'conductance'",
                                        error);
}

/* Every junction is built before any work, so that all mistakes come at once. */
static mho_status build_junctions(run *r, mho_error *error)
{
  mho_status result = MHO_OK;
  for (int i = 0; i < r->study->molecule_count; i++) {
    const mho_molecule *molecule = &r->study->molecule[i];
    mho_status status = mho_junction_build(molecule, &r->outcome[i].junction, error);
    if (status == MHO_OK)
      status = mho_junction_require_contacts(&r->outcome[i].junction, molecule, error);
    if (status == MHO_OK) status = require_wide_band(r->study, i, error);
    if (result == MHO_OK) result = status;
  }
  return result;
}

static mho_status read_traces(run *r, mho_error *error)
{
  const mho_study *s = r->study;
  for (int i = 0; i < s->peak_count; i++) r->peak[r->peak_count++] = s->peak[i];
  for (int i = 0; i < s->traces_count; i++) {
    mho_status status = step(r, "traces", error);
    if (status == MHO_OK)
      status = mho_measured_read(&s->traces[i], r->options->cancel, &r->measured[i], error);
    if (status != MHO_OK) return status;
    if (mho_measured_peak_of(&s->traces[i], &r->measured[i], &r->peak[r->peak_count]))
      r->peak_count++;
  }
  return MHO_OK;
}

static bool has_chain(const mho_molecule *m)
{
  return m->contact[MHO_LEFT].has_chain || m->contact[MHO_RIGHT].has_chain;
}

/* What the parameters' own errors make of each conductance; with chains as
 * electrodes that is not known. */
static mho_status find_errors(run *r, mho_error *error)
{
  mho_sensitivity_options options = mho_sensitivity_defaults();
  mho_status status = MHO_OK;
  for (int i = 0; status == MHO_OK && i < r->study->molecule_count; i++) {
    const mho_molecule *molecule = &r->study->molecule[i];
    mho_sensitivity s = {0};
    status = step(r, molecule->name, error);
    if (has_chain(molecule))
      mho_output_note(&r->output, "%s: no error of the parameters is told, which needs electrodes of "
                                  "a wide band", molecule->name);
    else if (status == MHO_OK)
      status = mho_sensitivity_compute(molecule, &r->outcome[i].junction, &options, &s, error);
    r->error_decades[i] = s.has_error ? s.error_decades : -1;
    mho_sensitivity_clear(&s);
  }
  return status;
}

/* Traces may show no peak, and then there is less to compare, or nothing. */
static mho_status compare(run *r, mho_error *error)
{
  const mho_study *s = r->study;
  bool measured = false;
  for (int i = 0; i < r->peak_count; i++)
    measured |= s->reference < 0 || r->peak[i].molecule == s->reference;
  r->compare = s->compare && measured;
  if (s->compare && !measured)
    mho_output_note(&r->output, "no comparison: %s",
                    s->reference < 0 ? "no traces show a peak"
                                     : "the traces of the reference show no peak");
  if (!r->compare) return MHO_OK;
  mho_status status = find_errors(r, error);
  if (status != MHO_OK) return status;
  return mho_compare_ratios(r->conductance, r->error_decades, s->molecule_count, r->peak, r->peak_count,
                            s->reference, r->comparison, &r->agreement, error);
}

static void fill_tables(run *r)
{
  const mho_study *s = r->study;
  mho_table *table = mho_conductance_table(&r->output);
  for (int i = 0; i < s->molecule_count; i++) {
    mho_conductance_row(table, s->molecule[i].name, &r->conductance[i], r->outcome[i].warnings);
    mho_output_warn(&r->output, s->molecule[i].name, r->outcome[i].warnings);
    mho_assumption_note(&r->output, &s->molecule[i], &r->outcome[i].junction);
  }
  table = mho_transmission_table(&r->output);
  for (int i = 0; i < s->molecule_count; i++)
    for (size_t k = 0; k < r->outcome[i].count; k++)
      mho_transmission_row(table, s->molecule[i].name, r->outcome[i].energy_ev[k],
                           &r->outcome[i].point[k]);
  mho_output_note(&r->output,
                  "conductance is the thermal value at the Fermi level; the window values are its "
                  "5 %% and 95 %% quantiles over +-%g eV around it",
                  s->window_ev);
  mho_measured_tables(s, r->measured, &r->output);
  if (!r->compare) return;
  table = mho_compare_table(&r->output);
  for (int i = 0; i < s->molecule_count; i++)
    if (r->comparison[i].has_measured)
      mho_compare_row(table, s->molecule[i].name, &r->comparison[i]);
}

/* Curves first .. first+count-1 in one figure. */
static mho_status draw_transmission(run *r, int first, int count, mho_error *error)
{
  mho_curve curve[MHO_CURVES_MAX] = {{0}};
  bool measured = false;
  for (int c = 0; c < count; c++) {
    int i = first + c;
    const mho_comparison *m = &r->comparison[i];
    curve[c] = (mho_curve){.name = r->study->molecule[i].name,
                           .count = r->outcome[i].count,
                           .energy_ev = r->outcome[i].energy_ev,
                           .point = r->outcome[i].point,
                           .nodes = r->outcome[i].nodes,
                           .node_ev = r->outcome[i].node_ev,
                           .has_measured = r->compare && m->has_measured,
                           .measured_log10_g0 = m->measured_log10_g0};
    measured |= curve[c].has_measured;
    curve[c].measured_low = m->has_spread ? m->measured_low : m->measured_log10_g0;
    curve[c].measured_high = m->has_spread ? m->measured_high : m->measured_log10_g0;
  }
  mho_buffer script = {0};
  mho_figure_transmission(&script, curve, count, r->study->window_ev);
  mho_status status = mho_gallery_draw(
      &r->gallery, "transmission", mho_print_text("transmission-%d.svg", first / MHO_CURVES_MAX + 1),
      mho_print_text("Transmission against energy above the Fermi level; the shaded band is the "
                     "alignment window%s.",
                     measured ? ", diamonds are measured conductances in units of G0" : ""),
      &script, error);
  mho_buffer_clear(&script);
  return status;
}

static mho_status draw_comparison(run *r, mho_error *error)
{
  int count = r->study->molecule_count;
  const char **name = calloc((size_t)count, sizeof *name);
  if (!name) return fail_memory(error);
  for (int i = 0; i < count; i++) name[i] = r->study->molecule[i].name;
  mho_buffer script = {0};
  mho_figure_comparison(&script, name, r->comparison, count);
  mho_status status = mho_gallery_draw(
      &r->gallery, "comparison", mho_copy_text("compare.svg"),
      mho_copy_text("Computed and measured conductance of each molecule; bars are the error of the "
                    "parameters and the spread of the measurement."),
      &script, error);
  mho_buffer_clear(&script);
  free(name);
  return status;
}

static mho_status draw_traces(run *r, int index, mho_error *error)
{
  const mho_study *s = r->study;
  return mho_gallery_draw(
      &r->gallery, "traces", mho_print_text("traces-%d.svg", index + 1),
      mho_print_text("Log histogram of the traces of %.*s that show more than tunnelling.",
                     ANSWER_NAME, s->molecule[s->traces[index].molecule].name),
      &r->measured[index].figure, error);
}

static mho_status compute_levers(run *r, mho_error *error)
{
  mho_status status = MHO_OK;
  if (!mho_levers_asked(r->study)) return MHO_OK;
  for (int i = 0; status == MHO_OK && i < r->study->molecule_count; i++) {
    status = step(r, r->study->molecule[i].name, error);
    if (status == MHO_OK)
      status = mho_levers_add(r->study, i, &r->outcome[i].junction, &r->output, &r->levers, error);
  }
  return status == MHO_OK ? mho_levers_finish(r->study, &r->output, &r->levers, error) : status;
}

/* Pictures are written, scripts are drawn where gnuplot is there. */
static mho_status draw_levers(run *r, mho_error *error)
{
  mho_status status = MHO_OK;
  for (size_t i = 0; status == MHO_OK && i < r->levers.pictures; i++) {
    mho_lever_picture *from = &r->levers.picture[i];
    mho_figure *f = &from->figure;
    if (from->script && r->gallery.without_gnuplot) continue;
    status = mho_buffer_check(&f->svg, "study", error);
    if (status != MHO_OK) break;
    char *file = mho_copy_text(f->file), *caption = mho_copy_text(f->caption);
    status = from->script
                 ? mho_gallery_draw(&r->gallery, f->section, file, caption, &f->svg, error)
                 : mho_gallery_hang(&r->gallery, f->section, file, caption, &f->svg, error);
  }
  return status;
}

static mho_status draw_figures(run *r, mho_error *error)
{
  mho_status status = MHO_OK;
  if (r->compare) status = draw_comparison(r, error);
  for (int i = 0; status == MHO_OK && i < r->study->traces_count && !r->gallery.without_gnuplot; i++)
    status = draw_traces(r, i, error);
  int count = r->study->molecule_count;
  for (int i = 0; status == MHO_OK && i < count && !r->gallery.without_gnuplot; i += MHO_CURVES_MAX) {
    status = step(r, "figures", error);
    int in_figure = count - i < MHO_CURVES_MAX ? count - i : MHO_CURVES_MAX;
    if (status == MHO_OK) status = draw_transmission(r, i, in_figure, error);
  }
  if (status == MHO_OK) status = draw_levers(r, error);
  if (status == MHO_OK && r->gallery.without_gnuplot)
    mho_output_note(&r->output, "gnuplot was not found: figures are left out");
  return status;
}

/* The drawing of each molecule, in the report and as a file of its own. */
static mho_status draw_molecules(run *r, mho_error *error)
{
  mho_status status = MHO_OK;
  for (int i = 0; status == MHO_OK && i < r->study->molecule_count; i++) {
    const mho_molecule *molecule = &r->study->molecule[i];
    mho_portrait *portrait = &r->portrait[i];
    mho_drawing drawing;
    char *file = mho_print_text("molecule-%d.svg", i + 1);
    if (!file) status = fail_memory(error);
    portrait->name = molecule->name;
    mho_status drawn = mho_drawing_make(molecule, &drawing, error);
    if (status == MHO_OK) status = drawn;
    if (status == MHO_OK) {
      mho_drawing_write(&drawing, NULL, &portrait->svg);
      status = mho_buffer_check(&portrait->svg, "study", error);
    }
    if (status == MHO_OK) status = mho_folder_write(&r->folder, file, &portrait->svg, error);
    mho_drawing_clear(&drawing);
    free(file);
  }
  return status;
}

static mho_status write_tables(run *r, mho_error *error)
{
  for (size_t i = 0; i < r->output.tables; i++) {
    mho_buffer buffer = {0};
    char *file = mho_print_text("%s.csv", r->output.table[i].name);
    mho_status status = file ? MHO_OK : fail_memory(error);
    if (status == MHO_OK)
      status = mho_write_csv(&r->output.table[i], TABLE_DIGITS, &buffer, error);
    if (status == MHO_OK) status = mho_folder_write(&r->folder, file, &buffer, error);
    mho_buffer_clear(&buffer);
    free(file);
    if (status != MHO_OK) return status;
  }
  return MHO_OK;
}

static json_t *json_results(const run *r)
{
  json_t *object = json_object(), *answers = json_array(), *limits = json_array();
  for (size_t i = 0; i < r->answers.count; i++)
    answers = mho_json_append(answers, mho_json_text(r->answers.sentence[i]));
  size_t count;
  const char *const *limit = mho_limits(&count);
  for (size_t i = 0; i < count; i++) limits = mho_json_append(limits, mho_json_text(limit[i]));
  object = mho_json_with(object, "schema", mho_json_text(MHO_JSON_SCHEMA));
  object = mho_json_with(object, "study", mho_json_text(r->study->title));
  object = mho_json_with(object, "answer", answers);
  return mho_json_with(object, "limits", limits);
}

static mho_status write_results(run *r, mho_error *error)
{
  const mho_study *s = r->study;
  mho_checked *checked = calloc((size_t)s->molecule_count, sizeof *checked);
  json_t *object = json_results(r);
  mho_buffer buffer = {0};
  mho_status status = checked && object ? MHO_OK : fail_memory(error);
  if (status == MHO_OK) {
    for (int i = 0; i < s->molecule_count; i++)
      checked[i] = (mho_checked){&s->molecule[i], &r->outcome[i].junction, r->outcome[i].warnings};
    object = mho_json_with(object, "molecules",
                        mho_json_molecules(checked, (size_t)s->molecule_count));
    object = mho_json_with(object, "tables", mho_json_tables(&r->output));
    object = mho_json_with(object, "warnings", mho_json_warnings(&r->output));
    object = mho_json_with(object, "notes", mho_json_notes(&r->output));
    status = mho_json_write(object, &buffer, error);
    object = NULL;
  }
  if (status == MHO_OK) status = mho_folder_write(&r->folder, "results.json", &buffer, error);
  json_decref(object);
  mho_buffer_clear(&buffer);
  free(checked);
  return status;
}

static mho_status write_report(run *r, mho_error *error)
{
  mho_report report = {.title = r->study->title,
                       .portrait = r->portrait,
                       .portraits = (size_t)r->study->molecule_count,
                       .output = &r->output,
                       .answer = r->answers.sentence,
                       .answers = r->answers.count,
                       .figure = r->gallery.figure,
                       .figures = r->gallery.figures,
                       .remark = r->levers.remark,
                       .remarks = r->levers.remarks,
                       .without_gnuplot = r->gallery.without_gnuplot};
  mho_buffer buffer = {0};
  mho_status status = mho_write_html(&report, &buffer, error);
  if (status == MHO_OK) status = mho_folder_write(&r->folder, "report.html", &buffer, error);
  mho_buffer_clear(&buffer);
  if (status != MHO_OK) return status;
  status = mho_write_provenance(r->study, r->options->command, mho_folder_list(&r->folder), &buffer,
                                error);
  if (status == MHO_OK) status = mho_folder_write(&r->folder, "provenance.json", &buffer, error);
  mho_buffer_clear(&buffer);
  return status;
}

/* STUDY-results beside the study. */
static char *default_folder(const mho_study *study)
{
  const char *path = study->path, *slash = strrchr(path, '/');
  const char *stem = slash ? slash + 1 : path, *dot = strrchr(stem, '.');
  size_t length = dot && dot > stem ? (size_t)(dot - path) : strlen(path);
  return mho_print_text("%.*s-results", (int)length, path);
}

/* The list into a store of the results folder, and ranked. */
static mho_status screen(run *r, mho_error *error)
{
  const mho_study *s = r->study;
  if (!s->screen_list) return MHO_OK;
  mho_screen_counts counts = {0};
  mho_screen_job job = mho_screen_job_defaults();
  job.list = s->screen_list;
  job.settings = &s->screen_settings;
  job.defaults = &s->defaults;
  job.even_batches = true;
  job.screen.window_ev = s->window_ev;
  job.goal = s->screening.has_goal ? &s->screening.goal : NULL;
  job.requirement = s->screening.requirement;
  job.requirements = (size_t)s->screening.requirements;
  job.cancel = r->options->cancel;
  char *path = mho_folder_path(&r->folder, "screening.db"), *sentence = NULL;
  mho_screening_view view = {.all = !s->screening.has_top, .remarks = true};
  mho_status status = path ? step(r, "screening", error) : fail_memory(error);
  if (status == MHO_OK) status = mho_screen_run(&job, path, false, &counts, error);
  if (status == MHO_OK)
    status = mho_screening_list(&s->screening, path, &view, &r->output, &sentence, error);
  if (status == MHO_OK && counts.bad) status = mho_screening_failures(path, &r->output, error);
  if (status == MHO_OK) mho_answers_add(&r->answers, sentence);
  else free(sentence);
  free(path);
  return status;
}

static void answer(run *r)
{
  const mho_study *s = r->study;
  mho_answers_conductance(&r->answers, s, r->conductance);
  if (r->compare) mho_answers_agreement(&r->answers, s, &r->agreement);
  mho_answers_levers(&r->answers, &r->levers);
  for (int i = 0; i < s->traces_count; i++)
    mho_answers_add(&r->answers, mho_measured_sentence(s, &s->traces[i], &r->measured[i]));
}

static mho_status execute(run *r, mho_error *error)
{
  const mho_study *s = r->study;
  mho_status status = build_junctions(r, error);
  if (status == MHO_OK) status = read_traces(r, error);
  for (int i = 0; status == MHO_OK && i < s->molecule_count; i++)
    status = compute_molecule(r, i, error);
  if (status == MHO_OK) status = compare(r, error);
  if (status != MHO_OK) return status;
  fill_tables(r);
  status = compute_levers(r, error);
  if (status != MHO_OK) return status;
  answer(r);
  status = screen(r, error);
  if (status == MHO_OK) status = draw_molecules(r, error);
  if (status == MHO_OK) status = draw_figures(r, error);
  if (status == MHO_OK) status = step(r, "report", error);
  if (status == MHO_OK && r->answers.failed) status = fail_memory(error);
  if (status == MHO_OK) status = mho_output_check(&r->output, error);
  if (status == MHO_OK) status = write_tables(r, error);
  if (status == MHO_OK) status = write_results(r, error);
  if (status == MHO_OK) status = write_report(r, error);
  if (status == MHO_OK) status = step(r, "done", error);
  if (status == MHO_OK) status = mho_folder_commit(&r->folder, error);
  for (size_t i = 0; status == MHO_OK && r->options->answer && i < r->answers.count; i++)
    r->options->answer(r->answers.sentence[i], r->options->user);
  return status;
}

static void run_clear(run *r)
{
  for (int i = 0; r->outcome && i < r->study->molecule_count; i++) {
    mho_junction_clear(&r->outcome[i].junction);
    free(r->outcome[i].energy_ev);
    free(r->outcome[i].point);
    free(r->outcome[i].node_ev);
  }
  for (int i = 0; r->measured && i < r->study->traces_count; i++)
    mho_measured_clear(&r->measured[i]);
  mho_answers_clear(&r->answers);
  mho_gallery_clear(&r->gallery);
  for (int i = 0; r->portrait && i < r->study->molecule_count; i++)
    mho_buffer_clear(&r->portrait[i].svg);
  mho_levers_clear(&r->levers);
  free(r->portrait);
  free(r->outcome);
  free(r->conductance);
  free(r->comparison);
  free(r->error_decades);
  free(r->measured);
  free(r->peak);
  mho_output_clear(&r->output);
  mho_folder_close(&r->folder);
}

mho_status mho_study_run(const mho_study *study, const mho_run_options *options, char **folder,
                         mho_error *error)
{
  size_t n = (size_t)study->molecule_count;
  static const mho_run_options nothing = {0};
  run r = {.study = study, .options = options ? options : &nothing};
  r.steps = study->molecule_count + (study->molecule_count + MHO_CURVES_MAX - 1) / MHO_CURVES_MAX + 2 +
            study->traces_count + (mho_levers_asked(study) ? study->molecule_count : 0) +
            (study->compare ? study->molecule_count : 0) + (study->screen_list != NULL);
  r.gallery.folder = &r.folder;
  r.outcome = calloc(n, sizeof *r.outcome);
  r.portrait = calloc(n, sizeof *r.portrait);
  r.conductance = calloc(n, sizeof *r.conductance);
  r.comparison = calloc(n, sizeof *r.comparison);
  r.error_decades = calloc(n, sizeof *r.error_decades);
  r.measured = calloc((size_t)study->traces_count + 1, sizeof *r.measured);
  r.peak = calloc((size_t)(study->peak_count + study->traces_count) + 1, sizeof *r.peak);
  char *target = r.options->folder ? mho_copy_text(r.options->folder) : default_folder(study);
  mho_status status =
      r.outcome && r.portrait && r.conductance && r.comparison && r.error_decades && r.measured &&
              r.peak && target
          ? MHO_OK
          : fail_memory(error);
  if (status == MHO_OK) status = mho_folder_open(target, &r.folder, error);
  if (status == MHO_OK) status = execute(&r, error);
  run_clear(&r);
  if (status == MHO_OK && folder) *folder = target;
  else free(target);
  return status;
}
