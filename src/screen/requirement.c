/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * `quantity comparison value-with-unit`, and goals, from text and back.
 */
#include <mho/quantity.h>
#include <mho/screen.h>
#include <mho/warning.h>

#include <ctype.h>
#include <math.h>
#include <stdio.h>
#include <string.h>

#include "base/text.h"

enum { WORD_SIZE = 64, LIST_SIZE = 400, DIGITS = 12 };

static const char *const comparisons[] = {
    [MHO_IS_LESS] = "<",     [MHO_IS_AT_MOST] = "<=",  [MHO_IS_EQUAL] = "=",
    [MHO_IS_UNEQUAL] = "!=", [MHO_IS_AT_LEAST] = ">=", [MHO_IS_MORE] = ">"};
enum { COMPARISONS = sizeof comparisons / sizeof *comparisons };

static const char *const aims[] = {
    [MHO_AIM_MAXIMISE] = "maximise", [MHO_AIM_MINIMISE] = "minimise", [MHO_AIM_MATCH] = "match"};
enum { AIMS = sizeof aims / sizeof *aims };

/* A reader's place, and where its reason goes. */
typedef struct {
  const char *at;
  char *reason;
  size_t size;
} reader;

static void skip_blanks(reader *r)
{
  while (*r->at == ' ' || *r->at == '\t') r->at++;
}

/* A word of letters, digits and hyphens; *word is empty where there is none. */
static void read_word(reader *r, char word[WORD_SIZE])
{
  skip_blanks(r);
  size_t length = 0;
  while (isalnum((unsigned char)r->at[length]) || r->at[length] == '-' || r->at[length] == '_')
    length++;
  snprintf(word, WORD_SIZE, "%.*s", (int)(length < WORD_SIZE ? length : WORD_SIZE - 1), r->at);
  r->at += length;
}

static bool is_word_form(mho_screen_form form)
{
  return form == MHO_FORM_LINKER || form == MHO_FORM_WARNINGS;
}

/* Names that may be asked for; a goal needs a number. */
static size_t list_names(bool numbers, const char *name[MHO_SCREEN_QUANTITIES])
{
  size_t count = 0;
  for (int i = 0; i < MHO_SCREEN_QUANTITIES; i++) {
    const mho_screen_quantity *q = mho_screen_quantity_at(i);
    if (q->name[0] && !(numbers && is_word_form(q->form))) name[count++] = q->name;
  }
  return count;
}

/* Says what is wrong with a word, the nearest that is allowed, and all. */
static void refuse_word(const reader *r, const char *what, const char *word,
                        const char *const *allowed, size_t count)
{
  char list[LIST_SIZE];
  const char *nearest = mho_nearest_word(word, allowed, count);
  mho_join_words(allowed, count, list, sizeof list);
  if (nearest)
    snprintf(r->reason, r->size, "%s '%.40s' is not known; did you mean '%s'? allowed are %s", what,
             word, nearest, list);
  else
    snprintf(r->reason, r->size, "%s '%.40s' is not known; allowed are %s", what, word, list);
}

static mho_status read_quantity(reader *r, bool numbers, int *quantity)
{
  char word[WORD_SIZE];
  const char *name[MHO_SCREEN_QUANTITIES];
  read_word(r, word);
  for (int i = 0; i < MHO_SCREEN_QUANTITIES; i++) {
    const mho_screen_quantity *q = mho_screen_quantity_at(i);
    if (!word[0] || strcmp(q->name, word) || (numbers && is_word_form(q->form))) continue;
    *quantity = i;
    return MHO_OK;
  }
  refuse_word(r, "quantity", word, name, list_names(numbers, name));
  return MHO_ERR_KEY;
}

static mho_status read_comparison(reader *r, mho_screen_form form,
                                  mho_screen_comparison *comparison)
{
  skip_blanks(r);
  size_t length = strspn(r->at, "<>=!");
  int found = -1;
  for (int c = 0; c < COMPARISONS; c++)
    if (strlen(comparisons[c]) == length && !strncmp(comparisons[c], r->at, length)) found = c;
  if (found < 0) {
    snprintf(r->reason, r->size, "'%.40s' begins with no comparison; allowed are <, <=, =, !=, >= or >",
             r->at);
    return MHO_ERR_SYNTAX;
  }
  if (is_word_form(form) && found != MHO_IS_EQUAL && found != MHO_IS_UNEQUAL) {
    snprintf(r->reason, r->size, "'%s' compares numbers, and this is a word; allowed are = or !=",
             comparisons[found]);
    return MHO_ERR_SYNTAX;
  }
  r->at += length;
  *comparison = (mho_screen_comparison)found;
  return MHO_OK;
}

