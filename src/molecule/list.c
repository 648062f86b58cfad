/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "molecule/list.h"

#include <stdlib.h>
#include <string.h>
#include <strings.h>

#include "base/text.h"
#include "base/window.h"
#include "molecule/graph.h"

enum { COLUMN_LIMIT = 1000 };

struct mho_list {
  mho_window file; /* from the next row on */
  long line;       /* of it */
  bool skipping;   /* the rest of a line that is too long comes first */
  char separator; /* of a CSV; 0 for .smi */
  int columns, smiles_column, name_column;
};

/* One field of a CSV row: text without its quotes, ended by NUL. */
typedef struct {
  char *text;
  long line, column;
} csv_field;

static mho_status fail_at(const mho_list *list, mho_error *error, long line,
                          long column, const char *message)
{
  return mho_fail_at(error, MHO_ERR_SYNTAX, MOLECULE_STAGE, list->file.path, line,
                     column, NULL, "%s", message);
}

/* Column from 1, in characters: bytes that continue one are not counted. */
static long column_at(const char *line_start, const char *at)
{
  long column = 1;
  for (const char *c = line_start; c < at; c++)
    column += ((unsigned char)*c & 0xC0) != 0x80;
  return column;
}

static void trim(char **start, char *end)
{
  while (end > *start && strchr(" \t\r", end[-1])) end--;
  *end = '\0';
  while (**start == ' ' || **start == '\t') ++*start;
}

static mho_status check_text(const mho_list *list, mho_error *error,
                             const char *start, size_t size, long line)
{
  if (memchr(start, 0, size))
    return fail_at(list, error, line, 1, "the row holds a NUL byte");
  size_t valid = mho_utf8_prefix(start, size);
  if (valid == size) return MHO_OK;
  return fail_at(list, error, line, column_at(start, start + valid),
                 "the row is not UTF-8 from here on");
}

/* --- .smi ----------------------------------------------------------------- */

static bool is_header(const char *word, size_t size)
{
  return size == 6 && !strncasecmp(word, "smiles", 6);
}

/* A row of the window, without its line end. */
typedef struct {
  char *start, *stop;
  const char *fault; /* NULL, or where it breaks the grammar */
  long line;
} text_row;

static char *line_end(char *start, char *end)
{
  char *stop = memchr(start, '\n', (size_t)(end - start));
  return stop ? stop : end;
}

static mho_status pass_rest_of_line(mho_list *list, mho_error *error)
{
  mho_window *w = &list->file;
  while (list->skipping) {
    w->at = line_end(w->at, w->end);
    list->skipping = w->at == w->end && !w->at_end;
    if (w->at < w->end) w->at++;
    mho_status status = list->skipping ? mho_window_more(w, error) : MHO_OK;
    if (status != MHO_OK) return status;
  }
  return MHO_OK;
}

/* The end of the row at the beginning of the window; the end of the window
 * where it goes on. */
static char *find_stop(const mho_list *list, text_row *row);

/* Takes the next row off the window; start is NULL at the end of the list. */
static mho_status take_row(mho_list *list, text_row *row, mho_error *error)
{
  mho_window *w = &list->file;
  mho_status status = pass_rest_of_line(list, error);
  for (*row = (text_row){.line = list->line}; status == MHO_OK;) {
    row->stop = find_stop(list, row);
    if (row->stop < w->end || w->at_end) break;
    status = mho_window_more(w, error);
  }
  if (status != MHO_OK && status != MHO_ERR_LIMIT) return status;
  if (w->at == w->end) return MHO_OK;
  row->start = w->at;
  if (status == MHO_ERR_LIMIT || row->fault) { /* the next one begins on the next line */
    row->stop = line_end(w->at, w->end);
    list->skipping = row->stop == w->end && !w->at_end;
  }
  for (const char *c = row->start; c < row->stop; c++) list->line += *c == '\n';
  list->line++;
  w->at = row->stop < w->end ? row->stop + 1 : row->stop;
  if (list->skipping)
    return fail_at(list, error, row->line, 1, "the row is longer than 1048576 bytes");
  if (status == MHO_ERR_LIMIT && !row->fault) row->fault = row->start;
  return MHO_OK;
}

