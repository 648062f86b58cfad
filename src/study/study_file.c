/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Reads a study file and the molecules it names.
 */
#include <glob.h>
#include <stdlib.h>
#include <string.h>

#include <mho/molecule_file.h>

#include "base/text.h"
#include "input/molecule_node.h"
#include "measure/settings.h"
#include "study/study_reader.h"

#define PEAK_LOW_G0 1e-15
#define PEAK_HIGH_G0 1e3

void mho_study_no_memory(const mho_study_reader *r)
{
  mho_fail_at(r->yaml.error, MHO_ERR_MEMORY, "study", r->yaml.file, 0, 0, NULL,
              "out of memory");
}

bool mho_study_add_input(mho_study_reader *r, const char *path, const char *name)
{
  mho_study *s = r->study;
  mho_study_input *larger =
      realloc(s->input, (size_t)(s->input_count + 1) * sizeof *larger);
  if (larger) s->input = larger;
  mho_study_input input = {mho_copy_text(path), mho_copy_text(name)};
  if (!larger || !input.path || !input.name) {
    free(input.path);
    free(input.name);
    mho_study_no_memory(r);
    return false;
  }
  s->input[s->input_count++] = input;
  return true;
}

static void read_defaults(mho_study_reader *r)
{
  size_t count;
  const char *const *names = mho_settings_names(&count);
  const mho_yaml_node *node = mho_yaml_find(r->yaml.root, "defaults");
  if (!mho_yaml_is(&r->yaml, node, MHO_YAML_MAPPING, "defaults")) return;
  mho_yaml_check_keys(&r->yaml, node, names, count);
  mho_yaml_get_settings(&r->yaml, node, &r->study->defaults);
  /* A study's Fermi level is resolved in each molecule; its line is here. */
  r->study->defaults.fermi.line = r->study->defaults.fermi.column = 0;
}

/* Room for one more molecule, or NULL. */
static mho_molecule *add_molecule(mho_study_reader *r, const mho_yaml_node *node)
{
  mho_study *s = r->study;
  if (s->molecule_count >= MOLECULES_MAX) {
    mho_yaml_fail(&r->yaml, node, MHO_ERR_LIMIT, "molecules",
                  "molecules: more than %d are named", MOLECULES_MAX);
    return NULL;
  }
  mho_molecule *larger =
      realloc(s->molecule, (size_t)(s->molecule_count + 1) * sizeof *larger);
  if (!larger) {
    mho_study_no_memory(r);
    return NULL;
  }
  s->molecule = larger;
  mho_molecule_init(&s->molecule[s->molecule_count]);
  return &s->molecule[s->molecule_count++];
}

static void check_name(mho_study_reader *r, const mho_yaml_node *node, const mho_molecule *molecule)
{
  const mho_study *s = r->study;
  for (int i = 0; i + 1 < s->molecule_count; i++)
    if (s->molecule[i].name && molecule->name && !strcmp(s->molecule[i].name, molecule->name))
      mho_yaml_fail(&r->yaml, node, MHO_ERR_KEY, "molecules",
                    "molecules: the name '%.60s' stands in %.200s already; names must differ",
                    molecule->name, s->molecule[i].source);
}

static void read_molecule_file(mho_study_reader *r, const mho_yaml_node *node, const char *path)
{
  mho_molecule *molecule = add_molecule(r, node);
  if (!molecule) return;
  mho_status status =
      mho_molecule_read(path, &r->study->defaults, r->overrides, molecule, r->yaml.error);
  if (status == MHO_OK && mho_study_add_input(r, path, path)) check_name(r, node, molecule);
}

static int compare_paths(const void *a, const void *b)
{
  return strcmp(*(char *const *)a, *(char *const *)b);
}

