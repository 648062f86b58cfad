/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <stdlib.h>
#include <unistd.h>

#include "cli/command.h"
#include "report/drawing.h"
#include "report/figure.h"
#include "report/stages.h"

#define DEFAULT_REACH_EV 3.0

enum { EVEN_POINTS = 601 };

/* Energies between two looks at the clock; molecules whose poles and nodes alone may
 * take a second. */
enum { PORTION = 128, LONG_SITES = 300 };

/* Energies above the Fermi level; the caller frees them. */
static mho_status choose_energies(const command *cmd, const subject *s, const mho_plan *plan,
                                  double **energy, size_t *count, mho_error *error)
{
  double low = cmd->has_energies ? cmd->energy_low_ev : -DEFAULT_REACH_EV;
  double high = cmd->has_energies ? cmd->energy_high_ev : DEFAULT_REACH_EV;
  double fermi = s->junction.fermi_ev;
  if (!cmd->has_samples && !cmd->has_at) {
    mho_status status =
        mho_energy_grid(plan, fermi + low, fermi + high, EVEN_POINTS, energy, count, error);
    for (size_t i = 0; status == MHO_OK && i < *count; i++) (*energy)[i] -= fermi;
    return status;
  }
  *count = cmd->has_at ? 1 : (size_t)cmd->samples;
  *energy = malloc(*count * sizeof **energy);
  if (!*energy) return mho_fail(error, MHO_ERR_MEMORY, "cli", NULL, "out of memory");
  if (cmd->has_at) (*energy)[0] = cmd->at_ev;
  for (size_t i = 0; !cmd->has_at && i < *count; i++)
    (*energy)[i] = i + 1 == *count
                       ? high
                       : low + (high - low) * (double)i / (double)(*count - 1);
  return MHO_OK;
}

/* Curves for --figure, which own their numbers. */
typedef struct {
  int count;
  mho_curve curve[MHO_CURVES_MAX];
  double *energy_ev[MHO_CURVES_MAX], *node_ev[MHO_CURVES_MAX];
  mho_point *point[MHO_CURVES_MAX];
} curves;

static void curves_clear(curves *c)
{
  for (int i = 0; i < c->count; i++) {
    free(c->energy_ev[i]);
    free(c->node_ev[i]);
    free(c->point[i]);
  }
}

/* Takes energies and points over. */
static mho_status keep_curve(curves *c, const subject *s, const mho_plan *plan, double *energy,
                             mho_point *point, size_t count, mho_error *error)
{
  int k = c->count++;
  mho_curve *curve = &c->curve[k];
  *curve = (mho_curve){.name = s->molecule.name, .count = count, .energy_ev = energy, .point = point};
  c->energy_ev[k] = energy;
  c->point[k] = point;
  mho_status status = mho_figure_nodes(plan, s->junction.fermi_ev, &c->node_ev[k], &curve->nodes,
                                       error);
  curve->node_ev = c->node_ev[k];
  return status;
}

/* All energies, with a bar on a terminal once they have taken a second. */
static mho_status sweep(const command *cmd, const subject *s, const mho_plan *plan, size_t count,
                        const double *energy, mho_point *point, mho_error *error)
{
  mho_status status = MHO_OK;
  double start = seconds_now();
  bool bar = !cmd->quiet && isatty(STDERR_FILENO), shown = false;
  for (size_t i = 0; status == MHO_OK && i < count; i += PORTION) {
    size_t portion = count - i < PORTION ? count - i : PORTION;
    status = mho_transmission_sweep(plan, portion, energy + i, point + i, error);
    if (!bar || seconds_now() - start < 1.0) continue;
    shown = true;
    draw_bar((double)(i + portion) / (double)count, "%zu of %zu energies of %.40s", i + portion,
             count, s->molecule.name);
  }
  if (shown) clear_bar();
  return status;
}

