/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "report/stages.h"

#include <mho/quantity.h>
#include <mho/settings.h>
#include <mho/warning.h>

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#define COUNT(array) (sizeof(array) / sizeof *(array))

#define LEAST_CONTRIBUTION 1e-11 /* decades */

static void add_warning_words(mho_table *table, unsigned warnings)
{
  mho_buffer words = {0};
  mho_write_warning_words(&words, warnings);
  if (table && words.failed) table->failed = MHO_ERR_MEMORY;
  mho_table_text(table, words.data);
  mho_buffer_clear(&words);
}

/* A node is no prediction; outside a band the model does say zero. */
static void add_transmission(mho_table *table, const mho_point *point)
{
  if (point->node && point->method != MHO_METHOD_NO_BAND) mho_table_node(table);
  else mho_table_number(table, point->transmission);
}

mho_table *mho_conductance_table(mho_output *output)
{
  static const char *const columns[] = {
      "molecule", "fermi_eV", "transmission", "conductance_G0", "conductance_S",
      "log10_G0", "window_low_log10_G0", "window_high_log10_G0", "warnings"};
  return mho_output_table(output, "conductance", columns, COUNT(columns));
}

void mho_conductance_row(mho_table *table, const char *molecule,
                         const mho_conductance *g, unsigned warnings)
{
  mho_table_text(table, molecule);
  mho_table_number(table, g->fermi_ev);
  add_transmission(table, &g->at_fermi);
  if (g->has_log || g->warnings & MHO_WARN_OUTSIDE_BAND) {
    mho_table_number(table, g->conductance_g0);
    mho_table_number(table, g->conductance_s);
  } else {
    mho_table_node(table);
    mho_table_node(table);
  }
  mho_table_optional(table, g->has_log, g->log10_g0);
  mho_table_optional(table, g->has_window_low, g->window_low_log10_g0);
  mho_table_optional(table, g->has_window_high, g->window_high_log10_g0);
  add_warning_words(table, warnings);
}

mho_table *mho_sensitivity_table(mho_output *output)
{
  static const char *const columns[] = {"molecule", "parameter", "derivative_log10_G0", "sigma",
                                        "contribution_decades"};
  return mho_output_table(output, "sensitivity", columns, COUNT(columns));
}

void mho_sensitivity_rows(mho_table *table, const mho_molecule *molecule,
                          const mho_sensitivity *sensitivity)
{
  char name[2 * MHO_ID_SIZE + 32];
  for (size_t p = 0; p < sensitivity->count; p++) {
    const mho_sensitivity_row *row = &sensitivity->row[p];
    bool counts = row->contribution_decades > LEAST_CONTRIBUTION; /* else it is rounding */
    mho_table_text(table, molecule->name);
    mho_table_text(table, mho_sensitivity_name(row, molecule, name, sizeof name));
    mho_table_optional(table, sensitivity->has_derivatives, counts ? row->derivative_log10_g0 : 0);
    mho_table_number(table, row->sigma);
    mho_table_optional(table, sensitivity->has_derivatives,
                       counts ? row->contribution_decades : 0);
  }
  bool linear = sensitivity->rule == MHO_RULE_LINEAR;
  mho_table_text(table, molecule->name);
  mho_table_text(table, linear ? "all (linear rule)" : "all (Monte Carlo)");
  mho_table_empty(table);
  mho_table_empty(table);
  mho_table_optional(table, sensitivity->has_error, sensitivity->error_decades);
}

void mho_sensitivity_note(mho_output *output, const mho_molecule *molecule,
                          const mho_sensitivity *s)
{
  enum { NAMED = 2 };
  char name[NAMED][2 * MHO_ID_SIZE + 32];
  if (!s->has_error || s->count < NAMED) return;
  for (int p = 0; p < NAMED; p++)
    mho_sensitivity_name(&s->row[p], molecule, name[p], sizeof name[p]);
  bool linear = s->rule == MHO_RULE_LINEAR;
  mho_output_note(output, "%s: the conductance is uncertain by a factor of %.2g (%.2g decades, one "
                          "sigma, %s)%s%s%s%s",
                  molecule->name, pow(10, s->error_decades), s->error_decades,
                  linear ? "linear rule" : "Monte Carlo, as the linear rule fails here",
                  s->has_derivatives ? ", most by " : "", s->has_derivatives ? name[0] : "",
                  s->has_derivatives ? " and " : "", s->has_derivatives ? name[1] : "");
}

