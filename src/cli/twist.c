/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/text.h"
#include "cli/command.h"
#include "report/figure.h"
#include "report/stages.h"

#define DEFAULT_REACH_EV 3.0
#define NAME_SIZE 600

enum { SWEEP_ANGLES = 91, MAP_ANGLES = 46, MAP_ENERGIES = 201, PLANE_CELLS_MAX = 250000 };

/* The bonds that turn, and what they are called. */
typedef struct {
  int count, bond[MHO_TWIST_BONDS_MAX];
  char name[NAME_SIZE];
} chosen;

static bool can_turn(const mho_bond *bond) { return bond->rotatable || bond->twist_deg != 0; }

static const char *bond_name(const mho_molecule *m, int b, char *buffer, size_t size)
{
  snprintf(buffer, size, "%s-%s", m->site[m->bond[b].site[0]].id, m->site[m->bond[b].site[1]].id);
  return buffer;
}

/* Index of `C5-C8`, or -1. */
static int find_bond(const mho_molecule *m, const char *text)
{
  char name[2 * MHO_ID_SIZE + 2], reversed[2 * MHO_ID_SIZE + 2];
  for (int b = 0; b < m->bond_count; b++) {
    const int *site = m->bond[b].site;
    snprintf(reversed, sizeof reversed, "%s-%s", m->site[site[1]].id, m->site[site[0]].id);
    if (!strcmp(text, bond_name(m, b, name, sizeof name)) || !strcmp(text, reversed)) return b;
  }
  return -1;
}

static mho_status refuse(const mho_molecule *m, const char *problem, mho_error *error)
{
  char list[360] = "", name[2 * MHO_ID_SIZE + 2];
  int count = 0;
  for (int b = 0; b < m->bond_count; b++) {
    if (!can_turn(&m->bond[b])) continue;
    size_t used = strlen(list);
    snprintf(list + used, sizeof list - used, "%s%s", count++ ? ", " : "",
             bond_name(m, b, name, sizeof name));
  }
  return mho_fail_at(error, MHO_ERR_REFERENCE, "cli", m->source ? m->source : m->name, 0, 0, "bond",
                     "--bond: %s; %s%s", problem,
                     count ? "these can turn: " : "none is marked as one that can turn, give two "
                                                  "sites such as C5-C8", list);
}

static mho_status add_bond(const mho_molecule *m, int b, chosen *c, mho_error *error)
{
  char name[2 * MHO_ID_SIZE + 2];
  for (int k = 0; k < c->count; k++)
    if (c->bond[k] == b) return MHO_OK;
  if (c->count == MHO_TWIST_BONDS_MAX) return refuse(m, "too many bonds can turn", error);
  c->bond[c->count++] = b;
  size_t used = strlen(c->name);
  snprintf(c->name + used, sizeof c->name - used, "%s%s", used ? " " : "",
           bond_name(m, b, name, sizeof name));
  return MHO_OK;
}

static mho_status choose(const command *cmd, const mho_molecule *m, chosen *c, mho_error *error)
{
  mho_status status = MHO_OK;
  bool every = cmd->bonds == 0;
  *c = (chosen){0};
  for (int k = 0; status == MHO_OK && k < cmd->bonds; k++) {
    char problem[160];
    if (!strcmp(cmd->bond[k], "all")) {
      every = true;
      continue;
    }
    int b = find_bond(m, cmd->bond[k]);
    snprintf(problem, sizeof problem, "there is no bond '%.80s' between sites", cmd->bond[k]);
    status = b < 0 ? refuse(m, problem, error) : add_bond(m, b, c, error);
  }
  for (int b = 0; status == MHO_OK && every && b < m->bond_count; b++)
    if (can_turn(&m->bond[b])) status = add_bond(m, b, c, error);
  if (status == MHO_OK && c->count == 0) return refuse(m, "no bond is chosen", error);
  if (status == MHO_OK && cmd->bonds == 0 && c->count > 1)
    return refuse(m, "more than one bond can turn; choose, or write all", error);
  return status;
}

static double on_grid(double low, double high, long i, long count)
{
  return i + 1 == count ? high : low + (high - low) * (double)i / (double)(count - 1);
}

/* Angles in degrees; the caller frees them. */
static double *choose_angles(const command *cmd, long standard, long *count)
{
  *count = cmd->has_at ? 1 : cmd->has_samples ? cmd->samples : standard;
  double low = cmd->has_angles ? cmd->angle_low_deg : 0;
  double high = cmd->has_angles ? cmd->angle_high_deg : 90;
  double *angle = malloc((size_t)*count * sizeof *angle);
  for (long i = 0; angle && i < *count; i++)
    angle[i] = cmd->has_at ? cmd->at_deg : on_grid(low, high, i, *count);
  return angle;
}