static bool announce(const command *cmd, const subject *s)
{
  if (cmd->quiet || !isatty(STDERR_FILENO) || s->junction.sites < LONG_SITES) return false;
  draw_bar(0, "%s of %.40s, %d sites",
           cmd->poles   ? "poles"
           : cmd->nodes ? "nodes"
                        : "poles and nodes", s->molecule.name, s->junction.sites);
  return true;
}

static mho_status add_sweep(const command *cmd, const subject *s, const mho_plan *plan, curves *kept,
                            mho_output *output, mho_table *table, unsigned *warnings, mho_error *error)
{
  double *relative = NULL, *energy = NULL;
  mho_point *point = NULL;
  size_t count = 0;
  mho_status status = choose_energies(cmd, s, plan, &relative, &count, error);
  if (status == MHO_OK) {
    energy = malloc(count * sizeof *energy);
    point = malloc(count * sizeof *point);
    if (!energy || !point)
      status = mho_fail(error, MHO_ERR_MEMORY, "cli", NULL, "out of memory");
  }
  if (status == MHO_OK) {
    for (size_t i = 0; i < count; i++) energy[i] = s->junction.fermi_ev + relative[i];
    status = sweep(cmd, s, plan, count, energy, point, error);
  }
  for (size_t i = 0; status == MHO_OK && i < count; i++) {
    mho_transmission_row(table, s->molecule.name, relative[i], &point[i]);
    if (point[i].method == MHO_METHOD_NO_PATH) *warnings |= MHO_WARN_NO_PI_PATH;
    else if (point[i].method == MHO_METHOD_NO_BAND) *warnings |= MHO_WARN_OUTSIDE_BAND;
    else if (point[i].node) *warnings |= MHO_WARN_NEAR_NODE;
  }
  if (status == MHO_OK && cmd->verbose)
    mho_method_note(output, s->molecule.name, plan, point, count);
  free(energy);
  if (status == MHO_OK && cmd->measured.figure)
    return keep_curve(kept, s, plan, relative, point, count, error);
  free(relative);
  free(point);
  return status;
}

static mho_status add_poles(const command *cmd, const subject *s, const mho_plan *plan,
                            mho_output *output, mho_table *table, mho_error *error)
{
  int count = mho_plan_sites(plan);
  mho_pole *pole = malloc((size_t)count * sizeof *pole);
  if (!pole) return mho_fail(error, MHO_ERR_MEMORY, "cli", NULL, "out of memory");
  mho_status status = mho_molecule_require_wide_band(&s->molecule, "--poles", error);
  if (status == MHO_OK) status = mho_poles(plan, pole, error);
  for (int k = 0; status == MHO_OK && k < count; k++)
    mho_poles_row(table, s->molecule.name, s->junction.fermi_ev, &pole[k], cmd->widths);
  if (status == MHO_OK && !cmd->quiet)
    mho_frontier_note(output, s->molecule.name, &s->junction, pole);
  free(pole);
  return status;
}

static mho_status add_nodes(const command *cmd, const subject *s, const mho_plan *plan,
                            mho_output *output, mho_table *table, unsigned *warnings,
                            mho_error *error)
{
  mho_nodes nodes;
  mho_status status = mho_nodes_find(plan, &nodes, error);
  mho_point at_fermi = {0};
  if (status == MHO_OK && nodes.everywhere)
    status = mho_transmission_sweep(plan, 1, &s->junction.fermi_ev, &at_fermi, error);
  if (nodes.everywhere) /* no path, or bands that do not meet */
    *warnings |= at_fermi.method == MHO_METHOD_NO_BAND ? MHO_WARN_OUTSIDE_BAND : MHO_WARN_NO_PI_PATH;
  bool minima = nodes.count > 0 && nodes.node[0].kind == MHO_NODE_MINIMUM;
  if (status == MHO_OK && minima && !cmd->quiet)
    mho_output_note(output, "%s: minima of T, %s", s->molecule.name,
                    s->junction.lead[MHO_LEFT].channels + s->junction.lead[MHO_RIGHT].channels > 2
                        ? "as contacts of several channels have no exact nodes"
                        : "as nodes of so many sites are not told apart");
  for (size_t k = 0; status == MHO_OK && k < nodes.count; k++)
    mho_nodes_row(table, s->molecule.name, s->junction.fermi_ev, &nodes.node[k]);
  mho_nodes_clear(&nodes);
  return status;
}

