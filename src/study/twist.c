/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "study/twist.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/text.h"
#include "report/stages.h"

#define DEFAULT_REACH_EV 3.0

enum { SWEEP_ANGLES = 91, MAP_ANGLES = 46, MAP_ENERGIES = 201, PLANE_ANGLES_MAX = 500,
       NAME_SIZE = 2 * MHO_ID_SIZE + 2 };

const mho_option *mho_twist_options(size_t *count)
{
#define AT(member) offsetof(mho_twist_question, member)
  static const mho_option table[] = {
      {"bond", MHO_OPTION_LIST, AT(bond), 0, 0, 0, NULL},
      {"angles", MHO_OPTION_RANGE, AT(angles), MHO_ANGLE, -360, 360, "0 deg, 90 deg"},
      {"energies", MHO_OPTION_RANGE, AT(energies), MHO_ENERGY, -1000, 1000, "-3 eV, 3 eV"},
      {"samples", MHO_OPTION_COUNT, AT(samples), 0, 2, 1000000, NULL},
      {"at", MHO_OPTION_QUANTITY, AT(at), MHO_ANGLE, -360, 360, NULL},
      {"map", MHO_OPTION_FLAG, AT(map), 0, 0, 0, NULL},
      {"average", MHO_OPTION_FLAG, AT(average), 0, 0, 0, NULL},
      {"torsion", MHO_OPTION_TEXT, AT(torsion), 0, 0, 0, NULL}};
#undef AT
  *count = sizeof table / sizeof *table;
  return table;
}

const char *mho_twist_conflict(const mho_twist_question *q, bool one_table)
{
  bool average = q->average || q->torsion.text[0];
  if (q->at.given && (q->samples.given || q->angles.given))
    return "--at gives one row; it excludes --angles and --samples";
  if (q->map && q->at.given) return "--map covers a range of angles; it excludes --at";
  if (q->energies.given && (!q->map || q->bond.count == 2))
    return "--energies belongs to --map of one angle";
  if (one_table && average && (q->map || q->at.given || q->samples.given || q->angles.given))
    return "--average and --torsion average over all angles; they exclude --map, --at, --angles "
           "and --samples";
  return NULL;
}

static mho_status fail_memory(mho_error *error)
{
  return mho_fail(error, MHO_ERR_MEMORY, "study", NULL, "out of memory");
}

/* --- which bonds ---------------------------------------------------------- */

static bool can_turn(const mho_bond *bond) { return bond->rotatable || bond->twist_deg != 0; }

bool mho_twist_applies(const mho_molecule *m)
{
  for (int b = 0; b < m->bond_count; b++)
    if (can_turn(&m->bond[b])) return true;
  return false;
}

static const char *bond_name(const mho_molecule *m, int b, char *buffer)
{
  snprintf(buffer, NAME_SIZE, "%s-%s", m->site[m->bond[b].site[0]].id,
           m->site[m->bond[b].site[1]].id);
  return buffer;
}

static mho_status refuse(const mho_molecule *m, const char *problem, char *reason, size_t size)
{
  char list[200] = "", name[NAME_SIZE];
  int count = 0;
  for (int b = 0; b < m->bond_count; b++) {
    if (!can_turn(&m->bond[b])) continue;
    size_t used = strlen(list);
    snprintf(list + used, sizeof list - used, "%s%s", count++ ? ", " : "", bond_name(m, b, name));
  }
  snprintf(reason, size, "%s; %s%s", problem,
           count ? "these can turn: " : "none is marked as one that can turn, give two "
                                        "sites such as C5-C8", list);
  return MHO_ERR_REFERENCE;
}

static mho_status add_bond(const mho_molecule *m, int b, mho_twist_bonds *c, char *reason,
                           size_t size)
{
  char name[NAME_SIZE];
  for (int k = 0; k < c->count; k++)
    if (c->bond[k] == b) return MHO_OK;
  if (c->count == MHO_TWIST_BONDS_MAX) return refuse(m, "too many bonds can turn", reason, size);
  c->bond[c->count++] = b;
  char *longer = mho_print_text("%s%s%s", c->name ? c->name : "", c->name ? " " : "",
                                bond_name(m, b, name));
  free(c->name);
  c->name = longer;
  if (!longer) snprintf(reason, size, "out of memory");
  return longer ? MHO_OK : MHO_ERR_MEMORY;
}

