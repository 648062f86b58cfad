/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Figures as gnuplot scripts, and gnuplot itself, which is run if it is there.
 * Our style: one neutral ink for axes, four inks of different lightness with a
 * dash pattern each, so that a figure reads in grey print and without colour
 * vision; computed values are filled circles, measured ones open diamonds.
 */
#ifndef MHOLECULE_REPORT_FIGURE_H
#define MHOLECULE_REPORT_FIGURE_H

#include <mho/compare.h>
#include <mho/interference.h>
#include <mho/nodes.h>
#include <mho/peaks.h>
#include <mho/telegraph.h>
#include <mho/transmission.h>

#include "base/buffer.h"
#include "report/table.h"

enum { MHO_CURVES_MAX = 4 };

typedef struct {
  const char *name;
  size_t count;
  const double *energy_ev; /* above the Fermi level */
  const mho_point *point;
  bool has_measured;
  double measured_log10_g0, measured_low, measured_high;
  size_t nodes; /* energies above the Fermi level where T vanishes */
  const double *node_ev;
} mho_curve;

/* Energies of the exact nodes of a plan above the Fermi level, for a curve, none
 * for more than 120 sites; the caller frees them.  Errors: those of mho_nodes_find. */
MHO_MUST_USE mho_status mho_figure_nodes(const mho_plan *plan, double fermi_ev, double **node_ev,
                                         size_t *nodes, mho_error *error);

/* Scripts that write an SVG to standard output. */
void mho_figure_transmission(mho_buffer *script, const mho_curve *curve, int curves,
                             double window_ev);
void mho_figure_comparison(mho_buffer *script, const char *const *molecule, const mho_comparison *comparison,
                           int count);

/* Of measured traces: the histogram of `counts` with what was fitted; the 2D
 * histogram with the peaks as lines; the comb on the linear density of the same
 * counts; survival of whole dwells with their exponentials. */
void mho_figure_histogram(mho_buffer *script, const mho_histogram *histogram,
                          const mho_trace_counts *counts, const mho_peaks *peaks);
void mho_figure_map(mho_buffer *script, const mho_histogram *histogram, const mho_peaks *peaks);
void mho_figure_comb(mho_buffer *script, const mho_histogram *histogram,
                     const mho_trace_counts *counts, const mho_comb *comb);
void mho_figure_linear(mho_buffer *script, const mho_histogram *histogram);
void mho_figure_plateaus(mho_buffer *script, const mho_histogram *histogram);
void mho_figure_dwells(mho_buffer *script, const mho_telegraph *telegraph);

/* Conductance against angle, up to MHO_CURVES_MAX molecules of the table from
 * the one counted `first` on; returns how many.  The map of one molecule (NULL:
 * the table has no other); the matrix of its pairs. */
int mho_figure_twist(mho_buffer *script, const mho_table *table, int first);
void mho_figure_twist_map(mho_buffer *script, const mho_table *table, const char *molecule);
void mho_figure_pairs(mho_buffer *script, const mho_molecule *molecule,
                      const mho_interference *map);

/* Runs gnuplot on a script file, its output into svg_path.  *available is false, and the status MHO_OK,
 * where there is no gnuplot.  Errors: MHO_ERR_WRITE. */
MHO_MUST_USE mho_status mho_figure_render(const char *script_path, const char *svg_path,
                                          bool *available, mho_error *error);

#endif