mho_table *mho_transmission_table(mho_output *output)
{
  static const char *const columns[] = {"molecule", "energy_eV", "transmission",
                                        "log10_transmission"};
  return mho_output_table(output, "transmission", columns, COUNT(columns));
}

void mho_transmission_row(mho_table *table, const char *molecule, double relative_energy_ev,
                          const mho_point *point)
{
  mho_table_text(table, molecule);
  mho_table_number(table, relative_energy_ev);
  add_transmission(table, point);
  mho_table_optional(table, !point->node, point->log10_transmission);
}

mho_table *mho_compare_table(mho_output *output)
{
  static const char *const columns[] = {
      "molecule", "computed_log10_G0", "computed_low", "computed_high", "measured_log10_G0",
      "measured_low", "measured_high", "ratio_computed", "ratio_measured",
      "deviation_decades"};
  return mho_output_table(output, "compare", columns, COUNT(columns));
}

void mho_compare_row(mho_table *table, const char *molecule, const mho_comparison *c)
{
  mho_table_text(table, molecule);
  mho_table_optional(table, c->has_computed, c->computed_log10_g0);
  mho_table_optional(table, c->has_error, c->computed_low);
  mho_table_optional(table, c->has_error, c->computed_high);
  mho_table_optional(table, c->has_measured, c->measured_log10_g0);
  mho_table_optional(table, c->has_spread, c->measured_low);
  mho_table_optional(table, c->has_spread, c->measured_high);
  mho_table_optional(table, c->has_ratio, c->ratio_computed);
  mho_table_optional(table, c->has_ratio, c->ratio_measured);
  mho_table_optional(table, c->has_ratio, c->deviation_decades);
}

mho_table *mho_nodes_table(mho_output *output)
{
  static const char *const columns[] = {"molecule", "energy_eV", "imaginary_eV", "order", "kind"};
  return mho_output_table(output, "nodes", columns, COUNT(columns));
}

void mho_nodes_row(mho_table *table, const char *molecule, double fermi_ev,
                   const mho_node *node)
{
  static const char *const kind[] = {
      [MHO_NODE_EXACT] = "node", [MHO_NODE_DIP] = "dip", [MHO_NODE_MINIMUM] = "minimum"};
  bool zero = node->kind != MHO_NODE_MINIMUM;
  mho_table_text(table, molecule);
  mho_table_number(table, node->energy_ev - fermi_ev);
  mho_table_optional(table, zero, node->imaginary_ev);
  if (zero) mho_table_integer(table, node->order);
  else mho_table_empty(table);
  mho_table_text(table, kind[node->kind]);
}

/* 10^log10 with two digits, in a buffer. */
static const char *two_digits(double log10_value, char *buffer, size_t size)
{
  mho_number_write(buffer, size, 2, pow(10.0, log10_value));
  return buffer;
}

void mho_verdict_note(mho_output *output, const char *molecule, const mho_conductance *g,
                      double window_ev)
{
  char value[32], low[32], high[32], window[32];
  mho_number_write(window, sizeof window, 3, window_ev);
  if (g->warnings & MHO_WARN_NO_PI_PATH) {
    mho_output_note(output, "%s: no pi path joins the contacts, so the model predicts nothing",
                    molecule);
  } else if (g->warnings & MHO_WARN_OUTSIDE_BAND) {
    mho_output_note(output,
                    "%s: the Fermi level lies outside the band of an electrode, where no state "
                    "brings electrons; only the tail of warmer ones conducts",
                    molecule);
  } else if (g->warnings & MHO_WARN_NEAR_NODE || !g->has_log) {
    mho_output_note(output,
                    "%s: a node at the Fermi level; the pi system conducts poorly there, and how "
                    "poorly is not predicted",
                    molecule);
  } else {
    mho_output_note(output,
                    "%s: %s G0, and %s to %s G0 (5 %% to 95 %%) while the Fermi level moves by "
                    "+-%s eV",
                    molecule, two_digits(g->log10_g0, value, sizeof value),
                    g->has_window_low ? two_digits(g->window_low_log10_g0, low, sizeof low) : "0",
                    g->has_window_high ? two_digits(g->window_high_log10_g0, high, sizeof high)
                                       : "0",
                    window);
  }
}