mho_status mho_twist_choose(const mho_twist_question *q, const mho_molecule *m,
                            mho_twist_bonds *c, char *reason, size_t size)
{
  mho_status status = MHO_OK;
  bool every = q->bond.count == 0;
  *c = (mho_twist_bonds){0};
  for (int k = 0; status == MHO_OK && k < q->bond.count; k++) {
    char problem[160];
    if (!strcmp(q->bond.text[k], "all")) {
      every = true;
      continue;
    }
    int b = mho_molecule_find_bond(m, q->bond.text[k]);
    snprintf(problem, sizeof problem, "there is no bond '%.80s' between sites", q->bond.text[k]);
    status = b < 0 ? refuse(m, problem, reason, size) : add_bond(m, b, c, reason, size);
  }
  for (int b = 0; status == MHO_OK && every && b < m->bond_count; b++)
    if (can_turn(&m->bond[b])) status = add_bond(m, b, c, reason, size);
  if (status == MHO_OK && c->count == 0) return refuse(m, "no bond is chosen", reason, size);
  if (status == MHO_OK && q->bond.count == 0 && c->count > 1)
    return refuse(m, "more than one bond can turn; choose, or write all", reason, size);
  if (status == MHO_OK && q->map && q->bond.count == 2 && c->count != 2)
    return refuse(m, "a map of two angles needs two different bonds", reason, size);
  return status;
}

void mho_twist_bonds_clear(mho_twist_bonds *bonds)
{
  free(bonds->name);
  *bonds = (mho_twist_bonds){0};
}

/* --- potentials ------------------------------------------------------------ */

/* The two bonds of an alkyne between rings: only the angle between the rings
 * has a potential. */
static mho_status check_alkynes(const mho_molecule *m, const mho_twist_bonds *bonds,
                                mho_error *error)
{
  for (int i = 0; i < bonds->count; i++)
    for (int k = 0; k < i; k++) {
      const mho_bond *a = &m->bond[bonds->bond[i]], *b = &m->bond[bonds->bond[k]];
      if (!a->torsion || !b->torsion || strcmp(a->torsion, "tolane") || strcmp(b->torsion, "tolane"))
        continue;
      for (int other = 0; other < m->bond_count; other++)
        for (int end = 0; end < 4; end++) {
          int from = a->site[end & 1], to = b->site[end >> 1];
          const int *s = m->bond[other].site;
          if (!((s[0] == from && s[1] == to) || (s[0] == to && s[1] == from))) continue;
          return mho_fail(error, MHO_ERR_REFERENCE, "study", "bond",
                          "bond: of %s only the angle between the two rings has a potential; turn "
                          "one of these bonds", bonds->name);
        }
    }
  return MHO_OK;
}

mho_status mho_twist_potentials(const mho_twist_question *q, const mho_molecule *m,
                                const mho_twist_bonds *bonds, mho_torsion *torsion, char **names,
                                mho_error *error)
{
  const char *given = q->torsion.text;
  mho_status status = MHO_OK;
  *names = NULL;
  if (bonds->count > MHO_TWIST_AVERAGE_BONDS_MAX)
    return mho_fail(error, MHO_ERR_SIZE, "study", "bond",
                    "bond: %d bonds are to be averaged; at most %d are", bonds->count,
                    MHO_TWIST_AVERAGE_BONDS_MAX);
  if (!given[0] && m->torsion_count == 0) status = check_alkynes(m, bonds, error);
  for (int k = 0; status == MHO_OK && k < bonds->count; k++) {
    const char *name = given;
    status = given[0] ? mho_torsion_read(given, NULL, &torsion[k], error)
                      : mho_molecule_torsion(m, bonds->bond[k], &torsion[k], &name,
                                             error);
    if (status != MHO_OK || (k && *names && !strcmp(*names, name))) continue;
    char *longer = mho_print_text("%s%s%s", *names ? *names : "", *names ? "; " : "", name);
    free(*names);
    *names = longer;
    if (!longer) status = fail_memory(error);
  }
  return status;
}

/* --- tables --------------------------------------------------------------- */

typedef struct {
  const mho_twist_question *question;
  const mho_molecule *molecule;
  const mho_twist_bonds *bonds;
  const mho_rotor *rotor;
  double fermi_ev;
  mho_output *output, *words;
} work;

static double on_grid(double low, double high, long i, long count)
{
  return i + 1 == count ? high : low + (high - low) * (double)i / (double)(count - 1);
}

/* Angles in degrees; the caller frees them. */
static double *choose_angles(const mho_twist_question *q, long standard, long *count)
{
  *count = q->at.given ? 1 : q->samples.given ? q->samples.value : standard;
  double low = q->angles.given ? q->angles.low : 0, high = q->angles.given ? q->angles.high : 90;
  double *angle = malloc((size_t)*count * sizeof *angle);
  for (long i = 0; angle && i < *count; i++)
    angle[i] = q->at.given ? q->at.value : on_grid(low, high, i, *count);
  return angle;
}

static mho_status add_sweep(const work *w, mho_error *error)
{
  long count;
  double *angle = choose_angles(w->question, SWEEP_ANGLES, &count);
  double *log10_g0 = malloc((size_t)count * sizeof *log10_g0);
  mho_point *point = malloc((size_t)count * sizeof *point);
  mho_table *table = mho_twist_table(w->output);
  mho_status status = angle && log10_g0 && point ? MHO_OK : fail_memory(error);
  if (status == MHO_OK)
    status = mho_rotor_sweep(w->rotor, w->fermi_ev, (size_t)count, angle, point, error);
  if (status == MHO_OK)
    status = mho_rotor_conductance(w->rotor, (size_t)count, angle, log10_g0, error);
  for (long i = 0; status == MHO_OK && i < count; i++)
    mho_twist_row(table, w->molecule->name, w->bonds->name, angle[i], &point[i], log10_g0[i]);
  free(angle);
  free(log10_g0);
  free(point);
  return status;
}

