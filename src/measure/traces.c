/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The reader of traces: opens one file after the other, lets trace_text.c or
 * trace_npy.c fill the arrays, brings them to G0 and nm or s, counts what is
 * missing, censored or saturated, and hands out pieces.
 */
#include "measure/reader.h"

#include <mho/constants.h>

#include "base/processor.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>

void mho_trace_options_init(mho_trace_options *options)
{
  *options = (mho_trace_options){.quantity = MHO_TRACE_AUTO,
                                 .first_column = MHO_ABSCISSA_DISTANCE};
}

/* 1/G = V/I - R; infinite where the resistance in series is all there is. */
static double without_series(double g0, double series_ohm)
{
  double rest = 1.0 / g0 - series_ohm * MHO_CONDUCTANCE_QUANTUM_S;
  return rest > 0.0 || g0 < 0.0 ? 1.0 / rest : INFINITY;
}

static double limit_g0(const mho_trace_options *options, double g0, double ampere, double none)
{
  double limit = g0 > 0.0 ? g0 : none;
  if (!(ampere > 0.0) || options->bias_v == 0.0) return limit;
  double of_current = without_series(
      ampere / fabs(options->bias_v) / MHO_CONDUCTANCE_QUANTUM_S, options->series_ohm);
  if (none == 0.0) return fmax(limit, of_current);
  return fmin(limit, of_current);
}

double mho_trace_floor_g0(const mho_trace_options *options)
{
  return limit_g0(options, options->floor_g0, options->floor_a, 0.0);
}

double mho_trace_saturation_g0(const mho_trace_options *options)
{
  return limit_g0(options, options->saturation_g0, options->saturation_a, INFINITY);
}

static mho_status check_options(const mho_trace_options *o, mho_error *error)
{
  const struct { const char *name; double value; bool any_sign; } field[] = {
      {"bias", o->bias_v, true},          {"series", o->series_ohm, false},
      {"floor", o->floor_g0, false},      {"floor", o->floor_a, false},
      {"saturation", o->saturation_g0, false}, {"saturation", o->saturation_a, false},
      {"sampling", o->sampling_hz, false}, {"speed", o->speed_nm_per_s, false}};
  for (size_t i = 0; i < sizeof field / sizeof *field; i++)
    if (!isfinite(field[i].value) || (field[i].value < 0.0 && !field[i].any_sign))
      return mho_fail(error, MHO_ERR_RANGE, "measure", field[i].name,
                      "%s must be finite%s", field[i].name,
                      field[i].any_sign ? "" : " and not negative");
  if ((o->floor_a > 0.0 || o->saturation_a > 0.0) && o->bias_v == 0.0)
    return mho_fail(error, MHO_ERR_RANGE, "measure", "bias",
                    "a floor or saturation current needs the bias");
  if (mho_trace_floor_g0(o) >= mho_trace_saturation_g0(o))
    return mho_fail(error, MHO_ERR_RANGE, "measure", "floor",
                    "the floor lies above the saturation");
  return MHO_OK;
}

mho_status mho_trace_reader_create(const char *const *paths, size_t count,
                                   const mho_trace_options *options, mho_abscissa wanted,
                                   mho_trace_reader **result, mho_error *error)
{
  *result = NULL;
  mho_status status = check_options(options, error);
  if (status != MHO_OK) return status;
  mho_trace_reader *reader = calloc(1, sizeof *reader);
  if (!reader) return mho_fail(error, MHO_ERR_MEMORY, "measure", NULL, "out of memory");
  reader->paths = paths;
  reader->path_count = count;
  reader->options = *options;
  reader->wanted = wanted;
#ifdef MHO_HAS_NUMBER_SHAPES
  reader->shapes = __builtin_cpu_supports("x86-64-v3");
#endif
  reader->floor_g0 = mho_trace_floor_g0(options);
  reader->saturation_g0 = mho_trace_saturation_g0(options);
  status = mho_source_init(&reader->source, error);
  reader->value = malloc(MHO_TRACE_CHUNK * sizeof(double));
  reader->x = malloc(MHO_TRACE_CHUNK * sizeof(double));
  if (status == MHO_OK && (!reader->value || !reader->x))
    status = mho_fail(error, MHO_ERR_MEMORY, "measure", NULL, "out of memory");
  if (status != MHO_OK) {
    mho_trace_reader_free(reader);
    return status;
  }
  for (size_t i = 0; i < count; i++) {
    struct stat state;
    if (stat(paths[i], &state) == 0 && S_ISREG(state.st_mode))
      reader->total_bytes += (uint64_t)state.st_size;
  }
  *result = reader;
  return MHO_OK;
}

void mho_trace_reader_free(mho_trace_reader *reader)
{
  if (!reader) return;
  mho_source_clear(&reader->source);
  free(reader->value);
  free(reader->x);
  free(reader);
}

