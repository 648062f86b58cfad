/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Results of stages drawn on their molecule.
 */
#include <mho/quantity.h>

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "report/drawing.h"

/* Decades below the largest value that the map of pairs shows. */
#define SHOWN_DECADES 6.0

/* Changes that the sensitivity map tells: h by 0.1, a bond weaker by a tenth. */
#define STEP 0.1

#define LEAST 0.01 /* of the largest value; less is not drawn */

enum { WORDS_SIZE = 120, LABELLED_MAX = 8 };

/* Values and texts of sites and bonds; texts live in one block. */
typedef struct {
  int sites, bonds;
  double *value;      /* [sites + bonds] */
  char *words;        /* [2 (sites + bonds)][WORDS_SIZE] */
  const char **text;  /* [sites + bonds], then as many notes */
} canvas;

static mho_status fail_memory(mho_error *error)
{
  return mho_fail(error, MHO_ERR_MEMORY, "report", NULL, "out of memory");
}

static mho_status open_canvas(const mho_molecule *m, canvas *c, mho_error *error)
{
  size_t n = (size_t)m->site_count + (size_t)m->bond_count + 1;
  *c = (canvas){.sites = m->site_count, .bonds = m->bond_count};
  c->value = calloc(n, sizeof *c->value);
  c->words = calloc(2 * n, WORDS_SIZE);
  c->text = calloc(2 * n, sizeof *c->text);
  if (!c->value || !c->words || !c->text) return fail_memory(error);
  for (size_t i = 0; i < 2 * n; i++) c->text[i] = c->words + i * WORDS_SIZE;
  return MHO_OK;
}

static void close_canvas(canvas *c)
{
  free(c->value);
  free(c->words);
  free(c->text);
}

/* Place of a site and of a bond among the values; their texts and notes. */
static int of_bond(const canvas *c, int bond) { return c->sites + bond; }

static char *text_of(const canvas *c, int place)
{
  return c->words + (size_t)place * WORDS_SIZE;
}

static char *note_of(const canvas *c, int place)
{
  return text_of(c, place + c->sites + c->bonds + 1);
}

static mho_status paint(const mho_molecule *m, const canvas *c, const mho_drawing_key *key, int keys,
                        bool bars, double ring_scale, mho_buffer *svg, mho_error *error)
{
  const char *const *note = c->text + c->sites + c->bonds + 1;
  mho_drawing drawing;
  mho_drawing_marks marks = {.title = m->name,
                             .site_value = c->value,
                             .bond_value = c->value + c->sites,
                             .site_text = c->text,
                             .bond_text = c->text + c->sites,
                             .site_note = note,
                             .bond_note = note + c->sites,
                             .bars = bars,
                             .ring_scale = ring_scale,
                             .key = key,
                             .keys = keys};
  mho_status status = mho_drawing_make(m, &drawing, error);
  if (status == MHO_OK) mho_drawing_write(&drawing, &marks, svg);
  mho_drawing_clear(&drawing);
  return status == MHO_OK ? mho_buffer_check(svg, "report", error) : status;
}

/* A number with its sign, two digits. */
static void add_signed(char *words, const char *before, double value, const char *after)
{
  char number[40];
  mho_number_write(number, sizeof number, 2, fabs(value));
  snprintf(words, WORDS_SIZE, "%.40s%s%.20s%.40s", before, value < 0 ? "−" : "+", number, after);
}

/* --- pairs ---------------------------------------------------------------- */

static double pair_log10(const mho_pair *pair)
{
  return pair->transmission > 0 ? log10(pair->transmission) : -INFINITY;
}

mho_status mho_drawing_write_pairs(const mho_molecule *m, const mho_interference *map, int from,
                                   mho_buffer *svg, mho_error *error)
{
  static const mho_drawing_key key[] = {
      {MHO_SHAPE_DISC, "conducts, Green's function positive; area by decades of T"},
      {MHO_SHAPE_HATCHED, "the same, negative"},
      {MHO_SHAPE_NONE, "node: no transmission between this site and the one marked from"}};
  canvas c;
  double highest = -INFINITY;
  mho_status status = open_canvas(m, &c, error);
  for (size_t p = 0; p < map->count; p++)
    if (map->pair[p].site[0] == from || map->pair[p].site[1] == from)
      highest = fmax(highest, pair_log10(&map->pair[p]));
  for (size_t p = 0; status == MHO_OK && p < map->count; p++) {
    const mho_pair *pair = &map->pair[p];
    if (pair->site[0] != from && pair->site[1] != from) continue;
    int other = pair->site[0] == from ? pair->site[1] : pair->site[0];
    double size = 1 - (highest - pair_log10(pair)) / SHOWN_DECADES;
    bool some = pair->transmission > 0;
    char number[40];
    c.value[other] = some ? copysign(fmax(size, 0.05), pair->green_per_ev) : 0;
    mho_number_write(number, sizeof number, 6, pair->transmission);
    snprintf(note_of(&c, other), WORDS_SIZE, "%.40s: T %s", m->site[other].id, number);
    snprintf(text_of(&c, other), WORDS_SIZE, "%s", some ? "" : "node");
  }
  if (status == MHO_OK) {
    snprintf(text_of(&c, from), WORDS_SIZE, "from");
    status = paint(m, &c, key, 3, false, 0, svg, error);
  }
  close_canvas(&c);
  return status;
}

