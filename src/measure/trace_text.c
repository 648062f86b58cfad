/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Traces in text.  A line of plain numbers goes the fast way; whatever else
 * there may be (comments, headers, `nan`, empty cells, mistakes) is looked at
 * by slow_line, which also knows the column of a mistake.
 */
#include "measure/decimal.h"
#include "measure/number_shape.h"
#include "measure/reader.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>
#include <strings.h>

typedef enum { LINE_POINT, LINE_SKIP, LINE_BREAK, LINE_HEADER, LINE_BAD } line_kind;

static inline const char *skip_blanks(const char *p, char separator)
{
  while (*p == ' ' || (*p == '\t' && separator != '\t')) p++;
  return p;
}

/* A line earns 1, a number that has another form than the one before costs 8:
 * where forms change often the general reader is the faster one. */
enum { CREDIT = 512, MOST_CREDIT = MHO_TRACE_CHUNK, CREDIT_PRICE = 8 };

/* A number by its form, or else in general, and what form it has is learned
 * where there is credit. */
typedef bool number_reader(mho_number_shape *shape, int *credit, const char *s, const char **end,
                           double *value);

INLINED bool read_any(mho_number_shape *shape, int *credit, const char *s, const char **end,
                      double *value)
{
  (void)shape;
  (void)credit;
  return mho_decimal_read(s, end, value);
}

/* Reads `count` numbers and the line end; NULL where it is not so simple. */
INLINED const char *fast_line(mho_text_state *text, number_reader *read, const char *p, int count,
                              char separator, double *field, int *credit)
{
  for (int i = 0; i < count; i++) {
    p = skip_blanks(p, separator);
    if (!read(&text->shape[i], credit, p, &p, &field[i])) return NULL;
    if (i + 1 == count) break;
    if (separator == ' ') {
      if (*p != ' ' && *p != '\t') return NULL;
    } else {
      p = skip_blanks(p, separator);
      if (*p++ != separator) return NULL;
    }
  }
  if (*p == '\n') return p + 1;
  p = skip_blanks(p, separator);
  if (*p == '\r') p++;
  return *p == '\n' ? p + 1 : NULL;
}

static bool is_missing(const char *text, size_t size)
{
  static const char *const words[] = {"nan", "inf", "infinity", "na", "null"};
  if (size == 0) return true;
  if (*text == '+' || *text == '-') text++, size--;
  for (size_t i = 0; i < sizeof words / sizeof *words; i++)
    if (size == strlen(words[i]) && !strncasecmp(text, words[i], size)) return true;
  return false;
}

/* End of the cell at p: blanks before the separator or the line end cut off;
 * *next is behind the separator, or NULL in the last cell. */
static const char *cell_end(const char *p, const char *line_end, char separator,
                            const char **next)
{
  const char *stop = p;
  while (stop < line_end && *stop != separator && !(separator == ' ' && *stop == '\t'))
    stop++;
  const char *end = stop;
  while (end > p && (end[-1] == ' ' || end[-1] == '\t' || end[-1] == '\r')) end--;
  *next = stop < line_end ? stop + 1 : NULL;
  if (separator == ' ' && *next) {
    *next = skip_blanks(*next, separator);
    if (*next >= line_end || **next == '\r') *next = NULL;
  }
  return end;
}

static int count_cells(const char *p, const char *line_end, char separator)
{
  int count = 0;
  for (const char *next = skip_blanks(p, separator); next && count <= MHO_TRACE_COLUMN_LIMIT;
       count++)
    cell_end(next, line_end, separator, &next);
  return count;
}

static mho_status bad_cell(const mho_trace_reader *reader, const char *line,
                           const char *cell, size_t size, mho_error *error)
{
  char shown[41];
  size_t length = size < sizeof shown - 1 ? size : sizeof shown - 1;
  for (size_t i = 0; i < length; i++)
    shown[i] = cell[i] >= ' ' && cell[i] < 127 ? cell[i] : '?';
  shown[length] = '\0';
  const char *hint = memchr(cell, ',', size) ? " (write a decimal point, no comma)" : "";
  return mho_fail_at(error, MHO_ERR_SYNTAX, "measure", reader->source.path,
                     reader->text.line + 1, cell - line + 1, NULL,
                     "'%s' is not a finite decimal number%s; numbers, nan, empty "
                     "cells and # comments are allowed", shown, hint);
}