const mho_trace_report *mho_trace_reader_report(const mho_trace_reader *reader)
{
  return &reader->report;
}

/* Text has no control characters but tab, form feed and line ends. */
static mho_status check_text(mho_trace_reader *reader, mho_error *error)
{
  mho_source *source = &reader->source;
  const unsigned char *head = (const unsigned char *)source->buffer;
  size_t size = mho_source_left(source) < 4096 ? mho_source_left(source) : 4096;
  if (size == 0)
    return mho_fail_at(error, MHO_ERR_SYNTAX, "measure", source->path, 1, 1, NULL,
                       "the file is empty; a trace is needed");
  for (size_t i = 0; i < size; i++)
    if ((head[i] < ' ' && !strchr("\t\n\f\r", head[i])) || head[i] == 0)
      return mho_fail_at(error, MHO_ERR_SYNTAX, "measure", source->path, 0, 0, NULL,
                         "is a file of another kind (byte 0x%02x at %zu); text, "
                         "gzip of it or .npy are read", head[i], i);
  if (size >= 3 && memcmp(head, "\xef\xbb\xbf", 3) == 0) source->start = 3;
  return MHO_OK;
}

static void start_trace(mho_trace_reader *reader)
{
  reader->in_trace = false;
  reader->trace_point = 0;
  reader->sweep.points = 0;
  reader->text.has_number = false;
}

static mho_status check_columns(const mho_trace_reader *reader, mho_error *error)
{
  if (reader->columns.quantity == MHO_TRACE_AMPERE && reader->options.bias_v == 0.0)
    return mho_fail_at(error, MHO_ERR_KEY, "measure", reader->source.path, 0, 0, "bias",
                       "the column is a current; the bias is needed (--bias '0.1 V')");
  return MHO_OK;
}

static mho_status open_file(mho_trace_reader *reader, mho_error *error)
{
  reader->report.files++;
  reader->text = (mho_text_state){0};
  reader->points_at_open = reader->report.points;
  reader->count = 0;
  start_trace(reader);
  mho_status status =
      mho_source_open(&reader->source, reader->paths[reader->path_index], error);
  if (status != MHO_OK) return status;
  reader->open = true;
  reader->npy = mho_npy_recognise(reader);
  if (!reader->npy) return check_text(reader, error);
  status = mho_npy_start(reader, error);
  return status == MHO_OK ? check_columns(reader, error) : status;
}

static void close_file(mho_trace_reader *reader)
{
  reader->bytes_before += reader->source.taken;
  reader->report.bytes = reader->bytes_before;
  reader->source.taken = 0;
  mho_source_close(&reader->source);
  reader->open = false;
  reader->path_index++;
}

/* Raw numbers to G0. */
static void convert_values(mho_trace_reader *reader)
{
  double *g = reader->value;
  size_t n = reader->count;
  double scale = reader->columns.value_scale;
  if (reader->columns.quantity == MHO_TRACE_AMPERE)
    scale /= reader->options.bias_v * MHO_CONDUCTANCE_QUANTUM_S;
  if (reader->columns.quantity == MHO_TRACE_LOG10_G0)
    for (size_t i = 0; i < n; i++) g[i] = exp10(g[i]);
  else if (scale != 1.0)
    for (size_t i = 0; i < n; i++) g[i] *= scale;
  if (reader->options.series_ohm > 0.0)
    for (size_t i = 0; i < n; i++) g[i] = without_series(g[i], reader->options.series_ohm);
}

typedef struct {
  uint64_t missing, low, below, high;
} kinds;

FOR_EVERY_PROCESSOR
static kinds count_kinds(const double *g, size_t n, double floor_g0, double top)
{
  const double largest = 1.7976931348623157e308;
  kinds k = {0, 0, 0, 0};
  for (size_t i = 0; i < n; i++) {
    bool finite = fabs(g[i]) <= largest, over = g[i] >= top;
    k.missing += !finite & !over;
    k.low += (g[i] <= 0.0) & finite;
    k.below += (g[i] > 0.0) & (g[i] < floor_g0);
    k.high += over;
  }
  return k;
}

/* Counts points by kind; an infinite one is saturated where that is known. */
static void count_values(mho_trace_reader *reader)
{
  bool series = reader->options.series_ohm > 0.0;
  double *g = reader->value;
  kinds k = count_kinds(g, reader->count, reader->floor_g0, reader->saturation_g0);
  if (k.missing + k.high > 0)
    for (size_t i = 0; i < reader->count; i++)
      if (!isfinite(g[i])) g[i] = series && g[i] > 0.0 ? 1.7976931348623157e308 : NAN;
  reader->report.points += reader->count;
  reader->report.not_finite += k.missing;
  reader->report.not_positive += k.low;
  reader->report.below_floor += k.below;
  reader->report.saturated += k.high;
}