/* A file, or a pattern of files in bytewise order; glob's to free where true. */
static bool find_files(mho_study_reader *r, const mho_yaml_node *node, const char *field, glob_t *found)
{
  const char *name;
  if (!mho_yaml_get_text(&r->yaml, node, field, &name)) return false;
  char *path = mho_path_beside(r->yaml.file, name);
  *found = (glob_t){0};
  int code = path ? glob(path, GLOB_NOSORT, NULL, found) : GLOB_NOSPACE;
  if (code == GLOB_NOSPACE) mho_study_no_memory(r);
  else if (code == GLOB_NOMATCH && !strpbrk(name, "*?["))
    mho_yaml_fail(&r->yaml, node, MHO_ERR_FILE, field,
                  "%s: '%.200s' does not exist; paths are relative to the study", field, path);
  else if (code != 0)
    mho_yaml_fail(&r->yaml, node, MHO_ERR_FILE, field,
                  "%s: no file matches '%.200s'; paths are relative to the study", field, path);
  if (code == 0) qsort(found->gl_pathv, found->gl_pathc, sizeof *found->gl_pathv, compare_paths);
  free(path);
  return code == 0;
}

static void read_molecule_files(mho_study_reader *r, const mho_yaml_node *node)
{
  glob_t found;
  if (!find_files(r, node, "file", &found)) return;
  for (size_t i = 0; i < found.gl_pathc; i++) read_molecule_file(r, node, found.gl_pathv[i]);
  globfree(&found);
}

static void read_molecules(mho_study_reader *r)
{
  static const char *const keys[] = {"file"};
  mho_molecule *molecule;
  const mho_yaml_node *list = mho_yaml_require(&r->yaml, r->yaml.root, "molecules");
  if (!mho_yaml_is(&r->yaml, list, MHO_YAML_LIST, "molecules")) return;
  if (list->count == 0)
    mho_yaml_fail(&r->yaml, list, MHO_ERR_LIMIT, "molecules", "molecules: at least one is needed");
  for (size_t i = 0; i < list->count; i++) {
    const mho_yaml_node *item = list->item[i];
    if (!mho_yaml_is(&r->yaml, item, MHO_YAML_MAPPING, "a molecule")) continue;
    if (mho_yaml_find(item, "smiles") || mho_yaml_find(item, "structure") ||
        mho_yaml_find(item, "sites")) {
      molecule = add_molecule(r, item);
      if (molecule && mho_molecule_read_node(&r->yaml, item, &r->study->defaults, r->overrides,
                                             molecule) == MHO_OK)
        check_name(r, item, molecule);
      continue;
    }
    mho_yaml_check_keys(&r->yaml, item, keys, COUNT(keys));
    const mho_yaml_node *file = mho_yaml_find(item, "file");
    if (file) read_molecule_files(r, file);
    else
      mho_yaml_fail(&r->yaml, item, MHO_ERR_KEY, "file",
                    "a molecule needs a 'file', a 'smiles', a 'structure' or its 'sites'");
  }
}

bool mho_study_find_molecule(mho_study_reader *r, const mho_yaml_node *node, const char *field,
                               int *index)
{
  const char *text;
  if (!mho_yaml_get_text(&r->yaml, node, field, &text)) return false;
  const char *name[MOLECULES_MAX];
  size_t count = 0;
  for (int i = 0; i < r->study->molecule_count; i++) {
    const char *known = r->study->molecule[i].name;
    if (known && !strcmp(known, text)) {
      *index = i;
      return true;
    }
    if (known) name[count++] = known;
  }
  const char *nearest = mho_nearest_word(text, name, count);
  if (nearest)
    mho_yaml_fail(&r->yaml, node, MHO_ERR_REFERENCE, field,
                  "%s: there is no molecule '%.60s'; did you mean '%.60s'?", field, text,
                  nearest);
  else
    mho_yaml_fail(&r->yaml, node, MHO_ERR_REFERENCE, field,
                  "%s: there is no molecule '%.60s' under 'molecules'", field, text);
  return false;
}