static mho_status next_line(mho_list *list, mho_list_row *row, mho_error *error)
{
  for (;;) {
    text_row text;
    mho_status status = take_row(list, &text, error);
    if (status != MHO_OK || !text.start) return status;
    char *word = text.start;
    status = check_text(list, error, word, (size_t)(text.stop - word), text.line);
    if (status != MHO_OK) return status;
    trim(&word, text.stop);
    size_t size = strcspn(word, " \t");
    if (size == 0 || *word == '#' || (text.line == 1 && is_header(word, size))) continue;
    char *name = word + size;
    long column = column_at(text.start, word);
    if (*name) *name++ = '\0';
    trim(&name, name + strlen(name));
    *row = (mho_list_row){word, name, {list->file.path, text.line, column, false}};
    return MHO_OK;
  }
}

/* --- CSV ------------------------------------------------------------------ */

/* Behind the closing quote of a field that opens at `at`; NULL where it is
 * never closed. */
static char *behind_quotes(char *at, const char *end)
{
  for (at++; at < end; at++)
    if (*at == '"') {
      if (at + 1 == end || at[1] != '"') return at + 1;
      at++;
    }
  return NULL;
}

static char *find_stop(const mho_list *list, text_row *row)
{
  char *at = list->file.at, *end = list->file.end;
  row->fault = NULL;
  if (!list->separator) return line_end(at, end);
  while (at < end) {
    if (*at == '"') {
      char *open = at;
      at = behind_quotes(at, end);
      if (!at) {
        row->fault = open;
        return end;
      }
      while (at < end && (*at == ' ' || *at == '\r')) at++;
      if (at < end && *at != list->separator && *at != '\n') {
        row->fault = open;
        return at;
      }
    }
    while (at < end && *at != list->separator && *at != '\n') at++;
    if (at == end || *at == '\n') return at;
    at++;
  }
  return at;
}

/* Takes the quotes off a field in place; returns what follows it. */
static char *unquote(char *at, const char *end, csv_field *field, long *line)
{
  char *from = at + 1, *to = from, *behind = behind_quotes(at, end);
  field->text = from;
  field->column++;
  for (; from < behind - 1; from++) {
    if (*from == '"') from++;
    if (*from == '\n') ++*line;
    *to++ = *from ? *from : ' ';
  }
  *to = '\0';
  return behind;
}

/* Splits a row without fault into at most `room` fields; returns their number. */
static int split_row(const mho_list *list, const text_row *row, csv_field *field, int room)
{
  char *at = row->start;
  long line = row->line;
  for (int count = 0;; at++) {
    csv_field next = {at, line, column_at(row->start, at)};
    bool quoted = at < row->stop && *at == '"';
    if (quoted) at = unquote(at, row->stop, &next, &line);
    while (at < row->stop && *at != list->separator) at++;
    bool last = at >= row->stop;
    if (!quoted) {
      char *start = next.text;
      trim(&next.text, at);
      next.column += next.text - start;
    }
    if (count < room) field[count] = next;
    count++;
    if (last) return count;
  }
}

static mho_status next_record(mho_list *list, mho_list_row *row,
                              mho_error *error)
{
  csv_field field[COLUMN_LIMIT];
  for (;;) {
    text_row text;
    mho_status status = take_row(list, &text, error);
    if (status != MHO_OK || !text.start) return status;
    char *stop = line_end(text.start, text.stop);
    long line = text.line;
    status = check_text(list, error, text.start, (size_t)(stop - text.start), line);
    if (status != MHO_OK) return status;
    if (text.fault)
      return fail_at(list, error, line, column_at(text.start, text.fault),
                     "'\"' is never closed, or text follows the closing one");
    int count = split_row(list, &text, field, COLUMN_LIMIT);
    if (count == 1 && field[0].text[0] == '\0') continue;
    if (count != list->columns)
      return mho_fail_at(error, MHO_ERR_SYNTAX, MOLECULE_STAGE, list->file.path, line, 1,
                         NULL, "the row has %d fields, the header %d", count,
                         list->columns);
    const csv_field *smiles = &field[list->smiles_column];
    if (!smiles->text[0])
      return fail_at(list, error, smiles->line, smiles->column, "the row has no SMILES");
    const char *name = list->name_column < 0 ? "" : field[list->name_column].text;
    status = check_text(list, error, name, strlen(name), line);
    if (status != MHO_OK) return status;
    *row = (mho_list_row){smiles->text, name, {list->file.path, smiles->line, smiles->column, false}};
    return MHO_OK;
  }
}

