/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Measured traces: conductance against distance or time, read as a stream.
 *
 * Text (comma, semicolon, tab or blanks; `#` and `%` start comment lines; a
 * header may name the columns), the same compressed with gzip, and NumPy's
 * .npy with float32 or float64.  Memory does not grow with the data.
 *
 * Columns are named quantity_unit: `distance_nm`, `time_s`,
 * `conductance_G0`, `conductance_S`, `log10_G0`, `current_A`, also with
 * another unit of the same dimension (`current_nA`, `time_ms`), and `trace`
 * for the number of the trace.  Others are skipped.  Without a header one
 * column is the measured quantity, and of two the first is the abscissa.
 *
 * A new trace starts with every file, at blank lines, at a repeated header,
 * where the number in the column `trace` changes, and where the abscissa
 * springs back by more than half of what the trace has covered (from its
 * 16th point on).  A .npy array of shape (n) is one trace, (n, 2) abscissa
 * and quantity, any other (n, m) one trace a row.
 */
#ifndef MHOLECULE_TRACES_H
#define MHOLECULE_TRACES_H

#include <stdint.h>

#include <mho/status.h>

enum { MHO_TRACE_CHUNK = 16384, MHO_TRACE_COLUMN_LIMIT = 64 };

typedef enum {
  MHO_TRACE_AUTO, /* current if there is a bias, else conductance in G0 */
  MHO_TRACE_G0,
  MHO_TRACE_SIEMENS,
  MHO_TRACE_LOG10_G0,
  MHO_TRACE_AMPERE
} mho_trace_quantity;

typedef enum {
  MHO_ABSCISSA_NONE,
  MHO_ABSCISSA_DISTANCE, /* nm */
  MHO_ABSCISSA_TIME      /* s */
} mho_abscissa;

typedef struct {
  mho_trace_quantity quantity;  /* of a column that no header names */
  mho_abscissa first_column;    /* of two columns without a header */
  const char *columns;          /* names as a header has them, or NULL */
  double bias_v;                /* 0: none; a current needs one */
  double series_ohm;            /* taken off: 1/G - R */
  double floor_g0, floor_a;     /* below it a point is censored; 0: none */
  double saturation_g0, saturation_a; /* at or above: saturated; 0: none */
  double sampling_hz;           /* makes a time where no column has it; 0 */
  double speed_nm_per_s;        /* makes a distance of a time; 0 */
  bool rows_are_traces;         /* .npy: whatever the number of columns */
  bool keep_going;              /* a bad file does not end the reading */
  /* Called as bytes arrive; false ends the reading (MHO_ERR_CANCELLED). */
  bool (*progress)(void *context, uint64_t bytes, uint64_t total_bytes);
  void *context;
} mho_trace_options;

/* What was read; no point is dropped without being counted here. */
typedef struct {
  uint64_t files, failed_files, truncated_files;
  uint64_t traces;
  uint64_t abandoned_traces; /* left unfinished by a failed file, */
  uint64_t abandoned_points; /* with what was read of them */
  uint64_t points;           /* all; of them: */
  uint64_t not_finite;       /* nan, inf or an empty cell */
  uint64_t not_positive;     /* zero or negative: censored where a floor is */
  uint64_t below_floor;      /* positive, censored */
  uint64_t saturated;
  uint64_t bytes;
} mho_trace_report;

/* A piece of one trace, valid until the next call. */
typedef struct {
  uint64_t trace; /* from 0, over all files */
  size_t file;    /* index of the path */
  bool first, last;
  size_t count;         /* may be 0 in the last piece */
  const double *g0;     /* [count], NaN where there is no finite number */
  const double *x;      /* [count], or NULL without an abscissa */
  mho_abscissa abscissa;
} mho_trace_chunk;

typedef struct mho_trace_reader mho_trace_reader;

MHO_BEGIN_DECLARATIONS

MHO_API void mho_trace_options_init(mho_trace_options *options);

/* Floor and saturation in G0 (0 and infinity where there is none), after
 * the bias and the series resistance. */
MHO_API double mho_trace_floor_g0(const mho_trace_options *options);
MHO_API double mho_trace_saturation_g0(const mho_trace_options *options);

/* Opens the files one after the other; `wanted` says which abscissa the
 * chunks carry.  paths must outlive the reader.
 * Errors: MHO_ERR_RANGE (an option), MHO_ERR_KEY (columns), MHO_ERR_MEMORY. */
MHO_API MHO_MUST_USE mho_status mho_trace_reader_create(
    const char *const *paths, size_t count, const mho_trace_options *options,
    mho_abscissa wanted, mho_trace_reader **reader, mho_error *error);
MHO_API void mho_trace_reader_free(mho_trace_reader *reader);

/* The next piece; *more is false at the end.  A trace whose file fails never
 * gets its last piece, and the next one starts with `first`.
 * Errors: MHO_ERR_FILE, MHO_ERR_SYNTAX, MHO_ERR_KEY, MHO_ERR_UNIT,
 * MHO_ERR_LIMIT at file, line and column; MHO_ERR_CANCELLED. */
MHO_API MHO_MUST_USE mho_status mho_trace_reader_next(mho_trace_reader *reader,
                                                      mho_trace_chunk *chunk,
                                                      bool *more,
                                                      mho_error *error);

MHO_API const mho_trace_report *
mho_trace_reader_report(const mho_trace_reader *reader);

MHO_END_DECLARATIONS

#endif
