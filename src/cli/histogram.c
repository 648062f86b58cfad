/* SPDX-License-Identifier: GPL-3.0-or-later */
#include <math.h>
#include <stdio.h>

#include "cli/command.h"
#include "report/figure.h"
#include "report/stages.h"

/* What was found in a histogram; only what is asked for is filled. */
typedef struct {
  mho_histogram *histogram;
  const mho_trace_counts *counts;
  mho_peaks peaks, unrejected;
  bool has_peaks, has_unrejected;
  char no_peaks[512]; /* why none were looked for, or empty */
  mho_comb comb;
  mho_clusters clusters;
} findings;

static mho_status find_peaks(const command *cmd, findings *f, bool remarks, mho_error *error)
{
  const measured_options *m = &cmd->measured;
  mho_peak_options options;
  mho_peak_options_init(&options);
  options.seed = cmd->seed;
  if (m->has_search) {
    options.low_log10_g0 = log10(m->search_low_g0);
    options.high_log10_g0 = log10(m->search_high_g0);
  }
  f->has_peaks = true;
  mho_status status = mho_peaks_find(f->counts, &options, &f->peaks, error);
  if (status != MHO_OK || !remarks || f->counts->traces == f->histogram->all.traces) return status;
  f->has_unrejected = true;
  return mho_peaks_find(&f->histogram->all, &options, &f->unrejected, error);
}

/* Peaks beside another table: too few bins for a fit are no mistake there. */
static mho_status find_peaks_beside(const command *cmd, findings *f, bool remarks,
                                    mho_error *error)
{
  mho_error own;
  mho_error_init(&own);
  mho_status status = find_peaks(cmd, f, remarks, &own);
  if (status != MHO_ERR_RANGE)
    return status == MHO_OK ? MHO_OK : mho_fail(error, status, "cli", NULL, "%s", own.cause[0].message);
  f->has_peaks = false;
  snprintf(f->no_peaks, sizeof f->no_peaks, "%s", own.cause[0].message);
  return MHO_OK;
}

static mho_status find_comb(const command *cmd, findings *f, mho_error *error)
{
  const measured_options *m = &cmd->measured;
  mho_comb_options options;
  mho_comb_options_init(&options);
  options.seed = cmd->seed;
  if (m->has_search) {
    options.low_g0 = m->search_low_g0;
    options.high_g0 = m->search_high_g0;
  }
  return mho_comb_find(f->counts, &options, &f->comb, error);
}

static mho_status find_clusters(const command *cmd, findings *f, mho_error *error)
{
  const measured_options *m = &cmd->measured;
  const mho_histogram_options *o = &f->histogram->options;
  if (f->histogram->samples == 0) return MHO_OK;
  double low = fmax(f->counts->floor_log10_g0, o->low_log10_g0), high = fmin(-0.45, o->high_log10_g0);
  if (m->has_search) {
    low = log10(m->search_low_g0);
    high = log10(m->search_high_g0);
  }
  return mho_clusters_find(f->histogram, low, high, cmd->seed, &f->clusters, error);
}

static mho_status analyse(const command *cmd, findings *f, mho_error *error)
{
  const measured_options *m = &cmd->measured;
  bool remarks = !cmd->quiet && format_of(cmd) != FORMAT_CSV;
  switch (m->table) {
  case MEASURED_DEFAULT:
  case MEASURED_MAP:
    return remarks || m->figure ? find_peaks_beside(cmd, f, remarks, error) : MHO_OK;
  case MEASURED_PEAKS: return find_peaks(cmd, f, remarks, error);
  case MEASURED_COMB: return find_comb(cmd, f, error);
  case MEASURED_CLUSTERS: return find_clusters(cmd, f, error);
  default: return MHO_OK;
  }
}

static void add_table(const command *cmd, const findings *f, mho_output *output)
{
  switch (cmd->measured.table) {
  case MEASURED_MAP: mho_map_rows(output, f->histogram); break;
  case MEASURED_PEAKS: mho_peak_rows(output, &f->peaks); break;
  case MEASURED_COMB: mho_comb_rows(output, &f->comb); break;
  case MEASURED_PLATEAUS: mho_plateau_rows(output, f->histogram); break;
  case MEASURED_LINEAR: mho_linear_rows(output, f->histogram); break;
  case MEASURED_CLUSTERS: mho_cluster_rows(output, &f->clusters); break;
  case MEASURED_CORRELATION: mho_correlation_rows(output, f->histogram); break;
  default: mho_histogram_rows(output, f->histogram, f->counts); break;
  }
}

static void add_remarks(const command *cmd, const findings *f, mho_output *output)
{
  const measured_options *m = &cmd->measured;
  const mho_histogram *h = f->histogram;
  if (f->has_peaks) mho_peaks_note(output, &f->peaks);
  if (f->no_peaks[0]) mho_output_note(output, "no peaks are looked for: %s", f->no_peaks);
  if (m->table == MEASURED_COMB) mho_comb_note(output, &f->comb);
  if (m->table == MEASURED_PLATEAUS) mho_plateaus_note(output, h);
  if (m->table == MEASURED_CLUSTERS) mho_clusters_note(output, &f->clusters, h->samples);
  if (m->all) mho_output_note(output, "no trace is rejected (--all)");
  else mho_rejection_note(output, h);
  if (f->has_unrejected) mho_unrejected_note(output, &f->unrejected);
  mho_reading_note(output, &h->report, mho_trace_floor_g0(&m->traces));
}

