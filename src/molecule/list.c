/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "molecule/list.h"

#include <stdlib.h>
#include <string.h>
#include <strings.h>

#include "base/text.h"
#include "molecule/graph.h"

enum { COLUMN_LIMIT = 1000 };

struct mho_list {
  char *path, *text;
  char *at, *end;
  long line;
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
  return mho_fail_at(error, MHO_ERR_SYNTAX, MOLECULE_STAGE, list->path, line,
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

static mho_status next_line(mho_list *list, mho_list_row *row, mho_error *error)
{
  while (list->at < list->end) {
    char *start = list->at;
    char *end = memchr(start, '\n', (size_t)(list->end - start));
    if (!end) end = list->end;
    list->at = end < list->end ? end + 1 : end;
    long line = list->line++;
    char *word = start;
    mho_status status = check_text(list, error, start, (size_t)(end - start), line);
    if (status != MHO_OK) return status;
    trim(&word, end);
    size_t size = strcspn(word, " \t");
    if (size == 0 || *word == '#' || (line == 1 && is_header(word, size))) continue;
    char *name = word + size;
    if (*name) *name++ = '\0';
    trim(&name, name + strlen(name));
    *row = (mho_list_row){word, name, {list->path, line, column_at(start, word), false}};
    return MHO_OK;
  }
  return MHO_OK;
}

/* --- CSV ------------------------------------------------------------------ */

/* Reads a quoted field in place; *at stands on its opening quote and ends
 * behind the closing one.  False where it is never closed. */
static bool unquote(mho_list *list, char **at, csv_field *field)
{
  char *from = *at + 1, *to = from;
  field->text = from;
  field->column++;
  for (; from < list->end; from++) {
    if (*from == '"' && (from + 1 == list->end || from[1] != '"')) {
      *at = from + 1;
      *to = '\0';
      return true;
    }
    if (*from == '"') from++;
    if (*from == '\n') list->line++;
    *to++ = *from ? *from : ' ';
  }
  return false;
}

/* Splits the next row into at most `room` fields; returns their number, -1
 * where a quote is never closed or text follows it (field[0] says where). */
static int split_row(mho_list *list, csv_field *field, int room)
{
  char *at = list->at, *line_start = at;
  int count = 0;
  for (;;) {
    csv_field next = {at, list->line, column_at(line_start, at)};
    bool quoted = at < list->end && *at == '"';
    if (quoted && !unquote(list, &at, &next)) {
      list->at = list->end;
      field[0] = next;
      return -1;
    }
    char *stop = at + (quoted ? strspn(at, " \r") : 0);
    if (quoted && stop < list->end && *stop != list->separator && *stop != '\n') {
      char *rest = memchr(stop, '\n', (size_t)(list->end - stop));
      list->at = rest ? rest + 1 : list->end;
      list->line++;
      field[0] = next;
      return -1;
    }
    while (stop < list->end && *stop != list->separator && *stop != '\n') stop++;
    char ended_by = stop < list->end ? *stop : '\n';
    if (!quoted) {
      char *start = next.text;
      trim(&next.text, stop);
      next.column += next.text - start;
    }
    if (count < room) field[count] = next;
    count++;
    at = stop < list->end ? stop + 1 : stop;
    if (ended_by == '\n') break;
  }
  list->at = at;
  list->line++;
  return count;
}

static mho_status next_record(mho_list *list, mho_list_row *row,
                              mho_error *error)
{
  csv_field field[COLUMN_LIMIT];
  while (list->at < list->end) {
    char *start = list->at;
    long line = list->line;
    char *stop = memchr(start, '\n', (size_t)(list->end - start));
    mho_status status = check_text(list, error, start,
                                   (size_t)((stop ? stop : list->end) - start), line);
    if (status != MHO_OK) {
      list->at = stop ? stop + 1 : list->end;
      list->line++;
      return status;
    }
    int count = split_row(list, field, COLUMN_LIMIT);
    if (count < 0)
      return fail_at(list, error, line, field[0].column - 1,
                     "'\"' is never closed, or text follows the closing one");
    if (count == 1 && field[0].text[0] == '\0') continue;
    if (count != list->columns)
      return mho_fail_at(error, MHO_ERR_SYNTAX, MOLECULE_STAGE, list->path, line, 1,
                         NULL, "the row has %d fields, the header %d", count,
                         list->columns);
    const csv_field *smiles = &field[list->smiles_column];
    if (!smiles->text[0])
      return fail_at(list, error, smiles->line, smiles->column, "the row has no SMILES");
    const char *name = list->name_column < 0 ? "" : field[list->name_column].text;
    status = check_text(list, error, name, strlen(name), line);
    if (status != MHO_OK) return status;
    *row = (mho_list_row){smiles->text, name, {list->path, smiles->line, smiles->column, false}};
    return MHO_OK;
  }
  return MHO_OK;
}

/* The separator that the header holds most often. */
static char find_separator(const mho_list *list)
{
  static const char candidate[] = ",;\t";
  int best = 0, most = -1;
  for (int i = 0; candidate[i]; i++) {
    int count = 0;
    for (const char *c = list->at; c < list->end && *c != '\n'; c++)
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
  list->columns = list->at < list->end ? split_row(list, field, COLUMN_LIMIT) : 0;
  if (list->columns < 0 || list->columns > COLUMN_LIMIT)
    return fail_at(list, error, 1, 1, "the header has an open quote or more than 1000 columns");
  list->smiles_column = find_column(field, list->columns, "smiles");
  if (list->smiles_column < 0)
    return mho_fail_at(error, MHO_ERR_KEY, MOLECULE_STAGE, list->path, 1, 1, "smiles",
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
  size_t size;
  *list = NULL;
  mho_list *l = calloc(1, sizeof *l);
  if (!l || !(l->path = mho_copy_text(path))) {
    free(l);
    return mho_fail(error, MHO_ERR_MEMORY, MOLECULE_STAGE, NULL, "out of memory");
  }
  mho_status status = mho_read_file(path, MHO_LIST_LIMIT, MOLECULE_STAGE, &l->text, &size, error);
  if (status == MHO_OK) {
    l->at = l->text;
    l->end = l->text + size;
    l->line = 1;
    if (size >= 3 && !memcmp(l->text, "\xEF\xBB\xBF", 3)) l->at += 3;
    if (size >= 2 && (!memcmp(l->text, "\xFF\xFE", 2) || !memcmp(l->text, "\xFE\xFF", 2)))
      status = fail_at(l, error, 1, 1, "the file is UTF-16; save it as UTF-8");
    else if (has_extension(path, "csv") || has_extension(path, "tsv"))
      status = read_header(l, error);
  }
  if (status != MHO_OK) {
    mho_list_close(l);
    return status;
  }
  *list = l;
  return MHO_OK;
}

void mho_list_close(mho_list *list)
{
  if (!list) return;
  free(list->path);
  free(list->text);
  free(list);
}

mho_status mho_list_next(mho_list *list, mho_list_row *row, mho_error *error)
{
  *row = (mho_list_row){0};
  return list->separator ? next_record(list, row, error)
                         : next_line(list, row, error);
}