/* --- currents ------------------------------------------------------------- */

static int find_bond(const mho_molecule *m, int from, int to, bool *turned)
{
  for (int b = 0; b < m->bond_count; b++)
    for (int end = 0; end < 2; end++)
      if (m->bond[b].site[end] == from && m->bond[b].site[!end] == to) {
        *turned = end == 1;
        return b;
      }
  return -1;
}

mho_status mho_drawing_write_currents(const mho_molecule *m, const mho_inside *inside,
                                      mho_buffer *svg, mho_error *error)
{
  char scale[WORDS_SIZE], number[40];
  double most = 0, t = inside->transmission;
  canvas c;
  mho_status status = open_canvas(m, &c, error);
  for (size_t i = 0; i < inside->bonds; i++) most = fmax(most, fabs(inside->bond[i].flow));
  for (size_t i = 0; status == MHO_OK && most > 0 && i < inside->bonds; i++) {
    const mho_bond_current *current = &inside->bond[i];
    bool turned;
    int bond = find_bond(m, current->from, current->to, &turned);
    if (bond < 0 || fabs(current->flow) < LEAST * most) continue;
    double part = fabs(current->flow) / t;
    int place = of_bond(&c, bond);
    c.value[place] = (turned ? -1 : 1) * current->flow / most;
    mho_drawing_percent(100 * part, text_of(&c, place), WORDS_SIZE);
    mho_number_write(number, sizeof number, 6, part);
    bool back = current->flow < 0;
    snprintf(note_of(&c, place), WORDS_SIZE, "%.25s to %.25s: %s of T",
             m->site[back ? current->to : current->from].id,
             m->site[back ? current->from : current->to].id, number);
  }
  mho_number_write(number, sizeof number, 3, t);
  snprintf(scale, sizeof scale, "current from the left, in percent of T = %s", number);
  const mho_drawing_key key[] = {
      {MHO_SHAPE_ARROW, scale}, {MHO_SHAPE_NONE, "round arrow: what circulates in a ring, in percent"}};
  if (status == MHO_OK) status = paint(m, &c, key, 2, false, 100 * most / t, svg, error);
  close_canvas(&c);
  return status;
}

/* --- how flat ------------------------------------------------------------- */

mho_status mho_drawing_write_twist(const mho_molecule *m, const int *bond, int bonds,
                                   const double limit_deg[2], mho_buffer *svg, mho_error *error)
{
  char half[WORDS_SIZE];
  canvas c;
  mho_status status = open_canvas(m, &c, error);
  for (int k = 0; status == MHO_OK && k < bonds; k++) {
    int place = of_bond(&c, bond[k]);
    c.value[place] = 1;
    snprintf(text_of(&c, place), WORDS_SIZE, "≤ %g°", limit_deg[0]);
    snprintf(note_of(&c, place), WORDS_SIZE, "80 %% to %g deg", limit_deg[0]);
  }
  snprintf(half, sizeof half, "twisted by at most this%s it keeps 80 %%, by %g° half",
           bonds > 1 ? " together" : "", limit_deg[1]);
  const mho_drawing_key key[] = {{MHO_SHAPE_BAR, half},
                                 {MHO_SHAPE_NONE, "of the conductance of the flat molecule"}};
  if (status == MHO_OK) status = paint(m, &c, key, 2, true, 0, svg, error);
  close_canvas(&c);
  return status;
}

/* --- what to change ------------------------------------------------------- */

/* Change of log10 G when a donor raises the energy of a site by 0.1 |beta|, and
 * when a bond that can turn is a tenth weaker. */
static bool find_change(const mho_molecule *m, const mho_sensitivity_row *row, double *change)
{
  const mho_bond *bond;
  double beta = fabs(m->beta_ev), d = row->derivative_log10_g0;
  switch (row->kind) {
  case MHO_PARAMETER_H: *change = -d * STEP; return true;
  case MHO_PARAMETER_ONSITE: *change = d * STEP * beta; return true;
  case MHO_PARAMETER_K:
  case MHO_PARAMETER_HOPPING:
    bond = &m->bond[row->index];
    if (!bond->rotatable && bond->twist_deg == 0) return false;
    double cosine = mho_cos_deg(bond->twist_deg);
    if (cosine == 0) return false;
    double flat = mho_molecule_hopping_ev(m, row->index) / cosine; /* k beta */
    *change = -d * STEP * (row->kind == MHO_PARAMETER_K ? flat / m->beta_ev : flat);
    return true;
  default: return false;
  }
}

static bool is_site(const mho_sensitivity_row *row)
{
  return row->kind == MHO_PARAMETER_H || row->kind == MHO_PARAMETER_ONSITE;
}

