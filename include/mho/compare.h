/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Computed against measured conductance, as ratios to a reference molecule:
 * ratios hold better than absolute values in experiment and in theory.
 */
#ifndef MHOLECULE_COMPARE_H
#define MHOLECULE_COMPARE_H

#include <mho/conductance.h>
#include <mho/status.h>

typedef enum { MHO_HISTOGRAM_LOG, MHO_HISTOGRAM_LINEAR } mho_histogram_kind;

/* A peak of a measured histogram. */
typedef struct {
  int molecule; /* index */
  double peak_g0;
  bool has_spread;
  double spread_decades; /* standard deviation of log10 G */
  mho_histogram_kind histogram;
} mho_measured_peak;

typedef struct {
  bool has_computed; /* false at a node */
  double computed_log10_g0;
  bool has_error;       /* of the parameters, one sigma down and up */
  double computed_low, computed_high;
  bool has_measured;
  double measured_log10_g0; /* peak of the log histogram; mean over several */
  bool has_spread;
  double measured_low, measured_high;
  bool has_ratio; /* to the reference; needs both of both */
  double ratio_computed, ratio_measured, deviation_decades;
} mho_comparison;

typedef struct {
  int reference;           /* index of the molecule that ratios are taken to */
  int compared;            /* molecules with a ratio, the reference not counted */
  double rms_decades;      /* of their deviations */
  double largest_decades;  /* |deviation|, and the molecule it belongs to */
  int largest;
  int pairs, ordered;      /* measured pairs apart by more than their spread;
                              those that the model puts in the same order */
} mho_agreement;

MHO_BEGIN_DECLARATIONS

/* Peak of the log histogram, as log10(G/G0).  For a log-normal distribution of
 * sigma decades the linear histogram peaks lower by sigma^2 ln 10 decades (mode
 * against median); it cannot be converted without a spread. */
MHO_API double mho_peak_log10_g0(const mho_measured_peak *peak);

/* Fills comparison[count] from computed[count], the error of each log10 G (NULL, or
 * negative: not known; mho_sensitivity has it) and the peaks.
 * reference = -1 takes the first molecule with a computed and a measured value.
 * Errors: MHO_ERR_REFERENCE (no molecule, or the chosen one lacks a value). */
MHO_API MHO_MUST_USE mho_status mho_compare_ratios(
    const mho_conductance *computed, const double *error_decades, int count,
    const mho_measured_peak *peak, int peaks, int reference, mho_comparison *comparison,
    mho_agreement *agreement, mho_error *error);

MHO_END_DECLARATIONS

#endif