/* The first line that is neither empty nor a comment: a header, or numbers. */
static mho_status start_columns(mho_trace_reader *reader, const char *line,
                                const char *line_end, line_kind *kind, mho_error *error)
{
  mho_text_state *text = &reader->text;
  const char *path = reader->source.path, *named = reader->options.columns, *next;
  text->separator = mho_columns_separator(line, (size_t)(line_end - line));
  const char *first = skip_blanks(line, text->separator);
  size_t size = (size_t)(cell_end(first, line_end, text->separator, &next) - first);
  double number;
  const char *stop;
  bool is_header = !is_missing(first, size) && !mho_decimal_read(first, &stop, &number);
  if (is_header && !(*first >= 'A' && *first <= 'Z') && !(*first >= 'a' && *first <= 'z'))
    return bad_cell(reader, line, first, size, error);
  text->started = true;
  text->named = is_header && !named;
  *kind = is_header ? LINE_HEADER : LINE_POINT;
  if (text->named)
    return mho_columns_named(&reader->columns, line, (size_t)(line_end - line),
                             text->separator, reader->wanted, path, text->line + 1, error);
  int count = count_cells(line, line_end, text->separator);
  if (count > MHO_TRACE_COLUMN_LIMIT)
    return mho_fail_at(error, MHO_ERR_LIMIT, "measure", path, text->line + 1, 1, NULL,
                       "more than %d columns; a line is one point of one trace",
                       MHO_TRACE_COLUMN_LIMIT);
  if (!named)
    return mho_columns_guess(&reader->columns, count, &reader->options, path,
                             text->line + 1, error);
  mho_status status = mho_columns_named(&reader->columns, named, strlen(named),
                                        mho_columns_separator(named, strlen(named)),
                                        reader->wanted, "--columns", 0, error);
  if (status == MHO_OK && reader->columns.count != count)
    return mho_fail_at(error, MHO_ERR_KEY, "measure", path, text->line + 1, 1, NULL,
                       "%d columns, but --columns names %d", count, reader->columns.count);
  return status;
}

/* A comment may hold the header: `# distance_nm conductance_G0`. */
static void try_comment_header(mho_trace_reader *reader, const char *p, const char *line_end)
{
  if (reader->text.started || reader->options.columns) return;
  while (p < line_end && (*p == '#' || *p == '%' || *p == ' ' || *p == '\t')) p++;
  while (line_end > p && (line_end[-1] == '\r' || line_end[-1] == ' ')) line_end--;
  char separator = mho_columns_separator(p, (size_t)(line_end - p));
  mho_columns columns;
  if (mho_columns_named(&columns, p, (size_t)(line_end - p), separator, reader->wanted,
                        reader->source.path, 0, NULL) != MHO_OK)
    return;
  reader->columns = columns;
  reader->text.named = true;
}

/* Cells that may be missing; the caller knows the number of columns. */
static mho_status slow_cells(mho_trace_reader *reader, const char *line,
                             const char *line_end, double *field, mho_error *error)
{
  char separator = reader->text.separator;
  int count = 0;
  for (const char *p = skip_blanks(line, separator), *next; p; p = next) {
    p = skip_blanks(p, separator);
    if (p > line_end) p = line_end;
    const char *end = cell_end(p, line_end, separator, &next), *stop;
    if (count >= reader->columns.count) {
      count = count_cells(line, line_end, separator);
      break;
    }
    bool skipped = count != reader->columns.value && count != reader->columns.x &&
                   count != reader->columns.number;
    if (end < p) end = p;
    size_t size = (size_t)(end - p);
    if (skipped || is_missing(p, size)) field[count] = NAN;
    else if (!mho_decimal_read(p, &stop, &field[count]) || stop != end)
      return bad_cell(reader, line, p, size, error);
    count++;
  }
  if (count == reader->columns.count) return MHO_OK;
  return mho_fail_at(error, MHO_ERR_SYNTAX, "measure", reader->source.path,
                     reader->text.line + 1, 1, NULL,
                     "%s%d columns; %d are needed, as in the lines before",
                     count > MHO_TRACE_COLUMN_LIMIT ? "more than " : "",
                     count > MHO_TRACE_COLUMN_LIMIT ? MHO_TRACE_COLUMN_LIMIT : count,
                     reader->columns.count);
}

