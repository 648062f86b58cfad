/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Tables of resonances and of what happens inside a junction at one energy.
 */
#include <mho/quantity.h>

#include <math.h>
#include <stdio.h>

#include "report/stages.h"

#define COUNT(array) (sizeof(array) / sizeof *(array))

#define LEAST_FLOW 1e-12 /* of T; less is rounding */

mho_table *mho_poles_table(mho_output *output, bool widths)
{
  static const char *const columns[] = {"molecule", "energy_eV", "width_eV", "left_width_eV",
                                        "right_width_eV"};
  return mho_output_table(output, "poles", columns, widths ? COUNT(columns) : 3);
}

void mho_poles_row(mho_table *table, const char *molecule, double fermi_ev, const mho_pole *pole,
                   bool widths)
{
  mho_table_text(table, molecule);
  mho_table_number(table, pole->energy_ev - fermi_ev);
  mho_table_number(table, pole->width_ev);
  if (!widths) return;
  mho_table_number(table, pole->left_width_ev);
  mho_table_number(table, pole->right_width_ev);
}

/* `at -2.69829 eV, 0.333 eV wide, 50 % of it by the left contact` */
static void write_resonance(const mho_pole *pole, double fermi_ev, char *buffer, size_t size)
{
  char energy[32], width[32];
  mho_number_write(energy, sizeof energy, 6, pole->energy_ev - fermi_ev);
  mho_number_write(width, sizeof width, 3, pole->width_ev);
  snprintf(buffer, size, "at %s eV, %s eV wide, %.3g %% of it by the left contact", energy, width,
           100 * pole->left_width_ev / pole->width_ev);
}

void mho_frontier_note(mho_output *output, const char *molecule, const mho_junction *junction,
                       const mho_pole *pole)
{
  int occupied = junction->electrons / 2, odd = junction->electrons % 2;
  const int frontier[2] = {odd ? occupied : occupied - 1, occupied};
  static const char *const name[] = {"HOMO", "LUMO"};
  for (int side = odd; side < 2; side++) {
    int step = side ? 1 : -1, k = frontier[side];
    bool exists = k >= 0 && k < junction->sites;
    while (k >= 0 && k < junction->sites && !(pole[k].width_ev > 0)) k += step;
    const char *word = odd ? "SOMO" : name[side];
    char text[160] = "none, as no contact sees such a level";
    if (!exists) continue;
    if (k >= 0 && k < junction->sites)
      write_resonance(&pole[k], junction->fermi_ev, text, sizeof text);
    mho_output_note(output, "%s: %s-like resonance %s%s%s%s", molecule, word, text,
                    k != frontier[side] ? "; the " : "", k != frontier[side] ? word : "",
                    k != frontier[side] ? " itself has no width, as no contact sees it" : "");
  }
}

void mho_inside_note(mho_output *output, const char *molecule, double relative_energy_ev,
                     const mho_inside *inside)
{
  char at[64] = "at the Fermi level";
  if (relative_energy_ev != 0)
    snprintf(at, sizeof at, "at %g eV %s the Fermi level", fabs(relative_energy_ev),
             relative_energy_ev > 0 ? "above" : "below");
  if (inside->flows)
    mho_output_note(output, "%s: T is %.3g %s", molecule, inside->transmission, at);
}

mho_table *mho_currents_table(mho_output *output)
{
  static const char *const columns[] = {"molecule", "from", "to", "current"};
  return mho_output_table(output, "currents", columns, COUNT(columns));
}

void mho_currents_rows(mho_table *table, const mho_molecule *molecule, const mho_inside *inside)
{
  for (size_t i = 0; i < inside->bonds; i++) {
    const mho_bond_current *current = &inside->bond[i];
    double flow = inside->flows ? current->flow / inside->transmission : 0;
    if (fabs(flow) < LEAST_FLOW) flow = 0;
    bool back = flow < 0;
    mho_table_text(table, molecule->name);
    mho_table_text(table, molecule->site[back ? current->to : current->from].id);
    mho_table_text(table, molecule->site[back ? current->from : current->to].id);
    mho_table_optional(table, inside->flows, fabs(flow));
  }
}