static void add_conductance(mho_table *table, double log10_g0)
{
  if (isinf(log10_g0)) mho_table_node(table);
  else mho_table_number(table, pow(10, log10_g0));
}

mho_table *mho_twist_table(mho_output *output)
{
  static const char *const columns[] = {"molecule", "bond", "angle_deg", "transmission",
                                        "conductance_G0"};
  return mho_output_table(output, "twist", columns, COUNT(columns));
}

void mho_twist_row(mho_table *table, const char *molecule, const char *bond, double angle_deg,
                   const mho_point *point, double log10_g0)
{
  mho_table_text(table, molecule);
  mho_table_text(table, bond);
  mho_table_number(table, angle_deg);
  add_transmission(table, point);
  add_conductance(table, log10_g0);
}

mho_table *mho_twist_map_table(mho_output *output)
{
  static const char *const columns[] = {"molecule", "bond", "angle_deg", "energy_eV",
                                        "transmission"};
  return mho_output_table(output, "twist_map", columns, COUNT(columns));
}

void mho_twist_map_row(mho_table *table, const char *molecule, const char *bond,
                       double angle_deg, double relative_energy_ev, const mho_point *point)
{
  mho_table_text(table, molecule);
  mho_table_text(table, bond);
  mho_table_number(table, angle_deg);
  mho_table_number(table, relative_energy_ev);
  add_transmission(table, point);
}

mho_table *mho_twist_plane_table(mho_output *output)
{
  static const char *const columns[] = {"molecule", "bond", "angle_deg", "second_bond",
                                        "second_angle_deg", "transmission"};
  return mho_output_table(output, "twist_plane", columns, COUNT(columns));
}

void mho_twist_plane_row(mho_table *table, const char *molecule, const char *const bond[2],
                         const double angle_deg[2], const mho_point *point)
{
  mho_table_text(table, molecule);
  for (int k = 0; k < 2; k++) {
    mho_table_text(table, bond[k]);
    mho_table_number(table, angle_deg[k]);
  }
  add_transmission(table, point);
}

mho_table *mho_twist_average_table(mho_output *output)
{
  static const char *const columns[] = {"molecule", "bond", "torsion", "temperature_K",
                                        "mean_cos2", "planar_G0", "motional_average_G0",
                                        "frozen_average_G0"};
  return mho_output_table(output, "twist_average", columns, COUNT(columns));
}

void mho_twist_average_row(mho_table *table, const char *molecule, const char *bond,
                           const char *torsion, const mho_twist_average *average)
{
  mho_table_text(table, molecule);
  mho_table_text(table, bond);
  mho_table_text(table, torsion);
  mho_table_number(table, average->temperature_k);
  mho_table_number(table, average->mean_cos2);
  add_conductance(table, average->planar_log10_g0);
  add_conductance(table, average->motional_log10_g0);
  mho_table_optional(table, average->has_frozen, pow(10, average->frozen_log10_g0));
}

void mho_twist_note(mho_output *output, const char *molecule, const char *bond,
                    const double limit_deg[2], const mho_twist_law *law)
{
  static const char *const reason[] = {
      [MHO_TWIST_LAW_HOLDS] = "",
      [MHO_TWIST_OTHER_PATH] = ": another path stays open at 90 deg",
      [MHO_TWIST_NEAR_POLE] = ": a resonance lies near the Fermi level",
      [MHO_TWIST_STRONG_COUPLING] = ": the coupling across the bond is not small against the "
                                    "levels of its two sides",
      [MHO_TWIST_SEVERAL_BONDS] = ": several bonds turn together"};
  if (!law->has_fit) {
    mho_output_note(output, "%s, %s: no transmission at any angle", molecule, bond);
    return;
  }
  mho_output_note(output,
                  "%s, %s: flat to within %g deg keeps 80 %% of the planar conductance, to within "
                  "%g deg half of it",
                  molecule, bond, limit_deg[0], limit_deg[1]);
  mho_output_note(output,
                  "%s, %s: T at the Fermi level goes as (cos^2 angle)^%.2f, residual %.3f decades; "
                  "a plain cos^2 law holds within 5 %% %s %g deg%s",
                  molecule, bond, law->exponent, law->residual_decades,
                  law->reason ? "only up to" : "up to", law->holds_to_deg,
                  reason[law->reason]);
}

