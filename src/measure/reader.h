/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Inside of the trace reader: traces.c opens files and converts units,
 * trace_text.c and trace_npy.c fill the two arrays with raw numbers.
 */
#ifndef MHOLECULE_MEASURE_READER_H
#define MHOLECULE_MEASURE_READER_H

#include "measure/columns.h"
#include "measure/number_shape.h"
#include "measure/source.h"

/* What ended a filling. */
typedef enum {
  MHO_FILL_FULL,  /* the arrays are full, the trace goes on */
  MHO_FILL_BREAK, /* the trace ends here */
  MHO_FILL_END    /* so does the file */
} mho_fill;

/* The abscissa so far, to see where it springs back. */
typedef struct {
  long points;
  double first, previous, low, high;
} mho_sweep;

typedef struct {
  char separator;
  long line;           /* lines used up */
  bool started;        /* the columns are known */
  bool named;          /* by a header in the file */
  double number;       /* of the trace, from its column */
  bool has_number;
  int credit; /* numbers that have the form of the one before earn it */
  mho_number_shape shape[MHO_TRACE_COLUMN_LIMIT];
} mho_text_state;

typedef struct {
  uint64_t rows, columns, element; /* element: values used up */
  bool swap, single;               /* byte order, float32 */
  bool by_row;                     /* each row is a trace */
} mho_npy_state;

struct mho_trace_reader {
  const char *const *paths;
  size_t path_count, path_index; /* the file that is open or comes next */
  mho_trace_options options;
  mho_abscissa wanted;
  double floor_g0, saturation_g0;
  mho_source source;
  bool open, npy;
  bool shapes; /* the processor reads numbers by their form */
  mho_columns columns;
  mho_sweep sweep;
  mho_text_state text;
  mho_npy_state array;
  double *value, *x; /* [MHO_TRACE_CHUNK] */
  size_t count;      /* filled */
  bool in_trace;     /* a piece of the current trace has been handed out */
  uint64_t trace, trace_point;
  uint64_t points_at_open;            /* of the report, where the file began */
  uint64_t bytes_before, total_bytes; /* of the files that are done; of all */
  mho_trace_report report;
};

MHO_MUST_USE mho_status mho_text_fill(mho_trace_reader *reader, mho_fill *fill,
                                      mho_error *error);

/* True where the open file is a .npy. */
bool mho_npy_recognise(const mho_trace_reader *reader);
MHO_MUST_USE mho_status mho_npy_start(mho_trace_reader *reader, mho_error *error);
MHO_MUST_USE mho_status mho_npy_fill(mho_trace_reader *reader, mho_fill *fill,
                                     mho_error *error);

/* Counts the point and tells whether x starts a new trace: a spring back by
 * more than half of what was covered.  Then the point is not counted. */
static inline bool mho_sweep_restarts(mho_sweep *sweep, double x)
{
  enum { POINTS_AT_LEAST = 16 };
  if (sweep->points == 0) {
    *sweep = (mho_sweep){1, x, x, x, x};
    return false;
  }
  if (sweep->points >= POINTS_AT_LEAST) {
    double back = sweep->previous >= sweep->first ? sweep->previous - x
                                                  : x - sweep->previous;
    if (back > 0.5 * (sweep->high - sweep->low)) return true;
  }
  if (x < sweep->low) sweep->low = x;
  if (x > sweep->high) sweep->high = x;
  sweep->previous = x;
  sweep->points++;
  return false;
}

#endif