/* A contact, or a site with room for a substituent: with a hydrogen, or where
 * there is no structure with at most two bonds. */
static bool can_bear(const mho_molecule *m, int site)
{
  int bonds = 0;
  for (int side = 0; side < 2; side++)
    for (int i = 0; i < m->contact[side].count; i++)
      if (m->contact[side].site[i] == site) return true;
  if (m->graph.atom_count > 0) return mho_graph_hydrogens(&m->graph, m->site_atom[site]) > 0;
  for (int b = 0; b < m->bond_count; b++)
    bonds += m->bond[b].site[0] == site || m->bond[b].site[1] == site;
  return bonds < 3;
}

/* Rows come by their contribution, so the first of them are labelled. */
static void fill_sensitivity(const mho_molecule *m, const mho_sensitivity *s, canvas *c)
{
  double most[2] = {0, 0}, change;
  int labelled = 0;
  for (size_t i = 0; i < s->count; i++)
    if (find_change(m, &s->row[i], &change))
      most[is_site(&s->row[i])] = fmax(most[is_site(&s->row[i])], fabs(change));
  for (size_t i = 0; i < s->count; i++) {
    const mho_sensitivity_row *row = &s->row[i];
    bool site = is_site(row);
    if (!find_change(m, row, &change) || fabs(change) <= LEAST * most[site]) continue;
    int place = site ? row->index : of_bond(c, row->index);
    c->value[place] = change / most[site];
    if (!site || (can_bear(m, row->index) && labelled++ < LABELLED_MAX))
      add_signed(text_of(c, place), site ? change > 0 ? "D " : "A " : "",
                 site ? fabs(change) : change, "");
    const char *first = m->site[site ? row->index : m->bond[row->index].site[0]].id;
    char before[44];
    if (site) snprintf(before, sizeof before, "donor at %.25s: ", first);
    else snprintf(before, sizeof before, "weaker %.12s-%.12s: ", first,
                  m->site[m->bond[row->index].site[1]].id);
    add_signed(note_of(c, place), before, change, " decades");
  }
}

mho_status mho_drawing_write_sensitivity(const mho_molecule *m, const mho_sensitivity *sensitivity,
                                         mho_buffer *svg, mho_error *error)
{
  static const mho_drawing_key key[] = {
      {MHO_SHAPE_DISC, "D: a donor here raises G (decades for h lower by 0.1)"},
      {MHO_SHAPE_HATCHED, "A: an acceptor here raises G (for h higher by 0.1)"},
      {MHO_SHAPE_BAR, "a weaker bond (−10 %, a twist by 26°) raises G"},
      {MHO_SHAPE_HATCHED_BAR, "a weaker bond lowers G"}};
  static const mho_drawing_key node[] = {
      {MHO_SHAPE_NONE, "a node at the Fermi level: no derivatives"}};
  bool some = sensitivity->has_derivatives;
  canvas c;
  mho_status status = open_canvas(m, &c, error);
  if (status == MHO_OK && some) fill_sensitivity(m, sensitivity, &c);
  bool bars = false;
  for (int b = 0; status == MHO_OK && b < m->bond_count; b++) bars |= c.value[of_bond(&c, b)] != 0;
  if (status == MHO_OK)
    status = paint(m, &c, some ? key : node, !some ? 1 : bars ? 4 : 2, true, 0, svg, error);
  close_canvas(&c);
  return status;
}

mho_status mho_drawing_write_modifications(const mho_molecule *m, const mho_modifications *mods,
                                           mho_buffer *svg, mho_error *error)
{
  static const mho_drawing_key key[] = {
      {MHO_SHAPE_DISC, "this change raises G (decades); the largest effect of each site"},
      {MHO_SHAPE_HATCHED, "it lowers G"},
      {MHO_SHAPE_NONE, "changes at other sites are not listed: no hydrogen to give"}};
  double most = 0;
  canvas c;
  mho_status status = open_canvas(m, &c, error);
  for (size_t i = 0; i < mods->count; i++)
    if (mods->row[i].has_change) most = fmax(most, fabs(mods->row[i].change_decades));
  for (size_t i = 0; status == MHO_OK && i < mods->count; i++) {
    const mho_modification *row = &mods->row[i]; /* largest first */
    if (!row->has_change || c.value[row->site] != 0 ||
        fabs(row->change_decades) <= LEAST * most)
      continue;
    char before[44];
    c.value[row->site] = row->change_decades / most;
    snprintf(before, sizeof before, "%.30s\n", row->substituent->name);
    add_signed(text_of(&c, row->site), before, row->change_decades, "");
    snprintf(before, sizeof before, "%.25s at %.12s: ", row->substituent->name,
             m->site[row->site].id);
    add_signed(note_of(&c, row->site), before, row->change_decades, " decades");
  }
  if (status == MHO_OK) status = paint(m, &c, key, 3, false, 0, svg, error);
  close_canvas(&c);
  return status;
}