void mho_twist_average_note(mho_output *output, const mho_molecule *molecule, const char *bond,
                            const char *torsion, const mho_twist_average *a)
{
  char motional[32], frozen[32] = "no value";
  if (!isfinite(a->planar_log10_g0) || !isfinite(a->motional_log10_g0)) return;
  two_digits(a->motional_log10_g0, motional, sizeof motional);
  if (a->has_frozen) two_digits(a->frozen_log10_g0, frozen, sizeof frozen);
  mho_output_note(output,
                  "%s, %s: thermal motion at %g K over the potential %s leaves %.0f %% of the planar "
                  "conductance: %s G0%s, or %s G0 if every junction kept its angle%s",
                  molecule->name, bond, a->temperature_k, torsion,
                  100 * pow(10, a->motional_log10_g0 - a->planar_log10_g0), motional,
                  molecule->frozen ? "" : " (motional average, what is measured)", frozen,
                  molecule->frozen ? " (frozen average, as asked in the file)" : "");
}

mho_table *mho_interference_table(mho_output *output)
{
  static const char *const columns[] = {
      "molecule", "site_i", "site_j", "transmission", "green_per_eV", "magic", "class", "node_eV",
      "overturning_shift_eV"};
  return mho_output_table(output, "interference", columns, COUNT(columns));
}

static bool is_node(const mho_pair *pair)
{
  return pair->kind == MHO_PAIR_NODE_SYMMETRY || pair->kind == MHO_PAIR_NODE_CANCELLATION ||
         pair->kind == MHO_PAIR_NO_PATH;
}

static void begin_pair(mho_table *table, const mho_molecule *molecule, const mho_pair *pair)
{
  mho_table_text(table, molecule->name);
  for (int end = 0; end < 2; end++) mho_table_text(table, molecule->site[pair->site[end]].id);
}

/* A decimal integer as one where it fits, else as its digits. */
static void add_magic(mho_table *table, const char *magic)
{
  enum { DIGITS_OF_LONG = 18 };
  if (!magic) mho_table_empty(table);
  else if (strlen(magic) <= DIGITS_OF_LONG) mho_table_integer(table, strtol(magic, NULL, 10));
  else mho_table_text(table, magic);
}

void mho_interference_rows(mho_table *table, const mho_molecule *molecule,
                           const mho_interference *map)
{
  for (size_t p = 0; p < map->count; p++) {
    const mho_pair *pair = &map->pair[p];
    begin_pair(table, molecule, pair);
    if (is_node(pair)) mho_table_node(table);
    else mho_table_number(table, pair->transmission);
    mho_table_optional(table, pair->has_green, pair->green_per_ev);
    add_magic(table, pair->magic);
    mho_table_text(table, mho_pair_word(pair->kind));
    mho_table_optional(table, pair->has_node, pair->node_ev);
    mho_table_optional(table, pair->has_shift, pair->overturning_shift_ev);
  }
}

/* The pair of the molecule's own contacts, or NULL. */
static const mho_pair *own_pair(const mho_molecule *m, const mho_interference *map)
{
  const mho_contact *l = &m->contact[MHO_LEFT], *r = &m->contact[MHO_RIGHT];
  for (size_t p = 0; l->count == 1 && r->count == 1 && p < map->count; p++) {
    const int *site = map->pair[p].site;
    if ((site[0] == l->site[0] && site[1] == r->site[0]) ||
        (site[1] == l->site[0] && site[0] == r->site[0]))
      return &map->pair[p];
  }
  return NULL;
}

void mho_interference_note(mho_output *output, const mho_molecule *m, const mho_interference *map)
{
  static const char *const verdict[] = {
      [MHO_PAIR_CONSTRUCTIVE] = "conduct", [MHO_PAIR_NEAR_NODE] = "are near a node",
      [MHO_PAIR_NODE_SYMMETRY] = "are a node by symmetry",
      [MHO_PAIR_NODE_CANCELLATION] = "are a node by cancellation",
      [MHO_PAIR_NO_PATH] = "have no path"};
  size_t conducting = 0, nodes = 0;
  const mho_pair *best = NULL, *own = own_pair(m, map);
  for (size_t p = 0; p < map->count; p++) {
    const mho_pair *pair = &map->pair[p];
    conducting += pair->kind == MHO_PAIR_CONSTRUCTIVE;
    nodes += is_node(pair);
    if (!best || pair->transmission > best->transmission) best = pair;
  }
  if (!best) return;
  mho_output_note(output,
                  "%s: of %zu pairs of sites %zu conduct, %zu are nodes and %zu near one; the best "
                  "is %s and %s, T %.2g",
                  m->name, map->count, conducting, nodes, map->count - conducting - nodes,
                  m->site[best->site[0]].id, m->site[best->site[1]].id, best->transmission);
  if (!own) return;
  char until[80] = "";
  if (own->has_shift)
    snprintf(until, sizeof until, "%s %.2g eV",
             own->kind == MHO_PAIR_CONSTRUCTIVE ? ", and do so until the Fermi level moves by"
                                                : "; that ends once the Fermi level moves by",
             fabs(own->overturning_shift_ev));
  mho_output_note(output, "%s: its own contacts %s and %s %s%s", m->name,
                  m->site[own->site[0]].id, m->site[own->site[1]].id, verdict[own->kind], until);
}