typedef struct {
  const command *cmd;
  const subject *subject;
  const chosen *chosen;
  const mho_rotor *rotor;
  mho_output *output;
  mho_table *table;
} work;

static mho_status add_sweep(const work *w, mho_error *error)
{
  long count;
  double *angle = choose_angles(w->cmd, SWEEP_ANGLES, &count);
  double *log10_g0 = malloc((size_t)count * sizeof *log10_g0);
  mho_point *point = malloc((size_t)count * sizeof *point);
  mho_status status = MHO_OK;
  if (!angle || !log10_g0 || !point)
    status = mho_fail(error, MHO_ERR_MEMORY, "cli", NULL, "out of memory");
  if (status == MHO_OK)
    status = mho_rotor_sweep(w->rotor, w->subject->junction.fermi_ev, (size_t)count, angle, point,
                             error);
  if (status == MHO_OK)
    status = mho_rotor_conductance(w->rotor, (size_t)count, angle, log10_g0, error);
  for (long i = 0; status == MHO_OK && i < count; i++)
    mho_twist_row(w->table, w->subject->molecule.name, w->chosen->name, angle[i], &point[i],
                  log10_g0[i]);
  free(angle);
  free(log10_g0);
  free(point);
  return status;
}

static mho_status add_words(const work *w, mho_error *error)
{
  static const double fraction[] = {0.8, 0.5};
  double limit[2];
  mho_twist_law law;
  mho_status status = mho_twist_fit_law(w->rotor, w->subject->junction.fermi_ev, &law, error);
  if (status == MHO_OK) status = mho_twist_find_limits(w->rotor, 2, fraction, limit, error);
  if (status == MHO_OK)
    mho_twist_note(w->output, w->subject->molecule.name, w->chosen->name, limit, &law);
  return status;
}

static mho_status add_map(const work *w, mho_error *error)
{
  const command *cmd = w->cmd;
  long count;
  double *angle = choose_angles(cmd, MAP_ANGLES, &count);
  mho_point *point = malloc((size_t)count * sizeof *point);
  double low = cmd->has_energies ? cmd->energy_low_ev : -DEFAULT_REACH_EV;
  double high = cmd->has_energies ? cmd->energy_high_ev : DEFAULT_REACH_EV;
  mho_status status = MHO_OK;
  if (!angle || !point) status = mho_fail(error, MHO_ERR_MEMORY, "cli", NULL, "out of memory");
  for (long e = 0; status == MHO_OK && e < MAP_ENERGIES; e++) {
    double energy = on_grid(low, high, e, MAP_ENERGIES);
    status = mho_rotor_sweep(w->rotor, w->subject->junction.fermi_ev + energy, (size_t)count,
                             angle, point, error);
    for (long i = 0; status == MHO_OK && i < count; i++)
      mho_twist_map_row(w->table, w->subject->molecule.name, w->chosen->name, angle[i], energy,
                        &point[i]);
  }
  free(angle);
  free(point);
  return status;
}

static mho_status add_plane(const work *w, mho_error *error)
{
  const mho_molecule *m = &w->subject->molecule;
  char first[2 * MHO_ID_SIZE + 2], second[2 * MHO_ID_SIZE + 2];
  const char *const name[2] = {bond_name(m, w->chosen->bond[0], first, sizeof first),
                               bond_name(m, w->chosen->bond[1], second, sizeof second)};
  long count;
  double *angle = choose_angles(w->cmd, MAP_ANGLES, &count);
  mho_status status = MHO_OK;
  if (!angle) status = mho_fail(error, MHO_ERR_MEMORY, "cli", NULL, "out of memory");
  if (status == MHO_OK && count * count > PLANE_CELLS_MAX)
    status = mho_fail(error, MHO_ERR_LIMIT, "cli", "samples",
                      "--samples: %ld angles of two bonds are too many; allowed are 2 to 500",
                      count);
  for (long i = 0; status == MHO_OK && i < count * count; i++) {
    double pair[2] = {angle[i / count], angle[i % count]};
    mho_point point;
    status = mho_rotor_point(w->rotor, w->subject->junction.fermi_ev, pair, &point, error);
    if (status == MHO_OK) mho_twist_plane_row(w->table, m->name, name, pair, &point);
  }
  free(angle);
  return status;
}