static mho_status slow_line(mho_trace_reader *reader, const char *line,
                            const char *line_end, double *field, line_kind *kind,
                            mho_error *error)
{
  mho_text_state *text = &reader->text;
  const char *p = line;
  while (p < line_end && (*p == ' ' || *p == '\t' || *p == '\r')) p++;
  *kind = LINE_BREAK;
  if (p == line_end) return MHO_OK;
  *kind = LINE_SKIP;
  if (*p == '#' || *p == '%') {
    try_comment_header(reader, p, line_end);
    return MHO_OK;
  }
  const char *end = line_end;
  while (end > line && end[-1] == '\r') end--;
  if (!text->started) {
    mho_columns commented = reader->columns;
    bool has_comment = text->named;
    mho_status status = start_columns(reader, line, end, kind,
                                      has_comment ? NULL : error);
    if (has_comment && (status != MHO_OK || *kind == LINE_POINT)) {
      reader->columns = commented; /* what the comment says, or the failure */
      text->named = text->started = true;
      *kind = LINE_POINT;
    } else if (status != MHO_OK) {
      return status;
    }
    if (*kind == LINE_HEADER) return MHO_OK;
  } else if ((*p >= 'a' && *p <= 'z') || (*p >= 'A' && *p <= 'Z')) {
    mho_columns repeated;
    if (mho_columns_named(&repeated, line, (size_t)(end - line), text->separator,
                          reader->wanted, reader->source.path, 0, NULL) == MHO_OK &&
        repeated.count == reader->columns.count) {
      reader->columns = repeated;
      *kind = LINE_HEADER;
      return MHO_OK;
    }
  }
  *kind = LINE_POINT;
  return slow_cells(reader, line, end, field, error);
}

static inline bool number_changes(mho_trace_reader *reader, const double *field)
{
  mho_text_state *text = &reader->text;
  double number = field[reader->columns.number];
  if (text->has_number && number != text->number) return true;
  text->number = number;
  text->has_number = true;
  return false;
}

/* True where the point belongs to the next trace. */
static inline bool starts_trace(mho_trace_reader *reader, const double *field)
{
  if (reader->columns.number >= 0) return number_changes(reader, field);
  return reader->columns.x >= 0 &&
         mho_sweep_restarts(&reader->sweep, field[reader->columns.x]);
}

static inline bool store_point(mho_trace_reader *reader, const double *field)
{
  if (starts_trace(reader, field)) return false;
  reader->value[reader->count] = field[reader->columns.value];
  if (reader->columns.x >= 0) reader->x[reader->count] = field[reader->columns.x];
  reader->count++;
  return true;
}

/* Fast lines up to the first that is not, or the end of the whole lines, or of
 * the credit.  What changes with every point is kept out of memory. */
INLINED const char *fast_lines(mho_trace_reader *reader, number_reader *read, const char *p,
                               const char *limit, int count, char separator, bool *restart)
{
  double field[MHO_TRACE_COLUMN_LIMIT], *value = reader->value, *x = reader->x;
  const int value_at = reader->columns.value, x_at = reader->columns.x;
  bool has_number = reader->columns.number >= 0;
  mho_sweep sweep = reader->sweep;
  int credit = reader->text.credit;
  size_t n = reader->count, start = n;
  while (p < limit && n < MHO_TRACE_CHUNK && credit > 0) {
    const char *next = fast_line(&reader->text, read, p, count, separator, field, &credit);
    if (!next) break;
    if (has_number ? number_changes(reader, field)
                   : x_at >= 0 && mho_sweep_restarts(&sweep, field[x_at])) {
      *restart = true;
      break;
    }
    value[n] = field[value_at];
    if (x_at >= 0) x[n] = field[x_at];
    p = next;
    n++;
  }
  reader->sweep = sweep;
  reader->text.line += (long)(n - start);
  reader->text.credit = credit;
  reader->count = n;
  return p;
}

