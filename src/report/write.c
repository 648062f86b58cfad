/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Tables as CSV (RFC 4180), as JSON and for the screen.
 */
#include <mho/quantity.h>
#include <mho/warning.h>

#include <stdlib.h>
#include <string.h>

#include <jansson.h>

#include "base/text.h"
#include "report/json.h"
#include "report/table.h"

static void write_csv_text(mho_buffer *buffer, const char *text)
{
  if (!strpbrk(text, ",\"\r\n")) {
    mho_buffer_add(buffer, text);
    return;
  }
  mho_buffer_add(buffer, "\"");
  for (; *text; text++) {
    if (*text == '"') mho_buffer_add(buffer, "\"");
    mho_buffer_add_bytes(buffer, text, 1);
  }
  mho_buffer_add(buffer, "\"");
}

static void write_csv_cell(mho_buffer *buffer, const mho_cell *cell, int digits)
{
  switch (cell->kind) {
  case MHO_CELL_EMPTY: break;
  case MHO_CELL_NUMBER: mho_buffer_number(buffer, digits, cell->number); break;
  case MHO_CELL_INTEGER: mho_buffer_print(buffer, "%ld", cell->integer); break;
  case MHO_CELL_TEXT: write_csv_text(buffer, cell->text); break;
  case MHO_CELL_NODE: mho_buffer_add(buffer, "0"); break;
  }
}

mho_status mho_write_csv(const mho_table *table, int digits, mho_buffer *buffer,
                         mho_error *error)
{
  for (size_t c = 0; c < table->columns; c++)
    mho_buffer_print(buffer, "%s%s", c ? "," : "", table->column[c]);
  mho_buffer_add(buffer, "\n");
  for (size_t i = 0; i < table->cells; i++) {
    write_csv_cell(buffer, &table->cell[i], digits);
    mho_buffer_add(buffer, (i + 1) % table->columns ? "," : "\n");
  }
  return mho_buffer_check(buffer, "report", error);
}

json_t *mho_json_text(const char *text)
{
  size_t size = strlen(text);
  if (mho_utf8_prefix(text, size) == size) return json_string(text);
  char *copy = mho_copy_text(text);
  if (!copy) return NULL;
  for (size_t i = 0; (i += mho_utf8_prefix(copy + i, size - i)) < size;) copy[i] = '?';
  json_t *string = json_string(copy);
  free(copy);
  return string;
}

json_t *mho_json_with(json_t *object, const char *key, json_t *value)
{
  if (object && value && json_object_set_new(object, key, value) == 0) return object;
  if (!object) json_decref(value); /* jansson releases it otherwise */
  json_decref(object);
  return NULL;
}

json_t *mho_json_append(json_t *list, json_t *value)
{
  if (list && value && json_array_append_new(list, value) == 0) return list;
  if (!list) json_decref(value);
  json_decref(list);
  return NULL;
}

static json_t *json_cell(const mho_cell *cell)
{
  switch (cell->kind) {
  case MHO_CELL_NUMBER: return json_real(cell->number);
  case MHO_CELL_INTEGER: return json_integer(cell->integer);
  case MHO_CELL_TEXT: return mho_json_text(cell->text);
  case MHO_CELL_NODE: return json_real(0.0);
  case MHO_CELL_EMPTY: break;
  }
  return json_null();
}

static json_t *json_row(const mho_table *table, size_t first)
{
  json_t *row = json_array();
  for (size_t c = 0; c < table->columns; c++)
    row = mho_json_append(row, json_cell(&table->cell[first + c]));
  return row;
}

static json_t *json_table(const mho_table *table)
{
  json_t *columns = json_array(), *rows = json_array();
  for (size_t c = 0; c < table->columns; c++)
    columns = mho_json_append(columns, mho_json_text(table->column[c]));
  for (size_t i = 0; i + table->columns <= table->cells; i += table->columns)
    rows = mho_json_append(rows, json_row(table, i));
  return mho_json_with(mho_json_with(json_object(), "columns", columns), "rows", rows);
}

json_t *mho_json_tables(const mho_output *output)
{
  json_t *tables = json_object();
  for (size_t i = 0; i < output->tables; i++)
    tables = mho_json_with(tables, output->table[i].name, json_table(&output->table[i]));
  return tables;
}

json_t *mho_json_warning_words(unsigned warnings)
{
  json_t *words = json_array();
  for (int i = 0; i < MHO_WARNING_COUNT; i++)
    if (warnings & (1u << i)) words = mho_json_append(words, mho_json_text(mho_warning_word(i)));
  return words;
}

json_t *mho_json_warnings(const mho_output *output)
{
  json_t *list = json_array();
  for (size_t i = 0; i < output->warnings; i++)
    for (int k = 0; k < MHO_WARNING_COUNT; k++) {
      if (!(output->warning[i].warnings & (1u << k))) continue;
      json_t *item = json_object();
      item = mho_json_with(item, "molecule", mho_json_text(output->warning[i].molecule));
      item = mho_json_with(item, "warning", mho_json_text(mho_warning_word(k)));
      item = mho_json_with(item, "meaning", mho_json_text(mho_warning_sentence(k)));
      list = mho_json_append(list, item);
    }
  return list;
}

json_t *mho_json_notes(const mho_output *output)
{
  json_t *notes = json_array();
  for (size_t i = 0; i < output->notes; i++)
    notes = mho_json_append(notes, mho_json_text(output->note[i]));
  return notes;
}

static int append_json(const char *text, size_t size, void *buffer)
{
  mho_buffer_add_bytes(buffer, text, size);
  return ((mho_buffer *)buffer)->failed ? -1 : 0;
}

/* By the callback and into our buffer: jansson's own json_dumps drops the text
 * of a key where memory runs out, and reports success. */