static mho_status read_linker(reader *r, const char *word, double *value)
{
  const char *name[MHO_LINKER_KINDS + 1];
  for (int kind = 0; kind <= MHO_LINKER_KINDS; kind++) {
    name[kind] = mho_linker_name((mho_linker_kind)kind);
    *value = kind;
    if (!strcmp(word, name[kind])) return MHO_OK;
  }
  refuse_word(r, "linker", word, name, MHO_LINKER_KINDS + 1);
  return MHO_ERR_REFERENCE;
}

static mho_status read_warning(reader *r, const char *word, double *value)
{
  const char *name[MHO_WARNING_COUNT + 1] = {"none"};
  for (int w = 0; w < MHO_WARNING_COUNT; w++) name[w + 1] = mho_warning_word(w);
  for (int w = 0; w <= MHO_WARNING_COUNT; w++) {
    *value = w ? 1 << (w - 1) : 0;
    if (!strcmp(word, name[w])) return MHO_OK;
  }
  refuse_word(r, "warning", word, name, MHO_WARNING_COUNT + 1);
  return MHO_ERR_REFERENCE;
}

static mho_status read_plain(reader *r, bool whole, double *value)
{
  skip_blanks(r);
  const char *end;
  bool good = mho_number_read(r->at, &end, value);
  if (good && (!whole || *value == floor(*value))) {
    r->at = end;
    return MHO_OK;
  }
  snprintf(r->reason, r->size, "'%.40s' is not a %s; allowed is one without a unit, such as %s",
           r->at, whole ? "whole number" : "number", whole ? "4" : "1e-3");
  return MHO_ERR_SYNTAX;
}

static mho_status read_value(reader *r, mho_screen_form form, double *value)
{
  static const mho_dimension dimension[] = {[MHO_FORM_ENERGY] = MHO_ENERGY,
                                            [MHO_FORM_LENGTH] = MHO_LENGTH,
                                            [MHO_FORM_DECADES] = MHO_DECADES,
                                            [MHO_FORM_CONDUCTANCE] = MHO_CONDUCTANCE};
  char word[WORD_SIZE];
  mho_status status;
  if (is_word_form(form)) {
    read_word(r, word);
    status = form == MHO_FORM_LINKER ? read_linker(r, word, value) : read_warning(r, word, value);
  } else if (form == MHO_FORM_NUMBER || form == MHO_FORM_COUNT) {
    status = read_plain(r, form == MHO_FORM_COUNT, value);
  } else {
    status = mho_quantity_read(r->at, dimension[form], value, r->reason, r->size);
    r->at += strlen(r->at);
  }
  if (status == MHO_OK && form == MHO_FORM_CONDUCTANCE) {
    if (!(*value > 0)) {
      snprintf(r->reason, r->size, "a conductance is compared in decades; it must be above 0 G0");
      return MHO_ERR_RANGE;
    }
    *value = log10(*value);
  }
  return status;
}

static mho_status read_end(reader *r)
{
  skip_blanks(r);
  if (!*r->at) return MHO_OK;
  snprintf(r->reason, r->size, "'%.40s' stands behind the value; allowed is nothing more", r->at);
  return MHO_ERR_SYNTAX;
}

mho_status mho_screen_require_read(const char *text, mho_screen_requirement *requirement,
                                   char *reason, size_t reason_size)
{
  char unused[1];
  reader r = {text, reason ? reason : unused, reason ? reason_size : sizeof unused};
  mho_screen_requirement found = {0};
  mho_status status = read_quantity(&r, false, &found.quantity);
  if (status != MHO_OK) return status;
  mho_screen_form form = mho_screen_quantity_at(found.quantity)->form;
  status = read_comparison(&r, form, &found.comparison);
  if (status == MHO_OK) status = read_value(&r, form, &found.value);
  if (status == MHO_OK) status = read_end(&r);
  if (status == MHO_OK) *requirement = found;
  return status;
}