/* The separator that the header holds most often. */
static char find_separator(const mho_list *list)
{
  static const char candidate[] = ",;\t";
  int best = 0, most = -1;
  for (int i = 0; candidate[i]; i++) {
    int count = 0;
    for (const char *c = list->file.at; c < list->file.end && *c != '\n'; c++)
      count += *c == candidate[i];
    if (count > most) {
      best = i;
      most = count;
    }
  }
  return candidate[best];
}

static int find_column(const csv_field *field, int count, const char *name)
{
  for (int i = 0; i < count; i++)
    if (!strcasecmp(field[i].text, name)) return i;
  return -1;
}

static mho_status read_header(mho_list *list, mho_error *error)
{
  static const char *const names[] = {"name", "id", "title", "molecule"};
  csv_field field[COLUMN_LIMIT];
  list->separator = find_separator(list);
  text_row text;
  mho_status status = take_row(list, &text, error);
  if (status != MHO_OK) return status;
  if (text.start && !text.fault) list->columns = split_row(list, &text, field, COLUMN_LIMIT);
  if (text.fault || list->columns > COLUMN_LIMIT)
    return fail_at(list, error, 1, 1, "the header has an open quote or more than 1000 columns");
  list->smiles_column = find_column(field, list->columns, "smiles");
  if (list->smiles_column < 0)
    return mho_fail_at(error, MHO_ERR_KEY, MOLECULE_STAGE, list->file.path, 1, 1, "smiles",
                       "the header has no column 'smiles'");
  list->name_column = -1;
  for (size_t i = 0; i < sizeof names / sizeof *names && list->name_column < 0; i++)
    list->name_column = find_column(field, list->columns, names[i]);
  return MHO_OK;
}

/* --- both ----------------------------------------------------------------- */

static bool has_extension(const char *path, const char *extension)
{
  const char *dot = strrchr(path, '.');
  return dot && !strcasecmp(dot + 1, extension);
}

mho_status mho_list_open(const char *path, mho_list **list, mho_error *error)
{
  mho_list *l = *list = calloc(1, sizeof *l);
  if (!l) return mho_fail(error, MHO_ERR_MEMORY, MOLECULE_STAGE, NULL, "out of memory");
  mho_window *w = &l->file;
  mho_status status = mho_window_open(w, path, MHO_LIST_ROW_LIMIT, MOLECULE_STAGE, error);
  if (status == MHO_OK) {
    size_t size = (size_t)(w->end - w->at);
    l->line = 1;
    if (size >= 3 && !memcmp(w->at, "\xEF\xBB\xBF", 3)) w->at += 3;
    if (size >= 2 && (!memcmp(w->at, "\xFF\xFE", 2) || !memcmp(w->at, "\xFE\xFF", 2)))
      status = fail_at(l, error, 1, 1, "the file is UTF-16; save it as UTF-8");
    else if (has_extension(path, "csv") || has_extension(path, "tsv"))
      status = read_header(l, error);
  }
  if (status != MHO_OK) {
    mho_list_close(l);
    *list = NULL;
  }
  return status;
}

void mho_list_close(mho_list *list)
{
  if (!list) return;
  mho_window_close(&list->file);
  free(list);
}

mho_status mho_list_next(mho_list *list, mho_list_row *row, mho_error *error)
{
  *row = (mho_list_row){0};
  return list->separator ? next_record(list, row, error)
                         : next_line(list, row, error);
}