INLINED const char *fast_columns(mho_trace_reader *reader, number_reader *read, const char *p,
                                 const char *limit, bool *restart)
{
  char separator = reader->text.separator;
  switch (reader->columns.count) {
  case 1: return fast_lines(reader, read, p, limit, 1, separator, restart);
  case 2:
    if (separator == ' ') return fast_lines(reader, read, p, limit, 2, ' ', restart);
    return fast_lines(reader, read, p, limit, 2, separator, restart);
  default: return fast_lines(reader, read, p, limit, reader->columns.count, separator, restart);
  }
}

#ifdef MHO_HAS_NUMBER_SHAPES
MHO_SHAPE_PROCESSOR INLINED bool read_shaped(mho_number_shape *shape, int *credit, const char *s,
                                             const char **end, double *value)
{
  const char *start = s;
  if (mho_shape_read(shape, s, end, value)) return true;
  if (!mho_decimal_read(s, end, value)) return false;
  mho_shape_learn(shape, start, *end);
  *credit -= CREDIT_PRICE;
  return true;
}

MHO_SHAPE_PROCESSOR static const char *run_shaped(mho_trace_reader *reader, const char *p,
                                                  const char *limit, bool *restart)
{
  size_t before = reader->count;
  p = fast_columns(reader, read_shaped, p, limit, restart);
  int credit = reader->text.credit + (int)(reader->count - before);
  if (reader->text.credit > 0)
    reader->text.credit = credit < MOST_CREDIT ? credit : MOST_CREDIT;
  return p;
}
#endif

static const char *run_fast(mho_trace_reader *reader, const char *p, const char *limit,
                            bool *restart)
{
#ifdef MHO_HAS_NUMBER_SHAPES
  if (reader->shapes && reader->text.credit > 0) return run_shaped(reader, p, limit, restart);
#endif
  reader->text.credit = CREDIT;
  return fast_columns(reader, read_any, p, limit, restart);
}

/* Makes at least one whole line available, or finds the file used up. */
static mho_status whole_lines(mho_trace_reader *reader, const char **limit, mho_error *error)
{
  mho_source *source = &reader->source;
  for (;;) {
    size_t left = mho_source_left(source);
    char *start = source->buffer + source->start;
    char *last = left ? memrchr(start, '\n', left) : NULL;
    if (!last && source->finished && left) {
      source->buffer[source->end++] = '\n'; /* the last line lacks it */
      last = source->buffer + source->end - 1;
    }
    *limit = last ? last + 1 : start;
    if (last || (source->finished && !left)) return MHO_OK;
    if (left == MHO_SOURCE_SIZE)
      return mho_fail_at(error, MHO_ERR_LIMIT, "measure", source->path,
                         reader->text.line + 1, 1, NULL,
                         "a line of more than %d bytes; a line is one point of "
                         "one trace", MHO_SOURCE_SIZE);
    mho_status status = mho_source_refill(source, error);
    if (status != MHO_OK) return status;
  }
}

mho_status mho_text_fill(mho_trace_reader *reader, mho_fill *fill, mho_error *error)
{
  mho_source *source = &reader->source;
  for (;;) {
    const char *limit;
    mho_status status = whole_lines(reader, &limit, error);
    if (status != MHO_OK) return status;
    const char *p = source->buffer + source->start;
    *fill = MHO_FILL_END;
    if (p == limit) return MHO_OK;
    bool restart = false;
    while (p < limit && !restart && reader->count < MHO_TRACE_CHUNK) {
      if (reader->text.started) p = run_fast(reader, p, limit, &restart);
      if (restart || p == limit || reader->count == MHO_TRACE_CHUNK) break;
      const char *line_end = memchr(p, '\n', (size_t)(limit - p));
      double field[MHO_TRACE_COLUMN_LIMIT];
      line_kind kind;
      status = slow_line(reader, p, line_end, field, &kind, error);
      if (status != MHO_OK) return status;
      if (kind == LINE_POINT && !store_point(reader, field)) {
        restart = true;
        break;
      }
      p = line_end + 1;
      reader->text.line++;
      if (kind == LINE_BREAK || kind == LINE_HEADER) restart = true;
    }
    source->start = (size_t)(p - source->buffer);
    *fill = restart ? MHO_FILL_BREAK : MHO_FILL_FULL;
    if (restart || reader->count == MHO_TRACE_CHUNK) return MHO_OK;
  }
}
