/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Reads a study file and the molecules it names.
 */
#include <errno.h>
#include <glob.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

#include <mho/molecule_file.h>

#include "base/text.h"
#include "input/molecule_node.h"
#include "input/yaml.h"
#include "measure/settings.h"
#include "study/study.h"

#define COUNT(array) (sizeof(array) / sizeof *(array))
#define PEAK_LOW_G0 1e-15
#define PEAK_HIGH_G0 1e3

enum { MOLECULES_MAX = 1000 };

typedef struct {
  mho_yaml yaml;
  mho_study *study;
  const mho_settings *overrides;
} reader;

static void fail_memory(const reader *r)
{
  mho_fail_at(r->yaml.error, MHO_ERR_MEMORY, "study", r->yaml.file, 0, 0, NULL,
              "out of memory");
}

static bool add_input(reader *r, const char *path, const char *name)
{
  mho_study *s = r->study;
  mho_study_input *larger =
      realloc(s->input, (size_t)(s->input_count + 1) * sizeof *larger);
  if (larger) s->input = larger;
  mho_study_input input = {mho_copy_text(path), mho_copy_text(name)};
  if (!larger || !input.path || !input.name) {
    free(input.path);
    free(input.name);
    fail_memory(r);
    return false;
  }
  s->input[s->input_count++] = input;
  return true;
}

static void read_defaults(reader *r)
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
static mho_molecule *add_molecule(reader *r, const mho_yaml_node *node)
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
    fail_memory(r);
    return NULL;
  }
  s->molecule = larger;
  mho_molecule_init(&s->molecule[s->molecule_count]);
  return &s->molecule[s->molecule_count++];
}

static void check_name(reader *r, const mho_yaml_node *node, const mho_molecule *molecule)
{
  const mho_study *s = r->study;
  for (int i = 0; i + 1 < s->molecule_count; i++)
    if (s->molecule[i].name && molecule->name && !strcmp(s->molecule[i].name, molecule->name))
      mho_yaml_fail(&r->yaml, node, MHO_ERR_KEY, "molecules",
                    "molecules: the name '%.60s' stands in %.200s already; names must differ",
                    molecule->name, s->molecule[i].source);
}

static void read_molecule_file(reader *r, const mho_yaml_node *node, const char *path)
{
  mho_molecule *molecule = add_molecule(r, node);
  if (!molecule) return;
  mho_status status =
      mho_molecule_read(path, &r->study->defaults, r->overrides, molecule, r->yaml.error);
  if (status == MHO_OK && add_input(r, path, path)) check_name(r, node, molecule);
}

static int compare_paths(const void *a, const void *b)
{
  return strcmp(*(char *const *)a, *(char *const *)b);
}

