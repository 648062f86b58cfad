/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * From the traces of one molecule to its measured value.
 */
#ifndef MHOLECULE_STUDY_MEASURED_H
#define MHOLECULE_STUDY_MEASURED_H

#include <mho/peaks.h>

#include "base/buffer.h"
#include "report/table.h"
#include "study/study.h"

enum { MHO_STUDY_SEED = 1 }; /* of every bootstrap of a study */

typedef struct {
  mho_peaks peaks;
  uint64_t traces, rejected;
  mho_trace_report report;
  mho_buffer figure; /* script of the histogram */
} mho_measured_traces;

/* Errors: those of the reader, MHO_ERR_CANCELLED once *cancel (may be NULL) is
 * not zero.  Clear, also after a failure. */
MHO_MUST_USE mho_status mho_measured_read(const mho_study_traces *traces,
                                          const volatile int *cancel,
                                          mho_measured_traces *measured, mho_error *error);
void mho_measured_clear(mho_measured_traces *measured);

/* The main peak as a measured value of the molecule; false without a peak. */
bool mho_measured_peak_of(const mho_study_traces *traces, const mho_measured_traces *measured,
                          mho_measured_peak *peak);

/* The peaks of all traces as a table, and what was read as remarks. */
void mho_measured_tables(const mho_study *study, const mho_measured_traces *measured,
                         mho_output *output);

/* What the traces say in one sentence, which the caller frees; NULL without
 * memory. */
char *mho_measured_sentence(const mho_study *study, const mho_study_traces *traces,
                            const mho_measured_traces *measured);

#endif
