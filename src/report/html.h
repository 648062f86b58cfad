/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * The report: one HTML file that opens offline, with fixed section ids
 * (question, molecules, comparison, traces, predictions, sensitivity, twist,
 * interference, transmission, currents, warnings, assumptions, limits).
 */
#ifndef MHOLECULE_REPORT_HTML_H
#define MHOLECULE_REPORT_HTML_H

#include "report/table.h"

typedef struct {
  const char *section; /* id of the section it stands in */
  char *file, *caption;
  mho_buffer svg;
  bool drawn; /* on a molecule, so shown in its own size */
} mho_figure;

/* A sentence of a section. */
typedef struct {
  const char *section;
  char *text;
} mho_remark;

/* A molecule and its drawing, an <svg> element. */
typedef struct {
  const char *name;
  mho_buffer svg;
} mho_portrait;

typedef struct {
  const char *title;
  const mho_portrait *portrait;
  size_t portraits;
  const mho_output *output;
  char *const *answer; /* sentences */
  size_t answers;
  const mho_figure *figure;
  size_t figures;
  const mho_remark *remark;
  size_t remarks;
  bool without_gnuplot;
} mho_report;

/* What the model does not know, sentence by sentence. */
const char *const *mho_limits(size_t *count);

MHO_MUST_USE mho_status mho_write_html(const mho_report *report, mho_buffer *buffer,
                                       mho_error *error);

#endif