/* The abscissa that is wanted, or none. */
static mho_abscissa convert_abscissa(mho_trace_reader *reader)
{
  const mho_trace_options *options = &reader->options;
  mho_abscissa have = reader->columns.x >= 0 ? reader->columns.abscissa : MHO_ABSCISSA_NONE;
  double scale = reader->columns.x_scale;
  if (have == MHO_ABSCISSA_NONE && options->sampling_hz > 0.0) {
    for (size_t i = 0; i < reader->count; i++)
      reader->x[i] = (double)(reader->trace_point + i) / options->sampling_hz;
    have = MHO_ABSCISSA_TIME;
    scale = 1.0;
  }
  if (have != MHO_ABSCISSA_NONE && have != reader->wanted) {
    if (options->speed_nm_per_s == 0.0) return MHO_ABSCISSA_NONE;
    scale = have == MHO_ABSCISSA_TIME ? scale * options->speed_nm_per_s
                                      : scale / options->speed_nm_per_s;
    have = reader->wanted;
  }
  if (have != MHO_ABSCISSA_NONE && scale != 1.0)
    for (size_t i = 0; i < reader->count; i++) reader->x[i] *= scale;
  return have;
}

/* Fills a piece from the open file; chunk->count 0 and !last: nothing yet. */
static mho_status next_piece(mho_trace_reader *reader, mho_trace_chunk *chunk,
                             bool *file_done, mho_error *error)
{
  mho_fill fill;
  reader->count = 0;
  mho_status status = reader->npy ? mho_npy_fill(reader, &fill, error)
                                  : mho_text_fill(reader, &fill, error);
  if (status == MHO_OK && !reader->npy && reader->text.started)
    status = check_columns(reader, error);
  if (status != MHO_OK) return status;
  *file_done = fill == MHO_FILL_END;
  bool was_in_trace = reader->in_trace;
  *chunk = (mho_trace_chunk){.trace = reader->trace, .file = reader->path_index,
                             .first = !was_in_trace, .last = fill != MHO_FILL_FULL,
                             .count = reader->count, .g0 = reader->value};
  if (reader->count > 0) {
    convert_values(reader);
    count_values(reader);
    chunk->abscissa = convert_abscissa(reader);
    if (chunk->abscissa != MHO_ABSCISSA_NONE) chunk->x = reader->x;
  }
  reader->trace_point += reader->count;
  reader->count = 0;
  reader->in_trace = was_in_trace || chunk->count > 0;
  if (chunk->last) {
    if (reader->in_trace) reader->trace++, reader->report.traces++;
    else chunk->last = false; /* an empty line between traces */
    start_trace(reader);
  }
  return MHO_OK;
}

static bool cancelled(mho_trace_reader *reader)
{
  return reader->options.progress &&
         !reader->options.progress(reader->options.context,
                                   reader->bytes_before + reader->source.taken,
                                   reader->total_bytes);
}

/* Closes a file that failed; MHO_OK where the others are to go on. */
static mho_status give_up_file(mho_trace_reader *reader, mho_status status)
{
  reader->report.failed_files++;
  reader->report.truncated_files += reader->source.truncated;
  if (reader->in_trace || reader->count > 0) {
    reader->report.abandoned_traces++;
    reader->report.abandoned_points += reader->trace_point + reader->count;
    reader->trace++;
  }
  close_file(reader);
  start_trace(reader);
  return reader->options.keep_going && mho_status_is_input(status) ? MHO_OK : status;
}

mho_status mho_trace_reader_next(mho_trace_reader *reader, mho_trace_chunk *chunk,
                                 bool *more, mho_error *error)
{
  *more = false;
  while (reader->path_index < reader->path_count) {
    bool file_done = false;
    mho_status status = reader->open ? MHO_OK : open_file(reader, error);
    uint64_t points_before = reader->report.points;
    if (status == MHO_OK) status = next_piece(reader, chunk, &file_done, error);
    if (status == MHO_OK && file_done && reader->report.points == reader->points_at_open)
      status = mho_fail_at(error, MHO_ERR_SYNTAX, "measure", reader->source.path,
                           reader->text.line, 1, NULL, "the file holds no numbers; a trace is needed");
    if (status != MHO_OK) {
      status = give_up_file(reader, status);
      if (status != MHO_OK) return status;
      continue;
    }
    if (cancelled(reader))
      return mho_fail(error, MHO_ERR_CANCELLED, "measure", NULL, "interrupted");
    if (file_done) close_file(reader);
    if (reader->report.points > points_before || chunk->last) {
      *more = true;
      return MHO_OK;
    }
  }
  return MHO_OK;
}