static mho_status read_aim(reader *r, mho_screen_aim *aim)
{
  char word[WORD_SIZE];
  read_word(r, word);
  for (int a = 0; a < AIMS; a++) {
    *aim = (mho_screen_aim)a;
    if (!strcmp(word, aims[a])) return MHO_OK;
  }
  refuse_word(r, "goal", word, aims, AIMS);
  return MHO_ERR_SYNTAX;
}

mho_status mho_screen_goal_read(const char *text, mho_screen_goal *goal, char *reason,
                                size_t reason_size)
{
  char unused[1];
  reader r = {text, reason ? reason : unused, reason ? reason_size : sizeof unused};
  mho_screen_goal found = {0};
  mho_status status = read_aim(&r, &found.aim);
  if (status == MHO_OK) status = read_quantity(&r, true, &found.quantity);
  if (status == MHO_OK && found.aim == MHO_AIM_MATCH)
    status = read_value(&r, mho_screen_quantity_at(found.quantity)->form, &found.value);
  if (status == MHO_OK) status = read_end(&r);
  if (status == MHO_OK) *goal = found;
  return status;
}

/* --- and back --------------------------------------------------------------- */

static void write_value(mho_screen_form form, double value, char *buffer, size_t size)
{
  static const char *const unit[] = {[MHO_FORM_NUMBER] = "",       [MHO_FORM_COUNT] = "",
                                     [MHO_FORM_ENERGY] = " eV",    [MHO_FORM_LENGTH] = " nm",
                                     [MHO_FORM_DECADES] = " decades",
                                     [MHO_FORM_CONDUCTANCE] = " G0"};
  char number[40];
  int bit = 0;
  if (form == MHO_FORM_LINKER) {
    snprintf(buffer, size, "%s", mho_linker_name((mho_linker_kind)(int)value));
    return;
  }
  if (form == MHO_FORM_WARNINGS) {
    while (bit < MHO_WARNING_COUNT && (int)value != 1 << bit) bit++;
    snprintf(buffer, size, "%s", bit < MHO_WARNING_COUNT ? mho_warning_word(bit) : "none");
    return;
  }
  mho_number_write(number, sizeof number, DIGITS,
                   form == MHO_FORM_CONDUCTANCE ? pow(10, value) : value);
  snprintf(buffer, size, "%s%s", number, unit[form]);
}

const char *mho_screen_require_write(const mho_screen_requirement *requirement, char *buffer,
                                     size_t size)
{
  const mho_screen_quantity *q = mho_screen_quantity_at(requirement->quantity);
  char value[WORD_SIZE];
  write_value(q->form, requirement->value, value, sizeof value);
  snprintf(buffer, size, "%s %s %s", q->name, comparisons[requirement->comparison], value);
  return buffer;
}

const char *mho_screen_goal_write(const mho_screen_goal *goal, char *buffer, size_t size)
{
  const mho_screen_quantity *q = mho_screen_quantity_at(goal->quantity);
  char value[WORD_SIZE] = "";
  if (goal->aim == MHO_AIM_MATCH) write_value(q->form, goal->value, value, sizeof value);
  snprintf(buffer, size, "%s %s%s%s", aims[goal->aim], q->name, value[0] ? " " : "", value);
  return buffer;
}

/* --- does it hold? ---------------------------------------------------------- */

bool mho_screen_meets(const mho_screen_quantities *quantities,
                      const mho_screen_requirement *requirement)
{
  double value, limit = requirement->value;
  if (!mho_screen_value(quantities, requirement->quantity, &value)) return false;
  if (requirement->quantity == MHO_SCREEN_warnings) {
    int bits = (int)value, asked = (int)limit;
    bool is = asked ? bits & asked : !bits;
    return requirement->comparison == MHO_IS_EQUAL ? is : !is;
  }
  switch (requirement->comparison) {
  case MHO_IS_LESS: return value < limit;
  case MHO_IS_AT_MOST: return value <= limit;
  case MHO_IS_EQUAL: return value == limit;
  case MHO_IS_UNEQUAL: return value != limit;
  case MHO_IS_AT_LEAST: return value >= limit;
  case MHO_IS_MORE: return value > limit;
  }
  return false;
}