static void add_view(const command *cmd, const subject *s, const mho_inside *inside,
                     mho_output *output, mho_table *table)
{
  const mho_molecule *m = &s->molecule;
  if (!cmd->quiet) mho_inside_note(output, m->name, cmd->has_at ? cmd->at_ev : 0, inside);
  if (cmd->currents) mho_currents_rows(table, m, inside);
  if (cmd->orbitals) mho_orbitals_rows(table, m->name, s->junction.fermi_ev, inside);
  if (cmd->orbitals && !cmd->quiet) mho_orbitals_note(output, m->name, &s->junction);
  if (cmd->channels) mho_channels_rows(table, m, inside, cmd->parts);
  if (cmd->channels && !cmd->quiet) mho_channels_note(output, m, inside);
}

/* Currents, orbitals or eigenchannels at one energy. */
static mho_status add_inside(const command *cmd, const subject *s, const mho_plan *plan,
                             mho_output *output, mho_table *table, unsigned *warnings,
                             mho_error *error)
{
  double energy = s->junction.fermi_ev + (cmd->has_at ? cmd->at_ev : 0);
  const mho_molecule *m = &s->molecule;
  mho_inside inside;
  mho_buffer svg = {0};
  mho_status status = mho_inside_compute(&s->junction, plan, energy, &inside, error);
  if (status == MHO_OK && !inside.flows)
    *warnings |= inside.outside_band ? MHO_WARN_OUTSIDE_BAND : MHO_WARN_NEAR_NODE;
  if (status == MHO_OK) add_view(cmd, s, &inside, output, table);
  if (status == MHO_OK && cmd->measured.figure && !inside.flows)
    status = mho_fail(error, MHO_ERR_NOT_FINITE, "cli", "figure",
                      inside.outside_band
                          ? "--figure: nothing flows, the energy lies outside the band of an electrode"
                          : "--figure: nothing flows, T has a node at this energy");
  if (status == MHO_OK && cmd->measured.figure) {
    status = mho_drawing_write_currents(m, &inside, &svg, error);
    if (status == MHO_OK) status = mho_buffer_save(&svg, cmd->measured.figure, "cli", error);
  }
  mho_buffer_clear(&svg);
  mho_inside_clear(&inside);
  return status;
}

/* Asks for a view of the inside, at one energy. */
static bool is_view(const command *cmd) { return cmd->currents || cmd->orbitals || cmd->channels; }

static mho_status add_molecule(const command *cmd, const subject *s, curves *kept,
                               mho_output *output, mho_table *table, mho_error *error)
{
  mho_plan *plan = NULL;
  unsigned warnings = s->warnings;
  bool announced = announce(cmd, s);
  mho_status status = mho_plan_create(&s->junction, &plan, error);
  if (status == MHO_OK)
    status = cmd->poles     ? add_poles(cmd, s, plan, output, table, error)
             : cmd->nodes   ? add_nodes(cmd, s, plan, output, table, &warnings, error)
             : is_view(cmd) ? add_inside(cmd, s, plan, output, table, &warnings, error)
                            : add_sweep(cmd, s, plan, kept, output, table, &warnings, error);
  if (announced) clear_bar();
  mho_plan_free(plan);
  mho_output_warn(output, s->molecule.name, warnings);
  if (!cmd->quiet) mho_assumption_note(output, &s->molecule, &s->junction);
  return status;
}