mho_status mho_json_write(json_t *object, mho_buffer *buffer, mho_error *error)
{
  int code = object ? json_dump_callback(object, append_json, buffer,
                                         JSON_INDENT(1) | JSON_REAL_PRECISION(17))
                    : -1;
  json_decref(object);
  mho_buffer_add(buffer, "\n");
  if (code != 0) return mho_fail(error, MHO_ERR_MEMORY, "report", NULL, "out of memory");
  return mho_buffer_check(buffer, "report", error);
}

mho_status mho_write_json(const mho_output *output, mho_buffer *buffer, mho_error *error)
{
  json_t *object = json_object();
  object = mho_json_with(object, "schema", mho_json_text(MHO_JSON_SCHEMA));
  object = mho_json_with(object, "tables", mho_json_tables(output));
  object = mho_json_with(object, "warnings", mho_json_warnings(output));
  object = mho_json_with(object, "notes", mho_json_notes(output));
  return mho_json_write(object, buffer, error);
}

/* Characters that a UTF-8 text takes on the screen, near enough. */
static size_t screen_width(const char *text)
{
  size_t width = 0;
  for (; *text; text++) width += ((unsigned char)*text & 0xC0) != 0x80;
  return width;
}

/* A cell as text; the caller frees it. */
static char *screen_text(const mho_cell *cell, int digits)
{
  mho_buffer buffer = {0};
  if (cell->kind == MHO_CELL_NODE) mho_buffer_add(&buffer, "node: no prediction");
  else if (cell->kind == MHO_CELL_EMPTY) mho_buffer_add(&buffer, "-");
  else if (cell->kind == MHO_CELL_TEXT) mho_buffer_add(&buffer, cell->text);
  else write_csv_cell(&buffer, cell, digits);
  if (!buffer.data) mho_buffer_add(&buffer, "");
  if (buffer.failed) mho_buffer_clear(&buffer);
  return buffer.data;
}

static void pad(mho_buffer *buffer, size_t count)
{
  while (count-- > 0) mho_buffer_add(buffer, " ");
}

/* The first column stands to the left, numbers to the right. */
static void write_grid_cell(const mho_table *table, size_t column, const char *text, size_t width,
                            mho_buffer *buffer)
{
  bool left = column == 0 || table->left >> column & 1;
  size_t gap = width - screen_width(text);
  if (column > 0) pad(buffer, 2 + (left ? 0 : gap));
  mho_buffer_add(buffer, text);
  if (left && column + 1 < table->columns) pad(buffer, gap);
}

static void write_grid(const mho_table *table, char *const *text, const size_t *width,
                       mho_buffer *buffer)
{
  for (size_t c = 0; c < table->columns; c++) {
    write_grid_cell(table, c, table->column[c], width[c], buffer);
  }
  mho_buffer_add(buffer, "\n");
  for (size_t i = 0; i < table->cells; i++) {
    size_t c = i % table->columns;
    write_grid_cell(table, c, text[i], width[c], buffer);
    if (c + 1 == table->columns) mho_buffer_add(buffer, "\n");
  }
}

static void write_blocks(const mho_table *table, char *const *text, mho_buffer *buffer)
{
  size_t widest = 0;
  for (size_t c = 1; c < table->columns; c++)
    if (strlen(table->column[c]) > widest) widest = strlen(table->column[c]);
  for (size_t i = 0; i < table->cells; i++) {
    size_t c = i % table->columns;
    if (c == 0) {
      mho_buffer_print(buffer, "%s%s\n", i ? "\n" : "", text[i]);
      continue;
    }
    if (!text[i][0]) continue;
    mho_buffer_print(buffer, "  %s", table->column[c]);
    pad(buffer, widest - strlen(table->column[c]) + 2);
    mho_buffer_print(buffer, "%s\n", text[i]);
  }
}

static void write_screen_table(const mho_table *table, int digits, int limit,
                               mho_buffer *buffer)
{
  char **text = calloc(table->cells + 1, sizeof *text);
  size_t *width = calloc(table->columns, sizeof *width), total = 0;
  bool good = text && width;
  for (size_t c = 0; good && c < table->columns; c++)
    width[c] = screen_width(table->column[c]);
  for (size_t i = 0; good && i < table->cells; i++) {
    text[i] = screen_text(&table->cell[i], digits);
    good = text[i] != NULL;
    size_t c = i % table->columns, wide = good ? screen_width(text[i]) : 0;
    if (wide > width[c]) width[c] = wide;
  }
  if (good) {
    for (size_t c = 0; c < table->columns; c++) total += width[c] + (c ? 2 : 0);
    if (total <= (size_t)limit || table->columns <= 4) write_grid(table, text, width, buffer);
    else write_blocks(table, text, buffer);
  } else {
    buffer->failed = true;
  }
  for (size_t i = 0; text && i < table->cells; i++) free(text[i]);
  free(text);
  free(width);
}

mho_status mho_write_screen(const mho_output *output, int digits, int width,
                            mho_buffer *buffer, mho_error *error)
{
  for (size_t i = 0; i < output->tables; i++) {
    if (i) mho_buffer_add(buffer, "\n");
    write_screen_table(&output->table[i], digits, width, buffer);
  }
  if (output->notes) mho_buffer_add(buffer, "\n");
  for (size_t i = 0; i < output->notes; i++)
    mho_buffer_print(buffer, "%s\n", output->note[i]);
  for (size_t i = 0; i < output->warnings; i++)
    for (int k = 0; k < MHO_WARNING_COUNT; k++)
      if (output->warning[i].warnings & (1u << k))
        mho_buffer_print(buffer, "%s: %s: %s\n", output->warning[i].molecule,
                         mho_warning_word(k), mho_warning_sentence(k));
  return mho_buffer_check(buffer, "report", error);
}