static mho_status add_average(const work *w, mho_error *error)
{
  mho_torsion torsion[MHO_TWIST_AVERAGE_BONDS_MAX];
  mho_twist_average average;
  mho_status status = mho_torsion_read(w->cmd->torsion, NULL, &torsion[0], error);
  for (int k = 1; k < MHO_TWIST_AVERAGE_BONDS_MAX; k++) torsion[k] = torsion[0];
  if (status == MHO_OK) status = mho_twist_average_compute(w->rotor, torsion, &average, error);
  if (status != MHO_OK) return status;
  mho_twist_average_row(w->table, w->subject->molecule.name, w->chosen->name, w->cmd->torsion,
                        &average);
  if (!average.converged)
    mho_output_warn(w->output, w->subject->molecule.name, MHO_WARN_NOT_CONVERGED);
  return MHO_OK;
}

static mho_status add_molecule(const command *cmd, const subject *s, mho_output *output,
                               mho_table *table, mho_error *error)
{
  chosen bonds;
  mho_rotor *rotor = NULL;
  mho_status status = choose(cmd, &s->molecule, &bonds, error);
  if (status == MHO_OK)
    status = mho_rotor_create(&s->molecule, &s->junction, bonds.bond, bonds.count, &rotor, error);
  work w = {cmd, s, &bonds, rotor, output, table};
  bool plane = cmd->map && cmd->bonds == 2;
  if (status == MHO_OK && plane && bonds.count != 2)
    status = refuse(&s->molecule, "--map of two angles needs two different bonds", error);
  if (status == MHO_OK)
    status = cmd->torsion ? add_average(&w, error)
             : plane      ? add_plane(&w, error)
             : cmd->map   ? add_map(&w, error)
                          : add_sweep(&w, error);
  if (status == MHO_OK && !cmd->quiet && !cmd->map && !cmd->torsion) status = add_words(&w, error);
  mho_rotor_free(rotor);
  mho_output_warn(output, s->molecule.name, s->warnings & ~(unsigned)MHO_WARN_STRONG_TWIST);
  if (status == MHO_OK && !cmd->quiet) mho_assumption_note(output, &s->molecule, &s->junction);
  return status;
}

static int check_options(const command *cmd)
{
  if (cmd->has_at && (cmd->has_samples || cmd->has_angles))
    return usage_error(cmd->verb, "--at gives one row; it excludes --angles and --samples");
  if (cmd->map && cmd->has_at)
    return usage_error(cmd->verb, "--map covers a range of angles; it excludes --at");
  if (cmd->has_energies && (!cmd->map || cmd->bonds == 2))
    return usage_error(cmd->verb, "--energies belongs to --map of one angle");
  if (cmd->torsion && (cmd->map || cmd->has_at || cmd->has_samples || cmd->has_angles))
    return usage_error(cmd->verb, "--torsion averages over all angles; it excludes --map, --at, "
                                  "--angles and --samples");
  if (cmd->torsion && cmd->measured.figure)
    return usage_error(cmd->verb, "--figure draws the angles or the map, not --torsion");
  return EXIT_DONE;
}

static mho_status draw(const command *cmd, const mho_table *table, mho_error *error)
{
  mho_buffer script = {0};
  if (cmd->map) mho_figure_twist_map(&script, table);
  else mho_figure_twist(&script, table);
  mho_status status = mho_buffer_check(&script, "cli", error);
  if (status == MHO_OK) status = figure_write(cmd, &script, error);
  mho_buffer_clear(&script);
  return status;
}

int command_twist(const command *cmd, mho_error *error)
{
  int code = check_options(cmd);
  if (code != EXIT_DONE) return code;
  subjects list;
  mho_output output = {0};
  mho_status status = subjects_read(cmd, true, &list, error);
  mho_table *table = cmd->torsion                       ? mho_twist_average_table(&output)
                     : cmd->map && cmd->bonds == 2 ? mho_twist_plane_table(&output)
                     : cmd->map                         ? mho_twist_map_table(&output)
                                                        : mho_twist_table(&output);
  for (int i = 0; status == MHO_OK && table && i < list.count; i++)
    status = add_molecule(cmd, &list.item[i], &output, table, error);
  if (!cmd->quiet && cmd->torsion)
    mho_output_note(&output, "motional average: <G> over exp(-V/kT), the bond turns faster than "
                             "anyone measures; frozen average: exp <ln G>, every junction keeps "
                             "its angle");
  if (status == MHO_OK) status = mho_output_check(&output, error);
  if (status == MHO_OK && cmd->measured.figure && cmd->map && list.count > 1)
    status = mho_fail(error, MHO_ERR_USAGE, "cli", "figure", "--figure draws the map of one molecule");
  if (status == MHO_OK && cmd->measured.figure) status = draw(cmd, table, error);
  if (status == MHO_OK) status = output_write(cmd, &output, error);
  mho_output_clear(&output);
  subjects_free(&list);
  return exit_of(status);
}