static int check_options(const command *cmd)
{
  if (cmd->has_at && (cmd->has_samples || cmd->has_energies))
    return usage_error(cmd->verb, "--at gives one row; it excludes --energies and --samples");
  if (cmd->poles + cmd->nodes + cmd->currents + cmd->orbitals + cmd->channels > 1)
    return usage_error(cmd->verb, "--poles, --nodes, --currents, --orbitals and --channels exclude "
                                  "each other; one table a call");
  if (cmd->widths && !cmd->poles)
    return usage_error(cmd->verb, "--widths are those of --poles; give both");
  if (cmd->parts && !cmd->channels)
    return usage_error(cmd->verb, "--parts are those of --channels; give both");
  if (is_view(cmd) && (cmd->has_samples || cmd->has_energies))
    return usage_error(cmd->verb, "--%s looks at one energy (--at, default the Fermi level); it "
                                  "excludes --energies and --samples",
                       cmd->currents   ? "currents"
                       : cmd->orbitals ? "orbitals"
                                       : "channels");
  if (cmd->measured.figure && !cmd->currents &&
      (cmd->poles || cmd->nodes || is_view(cmd) || cmd->has_at))
    return usage_error(cmd->verb, "--figure draws T(E) with its nodes, or --currents");
  if ((cmd->poles || cmd->nodes) && (cmd->has_at || cmd->has_samples || cmd->has_energies))
    return usage_error(cmd->verb,
                       "--%s lists all there are; it excludes --at, --energies and --samples",
                       cmd->poles ? "poles" : "nodes");
  return EXIT_DONE;
}

static mho_status draw_curves(const command *cmd, const curves *kept, mho_error *error)
{
  mho_buffer script = {0};
  mho_figure_transmission(&script, kept->curve, kept->count, MHO_DEFAULT_WINDOW_EV);
  mho_status status = mho_buffer_check(&script, "cli", error);
  if (status == MHO_OK) status = figure_write(cmd, &script, error);
  mho_buffer_clear(&script);
  return status;
}

int command_transmission(const command *cmd, mho_error *error)
{
  int code = check_options(cmd);
  if (code != EXIT_DONE) return code;
  subjects list;
  curves kept = {0};
  mho_output output = {0};
  mho_status status = subjects_read(cmd, true, &list, error);
  int most = cmd->currents ? 1 : MHO_CURVES_MAX;
  if (status == MHO_OK && cmd->measured.figure && list.count > most)
    status = mho_fail(error, MHO_ERR_USAGE, "cli", "figure", "--figure draws at most %d molecule%s",
                      most, most > 1 ? "s" : "");
  mho_table *table =
      cmd->poles      ? mho_poles_table(&output, cmd->widths)
      : cmd->nodes    ? mho_nodes_table(&output)
      : cmd->currents ? mho_currents_table(&output)
      : cmd->orbitals ? mho_orbitals_table(&output)
      : cmd->channels ? mho_channels_table(&output, cmd->parts)
                      : mho_transmission_table(&output);
  for (int i = 0; status == MHO_OK && table && i < list.count; i++)
    status = add_molecule(cmd, &list.item[i], &kept, &output, table, error);
  if (cmd->orbitals && !cmd->quiet)
    mho_output_note(&output, "diagonal: T if the orbital were alone; interference: with all others; "
                             "all of both add up to T, and of levels of one energy only their sum "
                             "has a meaning");
  if (cmd->currents && !cmd->quiet)
    mho_output_note(&output, "currents of electrons that come from the left, as parts of T; more "
                             "than 1 is a current that goes round");
  if (status == MHO_OK) status = mho_output_check(&output, error);
  if (status == MHO_OK && kept.count > 0) status = draw_curves(cmd, &kept, error);
  curves_clear(&kept);
  if (status == MHO_OK) status = output_write(cmd, &output, error);
  mho_output_clear(&output);
  subjects_free(&list);
  return exit_of(status);
}