static mho_status draw(const command *cmd, const findings *f, mho_error *error)
{
  mho_buffer script = {0};
  const mho_histogram *h = f->histogram;
  switch (cmd->measured.table) {
  case MEASURED_MAP: mho_figure_map(&script, h, &f->peaks); break;
  case MEASURED_COMB: mho_figure_comb(&script, h, f->counts, &f->comb); break;
  case MEASURED_LINEAR: mho_figure_linear(&script, h); break;
  case MEASURED_PLATEAUS: mho_figure_plateaus(&script, h); break;
  default: mho_figure_histogram(&script, h, f->counts, &f->peaks); break;
  }
  mho_status status = mho_buffer_check(&script, "cli", error);
  if (status == MHO_OK) status = figure_write(cmd, &script, error);
  mho_buffer_clear(&script);
  return status;
}

static int check_options(const command *cmd)
{
  const measured_options *m = &cmd->measured;
  bool drawn = m->table != MEASURED_CLUSTERS && m->table != MEASURED_CORRELATION &&
               m->table != MEASURED_FLICKER;
  if (m->figure && !drawn)
    return usage_error(cmd->verb, "--figure draws the histogram, --peaks, --map, --linear, --comb "
                                  "or --plateaus");
  bool accepted_only = m->table == MEASURED_MAP || m->table == MEASURED_LINEAR ||
                       m->table == MEASURED_PLATEAUS || m->table == MEASURED_CLUSTERS ||
                       m->table == MEASURED_CORRELATION;
  if (m->all && accepted_only)
    return usage_error(cmd->verb, "--all goes with the log histogram, --peaks and --comb");
  return EXIT_DONE;
}

static mho_status list_flicker(const command *cmd, mho_error *error)
{
  const measured_options *m = &cmd->measured;
  mho_trace_options traces = m->traces;
  mho_flicker_options options;
  mho_flicker flicker;
  mho_output output = {0};
  byte_progress progress;
  mho_flicker_options_init(&options);
  options.seed = cmd->seed;
  traces.first_column = MHO_ABSCISSA_TIME;
  begin_byte_progress(cmd, &progress, &traces);
  mho_status status = mho_flicker_read((const char *const *)cmd->file, (size_t)cmd->files, &traces,
                                       &options, &flicker, error);
  end_byte_progress(&progress);
  if (status == MHO_OK) status = check_any_file(&flicker.report);
  if (status == MHO_OK) {
    mho_flicker_rows(&output, &flicker);
    if (!cmd->quiet) {
      mho_flicker_note(&output, &flicker);
      mho_reading_note(&output, &flicker.report, mho_trace_floor_g0(&traces));
    }
    status = output_write(cmd, &output, error);
    if (status == MHO_OK && flicker.report.failed_files > 0) status = MHO_ERR_FILE;
  }
  mho_flicker_clear(&flicker);
  mho_output_clear(&output);
  return status;
}

static mho_status read_histogram(const command *cmd, findings *f, mho_error *error)
{
  const measured_options *m = &cmd->measured;
  mho_trace_options traces = m->traces;
  mho_histogram_options options = m->histogram;
  byte_progress progress;
  if (options.map_bins_per_decade > options.bins_per_decade)
    options.map_bins_per_decade = options.bins_per_decade;
  options.plateaus = m->table == MEASURED_PLATEAUS;
  options.clusters = m->table == MEASURED_CLUSTERS;
  options.seed = cmd->seed;
  begin_byte_progress(cmd, &progress, &traces);
  mho_status status = mho_histogram_read((const char *const *)cmd->file, (size_t)cmd->files,
                                         &traces, &options, &f->histogram, error);
  end_byte_progress(&progress);
  if (status != MHO_OK) return status;
  f->counts = m->all ? &f->histogram->all : &f->histogram->accepted;
  return check_any_file(&f->histogram->report);
}

int command_histogram(const command *cmd, mho_error *error)
{
  int code = check_options(cmd);
  if (code != EXIT_DONE) return code;
  if (cmd->measured.table == MEASURED_FLICKER) return exit_of(list_flicker(cmd, error));
  findings f = {0};
  mho_output output = {0};
  mho_status status = read_histogram(cmd, &f, error);
  if (status == MHO_OK) status = analyse(cmd, &f, error);
  if (status == MHO_OK) {
    add_table(cmd, &f, &output);
    if (!cmd->quiet) add_remarks(cmd, &f, &output);
    if (cmd->measured.figure) status = draw(cmd, &f, error);
  }
  if (status == MHO_OK) status = output_write(cmd, &output, error);
  if (status == MHO_OK && f.histogram->report.failed_files > 0) status = MHO_ERR_FILE;
  mho_peaks_clear(&f.peaks);
  mho_peaks_clear(&f.unrejected);
  mho_clusters_clear(&f.clusters);
  mho_histogram_free(f.histogram);
  mho_output_clear(&output);
  return exit_of(status);
}
