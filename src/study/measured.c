/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "study/measured.h"

#include <math.h>

#include "base/text.h"
#include "report/figure.h"
#include "report/stages.h"

static bool keep_reading(void *context, uint64_t bytes, uint64_t total)
{
  const volatile int *cancel = context;
  (void)bytes;
  (void)total;
  return *cancel == 0;
}

mho_status mho_measured_read(const mho_study_traces *traces, const volatile int *cancel,
                             mho_measured_traces *measured, mho_error *error)
{
  *measured = (mho_measured_traces){0};
  mho_trace_options options = traces->options;
  mho_histogram_options bins;
  mho_peak_options search;
  mho_histogram_options_init(&bins);
  mho_peak_options_init(&search);
  search.seed = MHO_STUDY_SEED;
  if (cancel) {
    options.progress = keep_reading;
    options.context = (void *)(size_t)cancel;
  }
  mho_histogram *histogram = NULL;
  mho_status status = mho_histogram_read((const char *const *)traces->path, traces->paths,
                                         &options, &bins, &histogram, error);
  if (status == MHO_OK)
    status = mho_peaks_find(&histogram->accepted, &search, &measured->peaks, error);
  if (status == MHO_OK) {
    measured->report = histogram->report;
    measured->traces = histogram->all.traces;
    measured->rejected = histogram->all.traces - histogram->accepted.traces;
    mho_figure_histogram(&measured->figure, histogram, &histogram->accepted, &measured->peaks);
  }
  mho_histogram_free(histogram);
  return status;
}

void mho_measured_clear(mho_measured_traces *measured)
{
  mho_peaks_clear(&measured->peaks);
  mho_buffer_clear(&measured->figure);
}

bool mho_measured_peak_of(const mho_study_traces *traces, const mho_measured_traces *measured,
                          mho_measured_peak *peak)
{
  const mho_peak *main = mho_main_peak(&measured->peaks);
  if (!main) return false;
  *peak = (mho_measured_peak){.molecule = traces->molecule, .peak_g0 = pow(10.0, main->log10_g0),
                              .has_spread = true, .spread_decades = main->width_decades,
                              .histogram = MHO_HISTOGRAM_LOG};
  return true;
}

void mho_measured_tables(const mho_study *study, const mho_measured_traces *measured,
                         mho_output *output)
{
  mho_table *table = study->traces_count > 0 ? mho_traces_table(output) : NULL;
  for (int i = 0; i < study->traces_count; i++) {
    const mho_measured_traces *m = &measured[i];
    const char *name = study->molecule[study->traces[i].molecule].name;
    mho_traces_rows(table, name, m->traces, m->rejected, &m->peaks);
    mho_output_note(output, "traces of %s:", name);
    mho_peaks_note(output, &m->peaks);
    mho_reading_note(output, &m->report, mho_trace_floor_g0(&study->traces[i].options));
  }
}

char *mho_measured_sentence(const mho_study *study, const mho_study_traces *traces,
                            const mho_measured_traces *measured)
{
  enum { SCREEN_NAME = 80 };
  const mho_peak *peak = mho_main_peak(&measured->peaks);
  const char *name = study->molecule[traces->molecule].name;
  unsigned long long all = measured->traces, rejected = measured->rejected;
  if (!peak)
    return mho_print_text("The %llu traces of %.*s show no peak: there is no measured value.", all,
                          SCREEN_NAME, name);
  return mho_print_text("The traces of %.*s peak at %.2g G0 (95 %%: %.2g to %.2g G0) in the log "
                        "histogram; %llu of %llu show tunnelling only.%s",
                        SCREEN_NAME, name, pow(10, peak->log10_g0), pow(10, peak->low),
                        pow(10, peak->high), rejected, all,
                        peak->drift_p < 0.05 ? " The peak drifts from their first half to their "
                                               "second." : "");
}