static void read_peak(mho_study_reader *r, const mho_yaml_node *node, mho_measured_peak *peak)
{
  static const char *const keys[] = {"molecule", "peak", "spread", "histogram"};
  static const char *const kinds[] = {"log", "linear"};
  if (!mho_yaml_is(&r->yaml, node, MHO_YAML_MAPPING, "a measured value")) return;
  mho_yaml_check_keys(&r->yaml, node, keys, COUNT(keys));
  bool good = mho_study_find_molecule(r, mho_yaml_require(&r->yaml, node, "molecule"), "molecule",
                                 &peak->molecule);
  good &= mho_yaml_get_quantity(&r->yaml, mho_yaml_require(&r->yaml, node, "peak"), "peak",
                                MHO_CONDUCTANCE, PEAK_LOW_G0, PEAK_HIGH_G0, &peak->peak_g0);
  peak->has_spread =
      mho_yaml_get_quantity(&r->yaml, mho_yaml_find(node, "spread"), "spread", MHO_DECADES,
                            0.0, 5.0, &peak->spread_decades);
  size_t kind = 0;
  const mho_yaml_node *histogram = mho_yaml_require(&r->yaml, node, "histogram");
  if (mho_yaml_get_choice(&r->yaml, histogram, "histogram", kinds, 2, &kind))
    peak->histogram = kind == 1 ? MHO_HISTOGRAM_LINEAR : MHO_HISTOGRAM_LOG;
  if (peak->histogram == MHO_HISTOGRAM_LINEAR && !mho_yaml_find(node, "spread"))
    mho_yaml_fail(&r->yaml, node, MHO_ERR_KEY, "spread",
                  "key 'spread' is missing here: the peak of a linear histogram lies lower than "
                  "that of a log one by an amount that depends on it");
  if (good) r->study->peak_count++;
}

static void read_trace_options(mho_study_reader *r, const mho_yaml_node *node, mho_trace_options *o)
{
  size_t count;
  const char *const *name = mho_trace_setting_names(&count), *text;
  mho_trace_options_init(o);
  for (size_t i = 0; i < count; i++) {
    const mho_yaml_node *item = mho_yaml_find(node, name[i]);
    char reason[320];
    if (!item || !mho_yaml_get_text(&r->yaml, item, name[i], &text)) continue;
    mho_status status = mho_trace_setting_read(o, name[i], text, reason, sizeof reason);
    if (status != MHO_OK)
      mho_yaml_fail(&r->yaml, item, status, name[i], "%s: %s", name[i], reason);
  }
  const mho_yaml_node *names = mho_yaml_find(node, "columns");
  if (!names || !mho_yaml_get_text(&r->yaml, names, "columns", &text)) return;
  o->columns = mho_copy_text(text);
  if (!o->columns) mho_study_no_memory(r);
}

/* The files belong to the inputs of the study. */
static bool keep_files(mho_study_reader *r, mho_study_traces *traces, const glob_t *found)
{
  traces->path = calloc(found->gl_pathc, sizeof *traces->path);
  bool good = traces->path != NULL;
  for (size_t i = 0; good && i < found->gl_pathc; i++) {
    traces->path[i] = mho_copy_text(found->gl_pathv[i]);
    good = traces->path[i] && mho_study_add_input(r, found->gl_pathv[i], found->gl_pathv[i]);
    traces->paths = i + 1;
  }
  if (!good) mho_study_no_memory(r);
  return good;
}

static void read_traces(mho_study_reader *r, const mho_yaml_node *node)
{
  static const char *const keys[] = {"molecule", "traces", "bias", "series-resistance", "floor",
                                     "saturation", "columns", "sampling", "speed"};
  mho_study *s = r->study;
  mho_study_traces *larger = realloc(s->traces, (size_t)(s->traces_count + 1) * sizeof *larger);
  if (!larger) {
    mho_study_no_memory(r);
    return;
  }
  s->traces = larger;
  mho_study_traces *traces = &s->traces[s->traces_count++];
  *traces = (mho_study_traces){0};
  mho_yaml_check_keys(&r->yaml, node, keys, COUNT(keys));
  mho_study_find_molecule(r, mho_yaml_require(&r->yaml, node, "molecule"), "molecule",
                     &traces->molecule);
  read_trace_options(r, node, &traces->options);
  glob_t found;
  if (!find_files(r, mho_yaml_find(node, "traces"), "traces", &found)) return;
  keep_files(r, traces, &found);
  globfree(&found);
}

