/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <mho/quantity.h>
#include <mho/screen_store.h>
#include <mho/warning.h>

#include <stdlib.h>
#include <string.h>

#include "base/text.h"
#include "report/stages.h"

#define COUNT(array) (sizeof(array) / sizeof *(array))

/* For the eye: at most so many characters a name; of the narrowest screens for
 * SMILES, and for gap and length; and what the columns before the warnings take
 * with and without the latter two. */
enum {
  NAME_MOST = 24, NAME_NARROW = 20, WIDE = 136, MIDDLE = 112, BEFORE = 92, BEFORE_NARROW = 71,
  EYE_DIGITS = 4
};

/* At most `room` characters of a text, with dots where it goes on. */
static void add_cut(mho_table *table, const char *text, int room)
{
  int used = 0;
  const char *at = text, *cut = text;
  for (; *at; at++) {
    if (((unsigned char)*at & 0xC0) == 0x80) continue;
    if (used == room - 3) cut = at;
    if (++used > room) break;
  }
  char *shorter = *at && room > 3 ? mho_print_text("%.*s...", (int)(cut - text), text) : NULL;
  if (*at && room > 3 && !shorter && table) table->failed = MHO_ERR_MEMORY;
  mho_table_text(table, shorter ? shorter : text);
  free(shorter);
}

static void add_value(mho_table *table, int width, const mho_screen_quantities *quantities,
                      int index)
{
  double value;
  char text[32];
  const char *end;
  bool there = mho_screen_value(quantities, index, &value);
  mho_number_write(text, sizeof text, EYE_DIGITS, value);
  if (width > 0 && !mho_number_read(text, &end, &value)) there = false;
  mho_table_optional(table, there, value);
}

mho_table *mho_screening_table(mho_output *output, int width)
{
  static const char *const wide[] = {"rank",   "candidate", "smiles",    "log10_G0",
                                     "low",    "high",      "gap_eV",    "length_nm",
                                     "top_probability", "warnings"};
  static const char *const middle[] = {"rank",   "candidate", "log10_G0",  "low", "high",
                                       "gap_eV", "length_nm", "top_probability", "warnings"};
  static const char *const narrow[] = {"rank", "candidate", "log10_G0", "low", "high",
                                       "top_probability", "warnings"};
  mho_table *table = width <= 0 || width >= WIDE
                         ? mho_output_table(output, "screen", wide, COUNT(wide))
                     : width >= MIDDLE ? mho_output_table(output, "screen", middle, COUNT(middle))
                                       : mho_output_table(output, "screen", narrow, COUNT(narrow));
  /* candidate, SMILES where there are any, and warnings */
  if (table) table->left = 1u << 1 | (table->columns == COUNT(wide)) << 2 | 1u << (table->columns - 1);
  return table;
}

static void add_warnings(mho_table *table, int width, unsigned warnings)
{
  mho_buffer words = {0};
  int before = width >= WIDE ? WIDE - MIDDLE + BEFORE : width >= MIDDLE ? BEFORE : BEFORE_NARROW;
  mho_write_warning_words(&words, warnings);
  if (table && words.failed) table->failed = MHO_ERR_MEMORY;
  add_cut(table, words.data ? words.data : "", width > before ? width - before : 0);
  mho_buffer_clear(&words);
}

void mho_screening_row(mho_table *table, int width, const mho_screen_text *text,
                       const mho_screen_place *place, const mho_screen_quantities *quantities)
{
  bool all = width <= 0 || width >= WIDE;
  mho_table_integer(table, (long)place->rank);
  add_cut(table, text->name, width <= 0 ? 0 : width < MIDDLE ? NAME_NARROW : NAME_MOST);
  if (all && text->smiles) add_cut(table, text->smiles, width > 0 ? WIDE - MIDDLE - 2 : 0);
  else if (all) mho_table_empty(table);
  add_value(table, width, quantities, MHO_SCREEN_log10_g0);
  add_value(table, width, quantities, MHO_SCREEN_low_log10_g0);
  add_value(table, width, quantities, MHO_SCREEN_high_log10_g0);
  if (all || width >= MIDDLE) {
    add_value(table, width, quantities, MHO_SCREEN_gap_ev);
    add_value(table, width, quantities, MHO_SCREEN_length_nm);
  }
  mho_table_number(table, place->top_probability);
  add_warnings(table, width, (unsigned)quantities->warnings);
}

mho_table *mho_failures_table(mho_output *output)
{
  static const char *const columns[] = {"candidate", "line", "reason"};
  mho_table *table = mho_output_table(output, "failures", columns, COUNT(columns));
  if (table) table->left = 1u << 2;
  return table;
}

void mho_failures_row(mho_table *table, const mho_screen_text *text)
{
  mho_table_text(table, text->name);
  if (text->line > 0) mho_table_integer(table, text->line);
  else mho_table_empty(table);
  mho_table_text(table, text->reason);
}

/* Each warning once, with its meaning. */
static void note_warnings(mho_output *output, unsigned warnings)
{
  for (int i = 0; i < MHO_WARNING_COUNT; i++)
    if (warnings >> i & 1)
      mho_output_note(output, "%s: %s", mho_warning_word(i), mho_warning_sentence(i));
}

void mho_screening_note(mho_output *output, const mho_screen_rank_options *options,
                        const mho_screen_ranking *ranking, unsigned warnings)
{
  char text[200];
  mho_buffer requirements = {0};
  for (size_t i = 0; i < options->requirements; i++)
    mho_buffer_print(&requirements, "%s%s", i ? ", " : "; required: ",
                     mho_screen_require_write(&options->requirement[i], text, sizeof text));
  output->failed |= requirements.failed;
  mho_output_note(output, "goal: %s%s", mho_screen_goal_write(&options->goal, text, sizeof text),
                  requirements.data ? requirements.data : "");
  mho_buffer_clear(&requirements);
  if (ranking->refused)
    mho_output_note(output, "%zu do not meet what is required and are left out", ranking->refused);
  if (ranking->undefined)
    mho_output_note(output, "%zu have no %s and stand last", ranking->undefined,
                    mho_screen_quantity_at(options->goal.quantity)->name);
  if (ranking->top > 1 && ranking->distinguishable == 1)
    mho_output_note(output, "the first %zu cannot be told apart: their differences are smaller "
                            "than the errors of the parameters (90 %%)", ranking->top);
  else if (ranking->top > 1)
    mho_output_note(output, "the first %zu fall into %zu groups that can be told apart (90 %%); "
                            "within a group the order means nothing",
                    ranking->top, ranking->distinguishable);
  note_warnings(output, warnings);
}

void mho_screening_state_note(mho_output *output, const mho_screen_counts *counts, bool eye)
{
  unsigned long long done = counts->good + counts->bad, rows = counts->rows;
  if (done < rows)
    mho_output_note(output, "unfinished: %llu of %llu rows are done; mho screen LIST --store "
                            "... --resume goes on", done, rows);
  if (counts->bad)
    mho_output_note(output, "%llu of %llu rows are bad%s", (unsigned long long)counts->bad, done,
                    eye ? "; --failed lists them" : "");
}
