/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * NumPy's array format, versions 1 to 3: magic, two bytes of version, length
 * of the header, a Python dictionary in ASCII, then the values (NumPy
 * Enhancement Proposal 1, numpy.lib.format).
 */
#include "measure/reader.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static const char magic[6] = "\x93NUMPY";
enum { HEADER_LIMIT = 65536 };

bool mho_npy_recognise(const mho_trace_reader *reader)
{
  return mho_source_left(&reader->source) >= sizeof magic &&
         memcmp(reader->source.buffer + reader->source.start, magic, sizeof magic) == 0;
}

static mho_status bad(const mho_trace_reader *reader, mho_error *error, const char *what)
{
  return mho_fail_at(error, MHO_ERR_SYNTAX, "measure", reader->source.path, 0, 0, NULL,
                     "%s; a .npy array of float32 or float64 in C order, of "
                     "shape (n) or (n, m), is needed", what);
}

/* Value of a key of the dictionary, behind its colon, or NULL. */
static const char *find_key(const char *header, const char *key)
{
  const char *at = strstr(header, key);
  if (!at) return NULL;
  at += strlen(key);
  return *at == ':' ? at + 1 + strspn(at + 1, " ") : NULL;
}

static bool read_shape(const char *text, uint64_t *shape, int *dimensions)
{
  if (!text || *text++ != '(') return false;
  for (*dimensions = 0;; ++*dimensions) {
    text += strspn(text, " ,");
    if (*text == ')') return *dimensions > 0;
    if (*dimensions == 2 || *text < '0' || *text > '9') return false;
    uint64_t length = 0;
    for (; *text >= '0' && *text <= '9'; text++) {
      if (length > UINT64_MAX / 1000) return false;
      length = length * 10 + (uint64_t)(*text - '0');
    }
    shape[*dimensions] = length;
  }
}

static mho_status read_header(mho_trace_reader *reader, const char *header, mho_error *error)
{
  mho_npy_state *array = &reader->array;
  const char *kind = find_key(header, "'descr'");
  if (!kind || *kind != '\'' || (kind[1] != '<' && kind[1] != '>') || kind[2] != 'f' ||
      (kind[3] != '4' && kind[3] != '8') || kind[4] != '\'')
    return bad(reader, error, "the values are not of the kind f4 or f8 (array.astype(float) is)");
  const char *order = find_key(header, "'fortran_order'");
  if (!order) return bad(reader, error, "the header does not name the order");
  uint64_t shape[2] = {0, 1};
  int dimensions;
  if (!read_shape(find_key(header, "'shape'"), shape, &dimensions))
    return bad(reader, error, "the shape does not have one or two dimensions");
  if (strncmp(order, "False", 5) != 0 && dimensions == 2 && shape[0] > 1 && shape[1] > 1)
    return bad(reader, error, "the array is in Fortran order (numpy.ascontiguousarray(array) is not)");
  if (shape[1] > 0 && shape[0] > UINT64_MAX / 16 / shape[1])
    return bad(reader, error, "the shape is too large");
  array->swap = kind[1] == (__BYTE_ORDER__ == __ORDER_LITTLE_ENDIAN__ ? '>' : '<');
  array->single = kind[3] == '4';
  array->rows = shape[0];
  array->columns = shape[1];
  array->by_row = dimensions == 2 && (reader->options.rows_are_traces || shape[1] > 2);
  if (array->by_row && shape[0] == 2 && !reader->options.rows_are_traces)
    return bad(reader, error, "two rows could be two traces or abscissa and values: "
                              "save the transpose, or say that rows are traces");
  return MHO_OK;
}

/* Columns of the array, or one column where a row is a trace. */
static mho_status choose_columns(mho_trace_reader *reader, mho_error *error)
{
  mho_npy_state *array = &reader->array;
  const char *named = reader->options.columns;
  if (!named || reader->options.rows_are_traces)
    return mho_columns_guess(&reader->columns, array->by_row ? 1 : (int)array->columns,
                             &reader->options, reader->source.path, 0, error);
  mho_status status = mho_columns_named(&reader->columns, named, strlen(named),
                                        mho_columns_separator(named, strlen(named)),
                                        reader->wanted, "--columns", 0, error);
  if (status != MHO_OK) return status;
  if ((uint64_t)reader->columns.count != array->columns)
    return mho_fail_at(error, MHO_ERR_KEY, "measure", reader->source.path, 0, 0, NULL,
                       "the array has %llu columns, but --columns names %d",
                       (unsigned long long)array->columns, reader->columns.count);
  array->by_row = false;
  return MHO_OK;
}

