/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Reads the questions of a study file.
 */
#include <errno.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

#include "base/text.h"
#include "study/study_reader.h"

static void read_transmission_question(mho_study_reader *r, const mho_yaml_node *node)
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
static bool *read_asked(mho_study_reader *r, const mho_yaml_node *node, const char *field,
                        bool (*applies)(const mho_molecule *))
{
  const mho_study *s = r->study;
  const mho_yaml_node *named = mho_yaml_find(node, "molecule");
  bool list = named && named->kind == MHO_YAML_LIST, any = false;
  bool *asked = calloc((size_t)s->molecule_count + 1, sizeof *asked);
  int index;
  if (!asked) {
    mho_study_no_memory(r);
    return NULL;
  }
  for (size_t i = 0; named && i < (list ? named->count : 1); i++)
    if (mho_study_find_molecule(r, list ? named->item[i] : named, "molecule", &index)) asked[index] = true;
  for (int i = 0; !named && i < s->molecule_count; i++)
    any |= asked[i] = !applies || applies(&s->molecule[i]);
  if (!named && !any && r->yaml.error->count == 0)
    mho_yaml_fail(&r->yaml, node, MHO_ERR_REFERENCE, field,
                  "%s: no molecule has a bond that can turn; name a molecule and a bond", field);
  return asked;
}

/* Keys of a question: its options, and `molecule`. */
static bool read_options(mho_study_reader *r, const mho_yaml_node *node, const char *field,
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
static void fail_conflict(mho_study_reader *r, const mho_yaml_node *node, const char *field,
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
static void check_twist(mho_study_reader *r, const mho_yaml_node *node, const mho_molecule *molecule)
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
static void find_torsion_table(mho_study_reader *r)
{
  mho_option_text *torsion = &r->study->twist.torsion;
  size_t length = strlen(torsion->text);
  if (length < 5 || strcmp(torsion->text + length - 4, ".csv")) return;
  char *path = mho_path_beside(r->yaml.file, torsion->text);
  if (!path) mho_study_no_memory(r);
  else if (strlen(path) < sizeof torsion->text) {
    memcpy(torsion->text, path, strlen(path) + 1);
    if (access(path, R_OK) == 0) mho_study_add_input(r, path, path);
  }
  free(path);
}

static void read_twist_question(mho_study_reader *r, const mho_yaml_node *node)
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

static void read_interference_question(mho_study_reader *r, const mho_yaml_node *node)
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

static void read_requirement(mho_study_reader *r, const mho_yaml_node *node)
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
static void read_screen_list(mho_study_reader *r, const mho_yaml_node *node)
{
  const char *name;
  struct stat about;
  if (!mho_yaml_get_text(&r->yaml, node, "list", &name)) return;
  char *path = r->study->screen_list = mho_path_beside(r->yaml.file, name);
  if (!path) mho_study_no_memory(r);
  else if (stat(path, &about) != 0)
    mho_yaml_fail(&r->yaml, node, MHO_ERR_FILE, "list", "list: %.300s cannot be read: %s", path,
                  strerror(errno));
  else if (!S_ISDIR(about.st_mode)) mho_study_add_input(r, path, path);
}

static void read_screen_question(mho_study_reader *r, const mho_yaml_node *node)
{
  static const char *const keys[] = {"list", "goal", "require", "top"};
  mho_screening_question *q = &r->study->screening;
  const char *text;
  char reason[1000];
  if (!mho_yaml_is(&r->yaml, node, MHO_YAML_MAPPING, "screen")) return;
  mho_yaml_check_keys(&r->yaml, node, keys, COUNT(keys));
  if (mho_settings_merge(&r->study->screen_settings, r->overrides) != MHO_OK) mho_study_no_memory(r);
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

void mho_study_read_questions(mho_study_reader *r)
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
  if (!reference || !mho_study_find_molecule(r, reference, "reference", &s->reference)) return;
  bool measured = false;
  for (int p = 0; p < s->peak_count; p++) measured |= s->peak[p].molecule == s->reference;
  for (int t = 0; t < s->traces_count; t++) measured |= s->traces[t].molecule == s->reference;
  if (!measured)
    mho_yaml_fail(&r->yaml, reference, MHO_ERR_REFERENCE, "reference",
                  "reference: '%.60s' has no measured value to take ratios to",
                  reference->text);
}