#define LEAST_CHANGE 0.005 /* decades, 1 % */

void mho_modify_note(mho_output *output, const mho_molecule *m, const mho_modifications *mods)
{
  const mho_modification *up = NULL, *down = NULL;
  for (size_t i = 0; i < mods->count; i++) {
    const mho_modification *row = &mods->row[i];
    if (!row->has_change) continue;
    if (!up || row->change_decades > up->change_decades) up = row;
    if (!down || row->change_decades < down->change_decades) down = row;
  }
  char factor[2][32];
  if (!up) return;
  double shown = pow(10, fmax(floor(up->change_decades) - 1, 0)); /* 1600, not 1.6e+03 */
  mho_number_write(factor[0], sizeof factor[0], shown > 1 ? 15 : 2,
                   shown > 1 ? shown * round(pow(10, up->change_decades) / shown)
                             : pow(10, up->change_decades));
  two_digits(down->change_decades, factor[1], sizeof factor[1]);
  bool rises = up->change_decades > LEAST_CHANGE, falls = down->change_decades < -LEAST_CHANGE;
  if (rises)
    mho_output_note(output, "%s: of %zu single changes %s at %s raises the conductance most, by a "
                            "factor of %s", m->name, mods->count, up->substituent->name,
                    m->site[up->site].id, factor[0]);
  if (falls)
    mho_output_note(output, "%s: of %zu single changes %s at %s lowers the conductance most, to %s "
                            "of it", m->name, mods->count, down->substituent->name,
                    m->site[down->site].id, factor[1]);
}

mho_table *mho_modify_table(mho_output *output)
{
  static const char *const columns[] = {"molecule", "site", "change", "log10_G0",
                                        "change_decades", "window_low", "window_high"};
  return mho_output_table(output, "modify", columns, COUNT(columns));
}

void mho_modify_rows(mho_table *table, const mho_molecule *molecule,
                     const mho_modifications *modifications)
{
  for (size_t i = 0; i < modifications->count; i++) {
    const mho_modification *row = &modifications->row[i];
    mho_table_text(table, molecule->name);
    mho_table_text(table, molecule->site[row->site].id);
    mho_table_text(table, row->substituent->name);
    mho_table_optional(table, row->has_log, row->log10_g0);
    mho_table_optional(table, row->has_change, row->change_decades);
    mho_table_optional(table, row->has_window, row->window_low_decades);
    mho_table_optional(table, row->has_window, row->window_high_decades);
  }
}

mho_table *mho_rules_table(mho_output *output)
{
  static const char *const columns[] = {"molecule", "site_i", "site_j", "class", "starring",
                                        "orbital", "cross_conjugation", "disagreement"};
  return mho_output_table(output, "rules", columns, COUNT(columns));
}

enum { RULES = 3 };

static const char *const rule_name[RULES] = {"starring", "orbital", "cross-conjugation"};

static mho_rule_verdict rule_of(const mho_pair *pair, int rule)
{
  return rule == 0 ? pair->starring : rule == 1 ? pair->orbital : pair->cross_conjugation;
}

