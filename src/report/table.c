/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "report/table.h"

#include <mho/warning.h>

#include <math.h>
#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/text.h"

static void table_clear(mho_table *table)
{
  for (size_t i = 0; i < table->cells; i++) free(table->cell[i].text);
  free(table->cell);
}

void mho_output_clear(mho_output *output)
{
  for (size_t i = 0; i < output->tables; i++) table_clear(&output->table[i]);
  for (size_t i = 0; i < output->warnings; i++) free(output->warning[i].molecule);
  for (size_t i = 0; i < output->notes; i++) free(output->note[i]);
  free(output->table);
  free(output->warning);
  free(output->note);
  *output = (mho_output){0};
}

/* One more element of a growing array; false without memory. */
static bool grow(void **array, size_t count, size_t size)
{
  if (count && count & (count - 1)) return true;
  void *larger = realloc(*array, (count ? 2 * count : 1) * size);
  if (larger) *array = larger;
  return larger != NULL;
}

mho_table *mho_output_find(const mho_output *output, const char *name)
{
  for (size_t i = 0; i < output->tables; i++)
    if (!strcmp(output->table[i].name, name)) return &output->table[i];
  return NULL;
}

mho_table *mho_output_table(mho_output *output, const char *name,
                            const char *const *column, size_t columns)
{
  mho_table *known = mho_output_find(output, name);
  if (known) return known;
  if (!grow((void **)&output->table, output->tables, sizeof *output->table)) {
    output->failed = true;
    return NULL;
  }
  mho_table *table = &output->table[output->tables++];
  *table = (mho_table){.name = name, .column = column, .columns = columns};
  return table;
}

void mho_output_warn(mho_output *output, const char *molecule, unsigned warnings)
{
  enum { REACH = 2000 }; /* lists are longer, and theirs come one by one */
  if (!warnings) return;
  for (size_t i = output->warnings; i-- > 0 && i + REACH > output->warnings;)
    if (!strcmp(output->warning[i].molecule, molecule)) {
      output->warning[i].warnings |= warnings;
      return;
    }
  char *copy = mho_copy_text(molecule);
  if (!copy || !grow((void **)&output->warning, output->warnings, sizeof *output->warning)) {
    free(copy);
    output->failed = true;
    return;
  }
  output->warning[output->warnings++] = (mho_molecule_warning){copy, warnings};
}

void mho_output_note(mho_output *output, const char *format, ...)
{
  char text[1024];
  va_list arguments;
  va_start(arguments, format);
  vsnprintf(text, sizeof text, format, arguments);
  va_end(arguments);
  char *copy = mho_copy_text(text);
  if (!copy || !grow((void **)&output->note, output->notes, sizeof *output->note)) {
    free(copy);
    output->failed = true;
    return;
  }
  output->note[output->notes++] = copy;
}

static void add_cell(mho_table *table, mho_cell cell)
{
  if (!table) return;
  if (table->cells == table->capacity) {
    size_t capacity = table->capacity ? 2 * table->capacity : 64;
    mho_cell *larger = realloc(table->cell, capacity * sizeof *larger);
    if (!larger) {
      table->failed = MHO_ERR_MEMORY;
      free(cell.text);
      return;
    }
    table->cell = larger;
    table->capacity = capacity;
  }
  table->cell[table->cells++] = cell;
}

void mho_table_number(mho_table *table, double value)
{
  if (table && !isfinite(value)) table->failed = MHO_ERR_NOT_FINITE;
  add_cell(table, (mho_cell){.kind = MHO_CELL_NUMBER, .number = value});
}

void mho_table_optional(mho_table *table, bool present, double value)
{
  if (present) mho_table_number(table, value);
  else mho_table_empty(table);
}

void mho_table_integer(mho_table *table, long value)
{
  add_cell(table, (mho_cell){.kind = MHO_CELL_INTEGER, .integer = value});
}

void mho_table_text(mho_table *table, const char *text)
{
  char *copy = mho_copy_text(text ? text : "");
  if (table && !copy) table->failed = MHO_ERR_MEMORY;
  add_cell(table, (mho_cell){.kind = MHO_CELL_TEXT, .text = copy});
}

void mho_table_node(mho_table *table)
{
  add_cell(table, (mho_cell){.kind = MHO_CELL_NODE});
}

void mho_table_empty(mho_table *table)
{
  add_cell(table, (mho_cell){.kind = MHO_CELL_EMPTY});
}

size_t mho_table_rows(const mho_table *table) { return table->cells / table->columns; }

mho_status mho_output_check(const mho_output *output, mho_error *error)
{
  if (output->failed) return mho_fail(error, MHO_ERR_MEMORY, "report", NULL, "out of memory");
  for (size_t i = 0; i < output->tables; i++)
    if (output->table[i].failed != MHO_OK)
      return mho_fail(error, output->table[i].failed, "report", output->table[i].name,
                      "table '%s': %s", output->table[i].name,
                      mho_status_text(output->table[i].failed));
  return MHO_OK;
}

void mho_write_warning_words(mho_buffer *buffer, unsigned warnings)
{
  bool first = true;
  for (int i = 0; i < MHO_WARNING_COUNT; i++) {
    if (!(warnings & (1u << i))) continue;
    mho_buffer_print(buffer, "%s%s", first ? "" : " ", mho_warning_word(i));
    first = false;
  }
}