static mho_status add_words(const work *w, double limit[2], mho_error *error)
{
  static const double fraction[] = {0.8, 0.5};
  mho_twist_law law;
  mho_status status = mho_twist_fit_law(w->rotor, w->fermi_ev, &law, error);
  if (status == MHO_OK) status = mho_twist_find_limits(w->rotor, 2, fraction, limit, error);
  if (status == MHO_OK)
    mho_twist_note(w->words, w->molecule->name, w->bonds->name, limit, &law);
  return status;
}

static mho_status add_map(const work *w, mho_error *error)
{
  const mho_twist_question *q = w->question;
  long count;
  double *angle = choose_angles(q, MAP_ANGLES, &count);
  mho_point *point = malloc((size_t)count * sizeof *point);
  double low = q->energies.given ? q->energies.low : -DEFAULT_REACH_EV;
  double high = q->energies.given ? q->energies.high : DEFAULT_REACH_EV;
  mho_table *table = mho_twist_map_table(w->output);
  mho_status status = angle && point ? MHO_OK : fail_memory(error);
  for (long e = 0; status == MHO_OK && e < MAP_ENERGIES; e++) {
    double energy = on_grid(low, high, e, MAP_ENERGIES);
    status = mho_rotor_sweep(w->rotor, w->fermi_ev + energy, (size_t)count, angle, point, error);
    for (long i = 0; status == MHO_OK && i < count; i++)
      mho_twist_map_row(table, w->molecule->name, w->bonds->name, angle[i], energy, &point[i]);
  }
  free(angle);
  free(point);
  return status;
}

static mho_status add_plane(const work *w, mho_error *error)
{
  const mho_molecule *m = w->molecule;
  char first[NAME_SIZE], second[NAME_SIZE];
  const char *const name[2] = {bond_name(m, w->bonds->bond[0], first),
                               bond_name(m, w->bonds->bond[1], second)};
  long count;
  double *angle = choose_angles(w->question, MAP_ANGLES, &count);
  mho_table *table = mho_twist_plane_table(w->output);
  mho_status status = angle ? MHO_OK : fail_memory(error);
  if (status == MHO_OK && count > PLANE_ANGLES_MAX)
    status = mho_fail(error, MHO_ERR_LIMIT, "study", "samples",
                      "samples: %ld angles of two bonds are too many; allowed are 2 to %d", count,
                      PLANE_ANGLES_MAX);
  for (long i = 0; status == MHO_OK && i < count * count; i++) {
    double pair[2] = {angle[i / count], angle[i % count]};
    mho_point point;
    status = mho_rotor_point(w->rotor, w->fermi_ev, pair, &point, error);
    if (status == MHO_OK) mho_twist_plane_row(table, m->name, name, pair, &point);
  }
  free(angle);
  return status;
}

static mho_status add_average(const work *w, mho_error *error)
{
  mho_torsion torsion[MHO_TWIST_AVERAGE_BONDS_MAX];
  mho_twist_average average;
  char *names;
  mho_table *table = mho_twist_average_table(w->output);
  mho_status status = mho_twist_potentials(w->question, w->molecule, w->bonds, torsion, &names, error);
  if (status == MHO_OK) status = mho_twist_average_compute(w->rotor, torsion, &average, error);
  if (status == MHO_OK) {
    mho_twist_average_row(table, w->molecule->name, w->bonds->name, names, &average);
    if (w->words)
      mho_twist_average_note(w->words, w->molecule, w->bonds->name, names, &average);
    if (!average.converged)
      mho_output_warn(w->output, w->molecule->name, MHO_WARN_NOT_CONVERGED);
  }
  free(names);
  return status;
}

mho_status mho_twist_answer(const mho_twist_question *question, const mho_molecule *molecule,
                            const mho_junction *junction, const mho_twist_bonds *bonds, int parts,
                            mho_output *output, mho_output *words, double *limit_deg,
                            mho_error *error)
{
  mho_rotor *rotor = NULL;
  double limit[2];
  mho_status status =
      mho_rotor_create(molecule, junction, bonds->bond, bonds->count, &rotor, error);
  work w = {question, molecule, bonds, rotor, junction->fermi_ev, output, words};
  if (status == MHO_OK && parts & MHO_TWIST_SWEEP) status = add_sweep(&w, error);
  if (status == MHO_OK && parts & MHO_TWIST_SWEEP && words) status = add_words(&w, limit_deg ? limit_deg : limit, error);
  if (status == MHO_OK && parts & MHO_TWIST_MAP)
    status = question->bond.count == 2 ? add_plane(&w, error) : add_map(&w, error);
  if (status == MHO_OK && parts & MHO_TWIST_AVERAGE) status = add_average(&w, error);
  mho_rotor_free(rotor);
  return status;
}