void mho_rules_rows(mho_table *table, const mho_molecule *molecule, const mho_interference *map)
{
  static const char *const verdict[] = {
      [MHO_RULE_SILENT] = NULL, [MHO_RULE_CONDUCTS] = "conducts", [MHO_RULE_NODE] = "node"};
  for (size_t p = 0; p < map->count; p++) {
    const mho_pair *pair = &map->pair[p];
    char against[80] = "";
    begin_pair(table, molecule, pair);
    mho_table_text(table, mho_pair_word(pair->kind));
    for (int r = 0; r < RULES; r++) {
      const char *word = verdict[rule_of(pair, r)];
      if (word) mho_table_text(table, word);
      else mho_table_empty(table);
      if (!mho_pair_disagrees(pair, rule_of(pair, r))) continue;
      size_t used = strlen(against);
      snprintf(against + used, sizeof against - used, "%s%s", used ? " " : "", rule_name[r]);
    }
    if (against[0]) mho_table_text(table, against);
    else mho_table_empty(table);
  }
}

void mho_rules_note(mho_output *output, const mho_molecule *molecule,
                    const mho_interference *map)
{
  for (int r = 0; r < RULES; r++) {
    size_t wrong = 0, said = 0;
    for (size_t p = 0; p < map->count; p++) {
      said += rule_of(&map->pair[p], r) != MHO_RULE_SILENT;
      wrong += mho_pair_disagrees(&map->pair[p], rule_of(&map->pair[p], r));
    }
    mho_output_note(output, "%s: the %s rule contradicts the exact result for %zu of the %zu pairs "
                            "it speaks of", molecule->name, rule_name[r], wrong, said);
  }
}

/* `coupling 0.3 and 0.5 eV`, or in more words where a chain is among them. */
static void write_electrodes(const mho_molecule *molecule, mho_buffer *words)
{
  const mho_contact *left = &molecule->contact[MHO_LEFT], *right = &molecule->contact[MHO_RIGHT];
  if (left->has_chain || right->has_chain) {
    mho_buffer_add(words, "left electrode ");
    mho_write_electrode(left, 6, words);
    mho_buffer_add(words, ", right electrode ");
    mho_write_electrode(right, 6, words);
    return;
  }
  mho_buffer_add(words, "coupling ");
  mho_buffer_number(words, 6, left->coupling_ev);
  mho_buffer_add(words, " and ");
  mho_buffer_number(words, 6, right->coupling_ev);
  mho_buffer_add(words, " eV");
}

void mho_assumption_note(mho_output *output, const mho_molecule *molecule,
                         const mho_junction *junction)
{
  char fermi[64], beta[32], temperature[32], at[32];
  mho_buffer electrodes = {0};
  mho_number_write(beta, sizeof beta, 6, molecule->beta_ev);
  mho_number_write(temperature, sizeof temperature, 6, molecule->temperature_k);
  mho_number_write(at, sizeof at, 6, junction->fermi_ev);
  write_electrodes(molecule, &electrodes);
  output->failed |= electrodes.failed;
  mho_fermi_write(&molecule->fermi, fermi, sizeof fermi);
  bool relative = molecule->fermi.kind != MHO_FERMI_ENERGY;
  mho_output_note(output, "%s: beta %s eV, parameters %s, %s, Fermi level %s%s%s%s, %s K",
                  molecule->name, beta, mho_parameters_name(molecule->parameters),
                  electrodes.failed ? "" : electrodes.data, fermi, relative ? " = " : "",
                  relative ? at : "", relative ? " eV" : "", temperature);
  mho_buffer_clear(&electrodes);
  for (int i = 0; i < molecule->notes.count; i++)
    mho_output_note(output, "%s: %s", molecule->name, molecule->notes.text[i]);
}

void mho_method_note(mho_output *output, const char *molecule, const mho_plan *plan,
                     const mho_point *point, size_t count)
{
  char description[512];
  mho_buffer used = {0};
  size_t settled[MHO_METHOD_COUNT] = {0};
  for (size_t i = 0; i < count; i++) settled[point[i].method]++;
  for (int m = 0; m < MHO_METHOD_COUNT; m++)
    if (settled[m])
      mho_buffer_print(&used, "%s %zu %s%s", used.size ? "," : "", settled[m],
                       m < MHO_METHOD_SPECTRUM ? "without work: " : "by ",
                       mho_method_name((mho_method)m));
  output->failed |= used.failed;
  mho_output_note(output, "%s: methods, quickest first: %s", molecule,
                  mho_plan_describe(plan, description, sizeof description));
  if (used.size && !used.failed)
    mho_output_note(output, "%s: of %zu energ%s%s; each by the first whose bound on its own error is "
                            "below 1e-12, or what the condition of T allows",
                    molecule, count, count == 1 ? "y" : "ies", used.data);
  mho_buffer_clear(&used);
}