static void read_measured(mho_study_reader *r)
{
  const mho_yaml_node *list = mho_yaml_find(r->yaml.root, "measured");
  if (!mho_yaml_is(&r->yaml, list, MHO_YAML_LIST, "measured")) return;
  r->study->peak = calloc(list->count + 1, sizeof *r->study->peak);
  if (!r->study->peak) {
    mho_study_no_memory(r);
    return;
  }
  for (size_t i = 0; i < list->count; i++) {
    const mho_yaml_node *item = list->item[i];
    bool raw = item->kind == MHO_YAML_MAPPING && mho_yaml_find(item, "traces");
    if (raw) read_traces(r, item);
    else read_peak(r, item, &r->study->peak[r->study->peak_count]);
  }
}

/* A molecule file in place of a study is one mistake, not one for each key. */
static bool is_molecule(const mho_yaml_node *root)
{
  return !mho_yaml_find(root, "study") && !mho_yaml_find(root, "molecules") &&
         (mho_yaml_find(root, "smiles") || mho_yaml_find(root, "structure") ||
          mho_yaml_find(root, "sites"));
}

static void read_study(mho_study_reader *r)
{
  static const char *const keys[] = {"study", "defaults", "molecules", "measured", "questions"};
  const char *title;
  if (is_molecule(r->yaml.root)) {
    mho_yaml_fail(&r->yaml, r->yaml.root, MHO_ERR_KEY, "study",
                  "this is a molecule, not a study; a study lists it under 'molecules'");
    return;
  }
  mho_yaml_check_keys(&r->yaml, r->yaml.root, keys, COUNT(keys));
  const mho_yaml_node *node = mho_yaml_require(&r->yaml, r->yaml.root, "study");
  if (mho_yaml_get_text(&r->yaml, node, "study", &title)) {
    r->study->title = mho_copy_text(title);
    if (!r->study->title) mho_study_no_memory(r);
  }
  read_defaults(r);
  read_molecules(r);
  read_measured(r);
  mho_study_read_questions(r);
}

mho_status mho_study_read(const char *path, const mho_settings *overrides,
                          mho_study **result, mho_error *error)
{
  *result = NULL;
  mho_error own;
  if (!error) {
    mho_error_init(&own);
    error = &own;
  }
  mho_study *study = calloc(1, sizeof *study);
  if (!study) return mho_fail(error, MHO_ERR_MEMORY, "study", NULL, "out of memory");
  study->window_ev = MHO_DEFAULT_WINDOW_EV;
  study->reference = -1;
  study->energy_low_ev = -3.0;
  study->energy_high_ev = 3.0;
  mho_study_reader r = {.study = study, .overrides = overrides};
  int before = error->count;
  mho_status status = mho_yaml_read(path, &r.yaml, error);
  study->path = mho_copy_text(path);
  if (!study->path) mho_study_no_memory(&r);
  if (status == MHO_OK || (status == MHO_ERR_KEY && r.yaml.root)) {
    mho_study_add_input(&r, path, path);
    read_study(&r);
  }
  mho_yaml_clear(&r.yaml);
  if (status == MHO_OK && error->count > before) status = error->cause[before].status;
  if (status != MHO_OK) mho_study_free(study);
  else *result = study;
  return status;
}

void mho_study_free(mho_study *study)
{
  if (!study) return;
  for (int i = 0; i < study->molecule_count; i++) mho_molecule_clear(&study->molecule[i]);
  for (int i = 0; i < study->input_count; i++) {
    free(study->input[i].path);
    free(study->input[i].name);
  }
  for (int t = 0; t < study->traces_count; t++) {
    for (size_t i = 0; i < study->traces[t].paths; i++) free(study->traces[t].path[i]);
    free(study->traces[t].path);
    free((char *)(size_t)study->traces[t].options.columns);
  }
  free(study->traces);
  free(study->screen_list);
  mho_settings_clear(&study->screen_settings);
  free(study->asks_twist);
  free(study->asks_interference);
  free(study->molecule);
  free(study->input);
  free(study->peak);
  free(study->path);
  free(study->title);
  mho_settings_clear(&study->defaults);
  free(study);
}