mho_table *mho_orbitals_table(mho_output *output)
{
  static const char *const columns[] = {"molecule", "level", "energy_eV", "diagonal",
                                        "interference"};
  return mho_output_table(output, "orbitals", columns, COUNT(columns));
}

void mho_orbitals_rows(mho_table *table, const char *molecule, double fermi_ev,
                       const mho_inside *inside)
{
  for (size_t k = 0; k < inside->orbitals; k++) {
    mho_table_text(table, molecule);
    mho_table_integer(table, (long)k + 1);
    mho_table_number(table, inside->orbital[k].level_ev - fermi_ev);
    mho_table_number(table, inside->orbital[k].alone);
    mho_table_number(table, inside->orbital[k].interference);
  }
}

void mho_orbitals_note(mho_output *output, const char *molecule, const mho_junction *junction)
{
  int pairs = junction->electrons / 2;
  if (junction->electrons % 2)
    mho_output_note(output, "%s: level %d is the SOMO, with one electron", molecule, pairs + 1);
  else if (pairs > 0 && pairs < junction->sites)
    mho_output_note(output, "%s: level %d is the HOMO, level %d the LUMO", molecule, pairs, pairs + 1);
}

mho_table *mho_channels_table(mho_output *output, bool parts)
{
  static const char *const columns[] = {"molecule", "channel", "transmission", "contact", "site",
                                        "part"};
  return mho_output_table(output, "channels", columns, parts ? COUNT(columns) : 3);
}

static void begin_channel(mho_table *table, const char *molecule, const mho_inside *inside,
                          size_t channel)
{
  mho_table_text(table, molecule);
  mho_table_integer(table, (long)channel + 1);
  if (inside->flows || inside->outside_band)
    mho_table_number(table, inside->eigenchannel[channel]);
  else mho_table_node(table);
}

/* A contact of one channel has its sites by the squares of their amplitudes. */
static double part_of_site(const mho_contact *contact, int k, const double *part)
{
  if (contact->channels != MHO_CHANNELS_ONE) return part[k];
  double total = 0;
  for (int i = 0; i < contact->count; i++)
    total += contact->amplitude[i] * contact->amplitude[i];
  return *part * contact->amplitude[k] * contact->amplitude[k] / total;
}

static void add_parts(mho_table *table, const mho_molecule *molecule, const mho_inside *inside,
                      size_t channel)
{
  static const char *const name[] = {"left", "right"};
  for (int side = 0; side < 2; side++) {
    const mho_contact *contact = &molecule->contact[side];
    size_t channels = contact->channels == MHO_CHANNELS_ONE ? 1 : (size_t)contact->count;
    const double *part = (side ? inside->right_part : inside->left_part) + channel * channels;
    for (int k = 0; k < contact->count; k++) {
      begin_channel(table, molecule->name, inside, channel);
      mho_table_text(table, name[side]);
      mho_table_text(table, molecule->site[contact->site[k]].id);
      mho_table_optional(table, inside->flows && inside->eigenchannel[channel] > 0,
                         part_of_site(contact, k, part)); /* of a closed one any would do */
    }
  }
}

void mho_channels_rows(mho_table *table, const mho_molecule *molecule, const mho_inside *inside,
                       bool parts)
{
  for (size_t k = 0; k < inside->eigenchannels; k++)
    if (parts) add_parts(table, molecule, inside, k);
    else begin_channel(table, molecule->name, inside, k);
}

void mho_channels_note(mho_output *output, const mho_molecule *molecule, const mho_inside *inside)
{
  static const char *const name[] = {"left", "right"};
  double t = inside->transmission, first = inside->eigenchannel[0];
  if (inside->eigenchannels > 1 && inside->flows) {
    mho_output_note(output, "%s: %.3g %% of it by the first of %zu eigenchannels", molecule->name,
                    fmin(100, 100 * first / t), inside->eigenchannels);
    return;
  }
  for (int side = 0; side < 2; side++) {
    const mho_contact *contact = &molecule->contact[side];
    if (contact->count > 1 && contact->channels != MHO_CHANNELS_ONE) continue;
    mho_output_note(output, "%s: the %s contact has %s, so there is one eigenchannel, and it is T",
                    molecule->name, name[side],
                    contact->count > 1 ? "one channel over its sites" : "a single site");
    return;
  }
}