mho_status mho_npy_start(mho_trace_reader *reader, mho_error *error)
{
  mho_source *source = &reader->source;
  const unsigned char *head = (const unsigned char *)source->buffer;
  bool is_short = head[6] == 1;
  size_t offset = is_short ? 10 : 12;
  if (mho_source_left(source) < offset || head[6] < 1 || head[6] > 3)
    return bad(reader, error, "an unknown version of .npy");
  size_t length = head[8] | (size_t)head[9] << 8;
  if (!is_short) length |= (size_t)head[10] << 16 | (size_t)head[11] << 24;
  if (length > HEADER_LIMIT || offset + length > mho_source_left(source))
    return bad(reader, error, "the header is cut off");
  char *header = source->buffer + offset, kept = header[length];
  header[length] = '\0';
  mho_status status = read_header(reader, header, error);
  header[length] = kept;
  if (status != MHO_OK) return status;
  source->start = offset + length;
  reader->array.element = 0;
  return choose_columns(reader, error);
}

static double value_at(const mho_npy_state *array, const char *bytes)
{
  if (array->single) {
    uint32_t word;
    memcpy(&word, bytes, sizeof word);
    if (array->swap) word = __builtin_bswap32(word);
    float value;
    memcpy(&value, &word, sizeof value);
    return value;
  }
  uint64_t word;
  memcpy(&word, bytes, sizeof word);
  if (array->swap) word = __builtin_bswap64(word);
  double value;
  memcpy(&value, &word, sizeof value);
  return value;
}

/* Values of one column: nothing to pick, no abscissa. */
static void take_plain(mho_trace_reader *reader, const char *bytes, size_t count)
{
  double *to = reader->value + reader->count;
  if (!reader->array.single && !reader->array.swap)
    memcpy(to, bytes, count * sizeof *to);
  else
    for (size_t i = 0; i < count; i++)
      to[i] = value_at(&reader->array, bytes + i * (reader->array.single ? 4 : 8));
  reader->count += count;
}

/* One row; false where it belongs to the next trace. */
static bool take_row(mho_trace_reader *reader, const char *bytes, size_t size)
{
  const mho_columns *columns = &reader->columns;
  double number = columns->number < 0 ? 0.0
                                      : value_at(&reader->array, bytes + (size_t)columns->number * size);
  if (columns->number >= 0) {
    if (reader->text.has_number && number != reader->text.number) return false;
    reader->text.number = number;
    reader->text.has_number = true;
  }
  if (columns->x >= 0) {
    double x = value_at(&reader->array, bytes + (size_t)columns->x * size);
    if (columns->number < 0 && mho_sweep_restarts(&reader->sweep, x)) return false;
    reader->x[reader->count] = x;
  }
  reader->value[reader->count++] =
      value_at(&reader->array, bytes + (size_t)columns->value * size);
  return true;
}

mho_status mho_npy_fill(mho_trace_reader *reader, mho_fill *fill, mho_error *error)
{
  mho_npy_state *array = &reader->array;
  mho_source *source = &reader->source;
  size_t size = array->single ? 4 : 8;
  bool plain = array->by_row || array->columns <= 1;
  size_t row = plain ? 1 : (size_t)array->columns; /* values that belong together */
  uint64_t total = array->rows * array->columns;
  while (reader->count < MHO_TRACE_CHUNK) {
    *fill = MHO_FILL_END;
    if (array->element == total) return MHO_OK;
    if (mho_source_left(source) < row * size) {
      mho_status status = mho_source_refill(source, error);
      if (status != MHO_OK) return status;
      if (mho_source_left(source) < row * size) {
        reader->source.truncated = true;
        return bad(reader, error, "the array is cut off");
      }
    }
    const char *bytes = source->buffer + source->start;
    size_t rows = mho_source_left(source) / (row * size);
    if (rows > MHO_TRACE_CHUNK - reader->count) rows = MHO_TRACE_CHUNK - reader->count;
    if (rows > (total - array->element) / row) rows = (size_t)((total - array->element) / row);
    *fill = MHO_FILL_BREAK;
    if (plain) {
      uint64_t left = array->by_row ? array->columns - array->element % array->columns : rows;
      if (rows > left) rows = (size_t)left;
      take_plain(reader, bytes, rows);
    } else {
      size_t taken = 0;
      while (taken < rows && take_row(reader, bytes + taken * row * size, size)) taken++;
      if (taken < rows) {
        source->start += taken * row * size;
        array->element += taken * row;
        return MHO_OK;
      }
    }
    source->start += rows * row * size;
    array->element += rows * row;
    if (array->by_row && array->element % array->columns == 0) return MHO_OK;
  }
  *fill = MHO_FILL_FULL;
  return MHO_OK;
}