/* A file, or a pattern of files in bytewise order; glob's to free where true. */
static bool find_files(reader *r, const mho_yaml_node *node, const char *field, glob_t *found)
{
  const char *name;
  if (!mho_yaml_get_text(&r->yaml, node, field, &name)) return false;
  char *path = mho_path_beside(r->yaml.file, name);
  *found = (glob_t){0};
  int code = path ? glob(path, GLOB_NOSORT, NULL, found) : GLOB_NOSPACE;
  if (code == GLOB_NOSPACE) fail_memory(r);
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

static void read_molecule_files(reader *r, const mho_yaml_node *node)
{
  glob_t found;
  if (!find_files(r, node, "file", &found)) return;
  for (size_t i = 0; i < found.gl_pathc; i++) read_molecule_file(r, node, found.gl_pathv[i]);
  globfree(&found);
}

static void read_molecules(reader *r)
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

/* Index of the molecule a text names; a dangling name is an error. */
static bool read_molecule_name(reader *r, const mho_yaml_node *node, const char *field,
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

static void read_peak(reader *r, const mho_yaml_node *node, mho_measured_peak *peak)
{
  static const char *const keys[] = {"molecule", "peak", "spread", "histogram"};
  static const char *const kinds[] = {"log", "linear"};
  if (!mho_yaml_is(&r->yaml, node, MHO_YAML_MAPPING, "a measured value")) return;
  mho_yaml_check_keys(&r->yaml, node, keys, COUNT(keys));
  bool good = read_molecule_name(r, mho_yaml_require(&r->yaml, node, "molecule"), "molecule",
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

static void read_trace_options(reader *r, const mho_yaml_node *node, mho_trace_options *o)
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
  if (!o->columns) fail_memory(r);
}

/* The files belong to the inputs of the study. */
static bool keep_files(reader *r, mho_study_traces *traces, const glob_t *found)
{
  traces->path = calloc(found->gl_pathc, sizeof *traces->path);
  bool good = traces->path != NULL;
  for (size_t i = 0; good && i < found->gl_pathc; i++) {
    traces->path[i] = mho_copy_text(found->gl_pathv[i]);
    good = traces->path[i] && add_input(r, found->gl_pathv[i], found->gl_pathv[i]);
    traces->paths = i + 1;
  }
  if (!good) fail_memory(r);
  return good;
}

static void read_traces(reader *r, const mho_yaml_node *node)
{
  static const char *const keys[] = {"molecule", "traces", "bias", "series-resistance", "floor",
                                     "saturation", "columns", "sampling", "speed"};
  mho_study *s = r->study;
  mho_study_traces *larger = realloc(s->traces, (size_t)(s->traces_count + 1) * sizeof *larger);
  if (!larger) {
    fail_memory(r);
    return;
  }
  s->traces = larger;
  mho_study_traces *traces = &s->traces[s->traces_count++];
  *traces = (mho_study_traces){0};
  mho_yaml_check_keys(&r->yaml, node, keys, COUNT(keys));
  read_molecule_name(r, mho_yaml_require(&r->yaml, node, "molecule"), "molecule",
                     &traces->molecule);
  read_trace_options(r, node, &traces->options);
  glob_t found;
  if (!find_files(r, mho_yaml_find(node, "traces"), "traces", &found)) return;
  keep_files(r, traces, &found);
  globfree(&found);
}

static void read_measured(reader *r)
{
  const mho_yaml_node *list = mho_yaml_find(r->yaml.root, "measured");
  if (!mho_yaml_is(&r->yaml, list, MHO_YAML_LIST, "measured")) return;
  r->study->peak = calloc(list->count + 1, sizeof *r->study->peak);
  if (!r->study->peak) {
    fail_memory(r);
    return;
  }
  for (size_t i = 0; i < list->count; i++) {
    const mho_yaml_node *item = list->item[i];
    bool raw = item->kind == MHO_YAML_MAPPING && mho_yaml_find(item, "traces");
    if (raw) read_traces(r, item);
    else read_peak(r, item, &r->study->peak[r->study->peak_count]);
  }
}

static void read_transmission_question(reader *r, const mho_yaml_node *node)
{
  static const char *const keys[] = {"energies", "samples", "currents", "orbitals"};
  mho_study *s = r->study;
  if (!mho_yaml_is(&r->yaml, node, MHO_YAML_MAPPING, "transmission")) return;
  mho_yaml_check_keys(&r->yaml, node, keys, COUNT(keys));
  mho_yaml_get_flag(&r->yaml, mho_yaml_find(node, "currents"), "currents", &s->currents);
  mho_yaml_get_flag(&r->yaml, mho_yaml_find(node, "orbitals"), "orbitals", &s->orbitals);
  mho_yaml_get_integer(&r->yaml, mho_yaml_find(node, "samples"), "samples", 2, 100000,
                       &s->samples);
  const mho_yaml_node *range = mho_yaml_find(node, "energies");
  if (!mho_yaml_is(&r->yaml, range, MHO_YAML_LIST, "energies")) return;
  if (range->count != 2) {
    mho_yaml_fail(&r->yaml, range, MHO_ERR_SYNTAX, "energies",
                  "energies: two are needed, such as [-3 eV, 3 eV]");
    return;
  }
  bool low = mho_yaml_get_quantity(&r->yaml, range->item[0], "energies", MHO_ENERGY, -100, 100,
                                   &s->energy_low_ev);
  bool high = mho_yaml_get_quantity(&r->yaml, range->item[1], "energies", MHO_ENERGY, -100, 100,
                                    &s->energy_high_ev);
  if (low && high && !(s->energy_low_ev < s->energy_high_ev))
    mho_yaml_fail(&r->yaml, range, MHO_ERR_RANGE, "energies",
                  "energies: the range runs downwards; the lower end comes first");
}

/* The molecules that a question names, one or a list; without them every one
 * to which it applies (NULL: to all). */
static bool *read_asked(reader *r, const mho_yaml_node *node, const char *field,
                        bool (*applies)(const mho_molecule *))
{
  const mho_study *s = r->study;
  const mho_yaml_node *named = mho_yaml_find(node, "molecule");
  bool list = named && named->kind == MHO_YAML_LIST, any = false;
  bool *asked = calloc((size_t)s->molecule_count + 1, sizeof *asked);
  int index;
  if (!asked) {
    fail_memory(r);
    return NULL;
  }
  for (size_t i = 0; named && i < (list ? named->count : 1); i++)
    if (read_molecule_name(r, list ? named->item[i] : named, "molecule", &index)) asked[index] = true;
  for (int i = 0; !named && i < s->molecule_count; i++)
    any |= asked[i] = !applies || applies(&s->molecule[i]);
  if (!named && !any && r->yaml.error->count == 0)
    mho_yaml_fail(&r->yaml, node, MHO_ERR_REFERENCE, field,
                  "%s: no molecule has a bond that can turn; name a molecule and a bond", field);
  return asked;
}

/* Keys of a question: its options, and `molecule`. */
static bool read_options(reader *r, const mho_yaml_node *node, const char *field,
                         const mho_option *table, size_t count, void *options)
{
  const char *keys[16] = {"molecule"};
  if (!mho_yaml_is(&r->yaml, node, MHO_YAML_MAPPING, field)) return false;
  for (size_t i = 0; i < count; i++) keys[i + 1] = table[i].name;
  mho_yaml_check_keys(&r->yaml, node, keys, count + 1);
  mho_yaml_get_options(&r->yaml, node, table, count, options);
  return true;
}

/* What excludes each other, without the dashes of the command line. */
static void fail_conflict(reader *r, const mho_yaml_node *node, const char *field,
                          const char *conflict)
{
  char words[200];
  size_t used = 0;
  for (const char *c = conflict; *c && used < sizeof words - 1; c++)
    if (*c != '-' || (c[1] != '-' && (c == conflict || c[-1] != '-'))) words[used++] = *c;
  words[used] = '\0';
  mho_yaml_fail(&r->yaml, node, MHO_ERR_KEY, field, "%s: %s", field, words);
}

/* Bonds and potentials of a molecule, at the place that asks for them. */
static void check_twist(reader *r, const mho_yaml_node *node, const mho_molecule *molecule)
{
  const mho_twist_question *q = &r->study->twist;
  const mho_yaml_node *bond = mho_yaml_find(node, "bond");
  const mho_yaml_node *torsion_node = mho_yaml_find(node, "torsion");
  mho_twist_bonds bonds;
  mho_torsion torsion[MHO_TWIST_AVERAGE_BONDS_MAX];
  char reason[480], *names = NULL;
  mho_error own;
  mho_error_init(&own);
  mho_status status = mho_twist_choose(q, molecule, &bonds, reason, sizeof reason);
  if (status != MHO_OK)
    mho_yaml_fail(&r->yaml, bond ? bond : node, status, "bond", "bond: in '%.60s', %s",
                  molecule->name ? molecule->name : "", reason);
  else if (q->average || q->torsion.text[0])
    status = mho_twist_potentials(q, molecule, &bonds, torsion, &names, &own);
  for (int i = 0; i < own.count; i++)
    if (own.cause[i].line > 0) /* of the table */
      mho_fail_at(r->yaml.error, own.cause[i].status, "study", own.cause[i].file, own.cause[i].line,
                  own.cause[i].column, "torsion", "%s", own.cause[i].message);
    else
      mho_yaml_fail(&r->yaml, torsion_node ? torsion_node : node, own.cause[i].status, "torsion",
                    "%s%s", own.cause[i].status == MHO_ERR_FILE ? "torsion: the table " : "",
                    own.cause[i].message);
  free(names);
  mho_twist_bonds_clear(&bonds);
}

/* A table of energies is beside the study, and one of its inputs. */
static void find_torsion_table(reader *r)
{
  mho_option_text *torsion = &r->study->twist.torsion;
  size_t length = strlen(torsion->text);
  if (length < 5 || strcmp(torsion->text + length - 4, ".csv")) return;
  char *path = mho_path_beside(r->yaml.file, torsion->text);
  if (!path) fail_memory(r);
  else if (strlen(path) < sizeof torsion->text) {
    memcpy(torsion->text, path, strlen(path) + 1);
    if (access(path, R_OK) == 0) add_input(r, path, path);
  }
  free(path);
}

static void read_twist_question(reader *r, const mho_yaml_node *node)
{
  mho_study *s = r->study;
  size_t count;
  const mho_option *table = mho_twist_options(&count);
  if (!read_options(r, node, "twist", table, count, &s->twist)) return;
  const char *conflict = mho_twist_conflict(&s->twist, false);
  if (conflict) fail_conflict(r, node, "twist", conflict);
  find_torsion_table(r);
  s->asks_twist = read_asked(r, node, "twist", mho_twist_applies);
  for (int i = 0; r->yaml.error->count == 0 && s->asks_twist && i < s->molecule_count; i++)
    if (s->asks_twist[i]) check_twist(r, node, &s->molecule[i]);
}

static void read_interference_question(reader *r, const mho_yaml_node *node)
{
  mho_study *s = r->study;
  size_t count;
  const mho_option *table = mho_interference_question_options(&count);
  if (!read_options(r, node, "interference", table, count, &s->interference)) return;
  const char *conflict = mho_interference_conflict(&s->interference, false);
  if (conflict) fail_conflict(r, node, "interference", conflict);
  s->asks_interference = read_asked(r, node, "interference", NULL);
  const mho_yaml_node *from = mho_yaml_find(node, "from");
  for (int i = 0; from && s->asks_interference && i < s->molecule_count; i++)
    if (s->asks_interference[i] && s->molecule[i].site_count > 0 &&
        mho_molecule_find_site(&s->molecule[i], s->interference.from.text) < 0)
      mho_yaml_fail(&r->yaml, from, MHO_ERR_REFERENCE, "from",
                    "from: there is no site '%.60s' in the pi system of '%.60s'",
                    s->interference.from.text, s->molecule[i].name ? s->molecule[i].name : "");
}

static void read_requirement(reader *r, const mho_yaml_node *node)
{
  mho_screening_question *q = &r->study->screening;
  const char *text;
  char reason[1000];
  if (!mho_yaml_get_text(&r->yaml, node, "require", &text)) return;
  if (q->requirements == SCREENING_REQUIREMENTS_MAX)
    mho_yaml_fail(&r->yaml, node, MHO_ERR_RANGE, "require", "require: at most %d are allowed",
                  SCREENING_REQUIREMENTS_MAX);
  else if (mho_screen_require_read(text, &q->requirement[q->requirements++], reason,
                                   sizeof reason) != MHO_OK)
    mho_yaml_fail(&r->yaml, node, MHO_ERR_RANGE, "require", "require: %s", reason);
}

/* A list is one of the inputs, and beside the study; of a folder the store says
 * what was in it. */
static void read_screen_list(reader *r, const mho_yaml_node *node)
{
  const char *name;
  struct stat about;
  if (!mho_yaml_get_text(&r->yaml, node, "list", &name)) return;
  char *path = r->study->screen_list = mho_path_beside(r->yaml.file, name);
  if (!path) fail_memory(r);
  else if (stat(path, &about) != 0)
    mho_yaml_fail(&r->yaml, node, MHO_ERR_FILE, "list", "list: %.300s cannot be read: %s", path,
                  strerror(errno));
  else if (!S_ISDIR(about.st_mode)) add_input(r, path, path);
}

static void read_screen_question(reader *r, const mho_yaml_node *node)
{
  static const char *const keys[] = {"list", "goal", "require", "top"};
  mho_screening_question *q = &r->study->screening;
  const char *text;
  char reason[1000];
  if (!mho_yaml_is(&r->yaml, node, MHO_YAML_MAPPING, "screen")) return;
  mho_yaml_check_keys(&r->yaml, node, keys, COUNT(keys));
  if (mho_settings_merge(&r->study->screen_settings, r->overrides) != MHO_OK) fail_memory(r);
  read_screen_list(r, mho_yaml_require(&r->yaml, node, "list"));
  const mho_yaml_node *goal = mho_yaml_find(node, "goal");
  if (mho_yaml_get_text(&r->yaml, goal, "goal", &text)) {
    q->has_goal = true;
    if (mho_screen_goal_read(text, &q->goal, reason, sizeof reason) != MHO_OK)
      mho_yaml_fail(&r->yaml, goal, MHO_ERR_RANGE, "goal", "goal: %s", reason);
  }
  const mho_yaml_node *require = mho_yaml_find(node, "require");
  bool list = require && require->kind == MHO_YAML_LIST;
  for (size_t i = 0; require && i < (list ? require->count : 1); i++)
    read_requirement(r, list ? require->item[i] : require);
  q->has_top = mho_yaml_get_integer(&r->yaml, mho_yaml_find(node, "top"), "top", 1, 1000000, &q->top);
}

static void read_questions(reader *r)
{
  static const char *const keys[] = {"conductance", "transmission", "twist", "interference",
                                     "screen", "compare"};
  static const char *const conductance_keys[] = {"window", "sensitivity"};
  static const char *const compare_keys[] = {"reference"};
  mho_study *s = r->study;
  const mho_yaml_node *node = mho_yaml_find(r->yaml.root, "questions");
  s->compare = s->peak_count + s->traces_count > 0;
  if (!mho_yaml_is(&r->yaml, node, MHO_YAML_MAPPING, "questions")) return;
  mho_yaml_check_keys(&r->yaml, node, keys, COUNT(keys));
  read_transmission_question(r, mho_yaml_find(node, "transmission"));
  read_twist_question(r, mho_yaml_find(node, "twist"));
  read_interference_question(r, mho_yaml_find(node, "interference"));
  read_screen_question(r, mho_yaml_find(node, "screen"));
  const mho_yaml_node *conductance = mho_yaml_find(node, "conductance");
  if (mho_yaml_is(&r->yaml, conductance, MHO_YAML_MAPPING, "conductance")) {
    mho_yaml_check_keys(&r->yaml, conductance, conductance_keys, COUNT(conductance_keys));
    mho_yaml_get_quantity(&r->yaml, mho_yaml_find(conductance, "window"), "window", MHO_ENERGY,
                          0.0, 10.0, &s->window_ev);
    mho_yaml_get_flag(&r->yaml, mho_yaml_find(conductance, "sensitivity"), "sensitivity",
                      &s->sensitivity);
  }
  const mho_yaml_node *compare = mho_yaml_find(node, "compare");
  if (!mho_yaml_is(&r->yaml, compare, MHO_YAML_MAPPING, "compare")) return;
  mho_yaml_check_keys(&r->yaml, compare, compare_keys, COUNT(compare_keys));
  if (s->peak_count + s->traces_count == 0)
    mho_yaml_fail(&r->yaml, compare, MHO_ERR_KEY, "compare",
                  "compare: there is nothing to compare with; give 'measured' values");
  const mho_yaml_node *reference = mho_yaml_find(compare, "reference");
  if (!reference || !read_molecule_name(r, reference, "reference", &s->reference)) return;
  bool measured = false;
  for (int p = 0; p < s->peak_count; p++) measured |= s->peak[p].molecule == s->reference;
  for (int t = 0; t < s->traces_count; t++) measured |= s->traces[t].molecule == s->reference;
  if (!measured)
    mho_yaml_fail(&r->yaml, reference, MHO_ERR_REFERENCE, "reference",
                  "reference: '%.60s' has no measured value to take ratios to",
                  reference->text);
}

/* A molecule file in place of a study is one mistake, not one for each key. */
static bool is_molecule(const mho_yaml_node *root)
{
  return !mho_yaml_find(root, "study") && !mho_yaml_find(root, "molecules") &&
         (mho_yaml_find(root, "smiles") || mho_yaml_find(root, "structure") ||
          mho_yaml_find(root, "sites"));
}

static void read_study(reader *r)
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
    if (!r->study->title) fail_memory(r);
  }
  read_defaults(r);
  read_molecules(r);
  read_measured(r);
  read_questions(r);
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
  reader r = {.study = study, .overrides = overrides};
  int before = error->count;
  mho_status status = mho_yaml_read(path, &r.yaml, error);
  study->path = mho_copy_text(path);
  if (!study->path) fail_memory(&r);
  if (status == MHO_OK || (status == MHO_ERR_KEY && r.yaml.root)) {
    add_input(&r, path, path);
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
