/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Measured traces as tables, and what has to be said about them.
 */
#include "report/stages.h"

#include <mho/quantity.h>

#include <math.h>
#include <stdlib.h>

#define COUNT(array) (sizeof(array) / sizeof *(array))

/* A number of a sentence, three digits; the sentence's expression ends it. */
typedef struct {
  char text[32];
} word;

static word say(double value)
{
  word w;
  mho_number_write(w.text, sizeof w.text, 3, value);
  return w;
}

#define SAY(value) say(value).text
#define BIG(value) ((unsigned long long)(value))

/* --- Tables ------------------------------------------------------------- */

void mho_histogram_rows(mho_output *output, const mho_histogram *h,
                        const mho_trace_counts *counts)
{
  static const char *const columns[] = {"log10_G0", "count", "density_per_trace_per_decade"};
  mho_table *table = mho_output_table(output, "histogram", columns, COUNT(columns));
  for (int i = 0; i < counts->bins; i++) {
    mho_table_number(table, mho_histogram_log10_g0(h, i));
    mho_table_integer(table, (long)counts->count[i]);
    mho_table_number(table, mho_histogram_density(counts, i));
  }
}

void mho_linear_rows(mho_output *output, const mho_histogram *h)
{
  static const char *const columns[] = {"conductance_G0", "count", "density_per_trace_per_G0"};
  mho_table *table = mho_output_table(output, "linear", columns, COUNT(columns));
  for (int i = 0; i < h->options.linear_bins; i++) {
    mho_table_number(table, mho_histogram_linear_g0(h, i));
    mho_table_integer(table, (long)h->linear[i]);
    mho_table_number(table, mho_histogram_linear_density(h, i));
  }
}

void mho_map_rows(mho_output *output, const mho_histogram *h)
{
  static const char *const columns[] = {"distance_nm", "log10_G0", "count"};
  mho_table *table = mho_output_table(output, "map", columns, COUNT(columns));
  const mho_histogram_options *o = &h->options;
  double step = (o->map_high_nm - o->map_low_nm) / o->map_bins;
  for (int i = 0; i < o->map_bins; i++)
    for (int j = 0; j < h->map_g_bins; j++) {
      mho_table_number(table, o->map_low_nm + (i + 0.5) * step);
      mho_table_number(table, o->low_log10_g0 + (j + 0.5) / o->map_bins_per_decade);
      mho_table_integer(table, (long)h->map[(size_t)i * (size_t)h->map_g_bins + (size_t)j]);
    }
}

void mho_peak_rows(mho_output *output, const mho_peaks *peaks)
{
  static const char *const columns[] = {"peak", "log10_G0", "low", "high", "width_decades", "weight"};
  mho_table *table = mho_output_table(output, "peaks", columns, COUNT(columns));
  for (int i = 0; i < peaks->count; i++) {
    const mho_peak *p = &peaks->peak[i];
    mho_table_integer(table, i + 1);
    mho_table_number(table, p->log10_g0);
    mho_table_number(table, p->low);
    mho_table_number(table, p->high);
    mho_table_number(table, p->width_decades);
    mho_table_number(table, p->weight);
  }
}

void mho_comb_rows(mho_output *output, const mho_comb *comb)
{
  static const char *const columns[] = {"multiple", "conductance_G0", "low", "high", "supported"};
  mho_table *table = mho_output_table(output, "comb", columns, COUNT(columns));
  for (int i = 0; i < comb->count; i++) {
    const mho_comb_tooth *t = &comb->tooth[i];
    mho_table_integer(table, t->multiple);
    mho_table_number(table, t->conductance_g0);
    mho_table_number(table, t->low);
    mho_table_number(table, t->high);
    mho_table_text(table, t->supported ? "yes" : "no");
  }
}

void mho_plateau_rows(mho_output *output, const mho_histogram *h)
{
  static const char *const columns[] = {"trace", "length_nm", "log10_G0", "slope_decades_per_nm"};
  mho_table *table = mho_output_table(output, "plateaus", columns, COUNT(columns));
  for (size_t i = 0; i < h->plateaus; i++) {
    mho_table_integer(table, (long)h->plateau[i].trace + 1);
    mho_table_number(table, h->plateau[i].length_nm);
    mho_table_number(table, h->plateau[i].log10_g0);
    mho_table_number(table, h->plateau[i].slope_decades_per_nm);
  }
}

void mho_cluster_rows(mho_output *output, const mho_clusters *clusters)
{
  static const char *const columns[] = {"cluster", "log10_G0", "low", "high", "traces", "share"};
  mho_table *table = mho_output_table(output, "clusters", columns, COUNT(columns));
  for (int i = 0; i < clusters->count; i++) {
    const mho_cluster *c = &clusters->cluster[i];
    mho_table_integer(table, i + 1);
    mho_table_number(table, c->log10_g0);
    mho_table_number(table, c->low);
    mho_table_number(table, c->high);
    mho_table_integer(table, (long)c->traces);
    mho_table_number(table, c->share);
  }
}

void mho_correlation_rows(mho_output *output, const mho_histogram *h)
{
  static const char *const columns[] = {"log10_G0", "other_log10_G0", "correlation"};
  mho_table *table = mho_output_table(output, "correlation", columns, COUNT(columns));
  int n = h->coarse_bins;
  double *correlation = malloc((size_t)n * (size_t)n * sizeof *correlation);
  if (!correlation) output->failed = true;
  else mho_histogram_correlation(h, correlation);
  for (int k = 0; correlation && k < n * n; k++) {
    mho_table_number(table, h->options.low_log10_g0 + 0.1 * (k / n + 0.5));
    mho_table_number(table, h->options.low_log10_g0 + 0.1 * (k % n + 0.5));
    mho_table_number(table, correlation[k]);
  }
  free(correlation);
}

void mho_flicker_rows(mho_output *output, const mho_flicker *flicker)
{
  static const char *const columns[] = {"junction", "conductance_G0", "noise_G0_squared"};
  mho_table *table = mho_output_table(output, "flicker", columns, COUNT(columns));
  for (size_t i = 0; i < flicker->junctions; i++) {
    mho_table_integer(table, (long)i + 1);
    mho_table_number(table, flicker->conductance_g0[i]);
    mho_table_number(table, flicker->noise_g0_squared[i]);
  }
}

void mho_blink_rows(mho_output *output, const mho_telegraph *t)
{
  static const char *const columns[] = {"level", "conductance_G0", "low", "high", "dwell_s",
                                        "dwell_low_s", "dwell_high_s", "occupancy"};
  mho_table *table = mho_output_table(output, "blink", columns, COUNT(columns));
  for (int i = 0; i < t->levels; i++) {
    const mho_level *l = &t->level[i];
    mho_table_integer(table, i + 1);
    mho_table_number(table, l->conductance_g0);
    mho_table_optional(table, isfinite(l->low), l->low);
    mho_table_optional(table, isfinite(l->high), l->high);
    mho_table_optional(table, isfinite(l->dwell_s), l->dwell_s);
    mho_table_optional(table, isfinite(l->dwell_low_s), l->dwell_low_s);
    mho_table_optional(table, isfinite(l->dwell_high_s), l->dwell_high_s);
    mho_table_number(table, l->occupancy);
  }
}

void mho_step_rows(mho_output *output, const mho_telegraph *t)
{
  static const char *const columns[] = {"step", "height_G0", "low", "high"};
  mho_table *table = mho_output_table(output, "steps", columns, COUNT(columns));
  for (int i = 0; i + 1 < t->levels; i++) {
    mho_table_integer(table, i + 1);
    mho_table_number(table, t->step[i].height_g0);
    mho_table_optional(table, isfinite(t->step[i].low), t->step[i].low);
    mho_table_optional(table, isfinite(t->step[i].high), t->step[i].high);
  }
}

void mho_dwell_rows(mho_output *output, const mho_telegraph *t)
{
  static const char *const columns[] = {"trace", "level", "start_s", "length_s", "conductance_G0",
                                        "censored"};
  mho_table *table = mho_output_table(output, "dwells", columns, COUNT(columns));
  for (size_t i = 0; i < t->dwells; i++) {
    const mho_dwell *d = &t->dwell[i];
    mho_table_integer(table, (long)d->trace + 1);
    mho_table_integer(table, d->level + 1);
    mho_table_number(table, d->start_s);
    mho_table_number(table, d->length_s);
    mho_table_optional(table, isfinite(d->mean_g0), d->mean_g0);
    mho_table_text(table, d->censored ? "yes" : "no");
  }
}

mho_table *mho_traces_table(mho_output *output)
{
  static const char *const columns[] = {"molecule", "traces", "rejected", "peak", "log10_G0", "low",
                                        "high", "width_decades", "weight"};
  return mho_output_table(output, "traces", columns, COUNT(columns));
}

void mho_traces_rows(mho_table *table, const char *molecule, uint64_t traces, uint64_t rejected,
                     const mho_peaks *peaks)
{
  for (int i = 0; i < (peaks->count > 0 ? peaks->count : 1); i++) {
    const mho_peak *p = &peaks->peak[i];
    bool found = i < peaks->count;
    mho_table_text(table, molecule);
    mho_table_integer(table, (long)traces);
    mho_table_integer(table, (long)rejected);
    if (found) mho_table_integer(table, i + 1);
    else mho_table_empty(table);
    mho_table_optional(table, found, p->log10_g0);
    mho_table_optional(table, found, p->low);
    mho_table_optional(table, found, p->high);
    mho_table_optional(table, found, p->width_decades);
    mho_table_optional(table, found, p->weight);
  }
}

/* --- Remarks ------------------------------------------------------------ */

const mho_peak *mho_main_peak(const mho_peaks *peaks)
{
  const mho_peak *main = NULL;
  for (int i = 0; i < peaks->count; i++)
    if (!main || peaks->peak[i].weight > main->weight) main = &peaks->peak[i];
  return main;
}

static const char *plural(uint64_t count) { return count == 1 ? "" : "s"; }

void mho_reading_note(mho_output *output, const mho_trace_report *r, double floor_g0)
{
  mho_output_note(output, "%llu trace%s, %llu points, %llu file%s", BIG(r->traces), plural(r->traces),
                  BIG(r->points), BIG(r->files), plural(r->files));
  if (floor_g0 > 0.0)
    mho_output_note(output,
                    "points that do not count as they are: %llu not a number, %llu zero or negative "
                    "and %llu below the floor of %s G0 (both censored), %llu saturated",
                    BIG(r->not_finite), BIG(r->not_positive), BIG(r->below_floor), SAY(floor_g0),
                    BIG(r->saturated));
  else
    mho_output_note(output,
                    "points that do not count as they are: %llu not a number, %llu zero or "
                    "negative, %llu saturated; no floor is given, so none is below it",
                    BIG(r->not_finite), BIG(r->not_positive), BIG(r->saturated));
  if (r->not_positive > r->points - r->points / 4)
    mho_output_note(output, "most points are zero or negative: a bias has the sign of its current");
  if (r->failed_files > 0)
    mho_output_note(output,
                    "%llu of %llu files could not be read to their end (%llu cut off); %llu "
                    "unfinished traces of %llu points are left out",
                    BIG(r->failed_files), BIG(r->files), BIG(r->truncated_files),
                    BIG(r->abandoned_traces), BIG(r->abandoned_points));
}

void mho_rejection_note(mho_output *output, const mho_histogram *h)
{
  const mho_histogram_options *o = &h->options;
  unsigned long long rejected = BIG(h->all.traces - h->accepted.traces);
  if (!h->has_distance) {
    mho_output_note(output, "no trace is rejected: without a distance it cannot be seen which show "
                            "tunnelling only");
    return;
  }
  mho_output_note(output, "rejected as tunnelling only: %llu of %llu traces (%s %%)", rejected,
                  BIG(h->all.traces),
                  SAY(h->all.traces ? 100.0 * (double)rejected / (double)h->all.traces : 0.0));
  mho_output_note(output,
                  "  no-contact, never crosses %s G0 downwards: %llu; no-plateau, behind the "
                  "crossing and %s decades above the floor never %s nm within %s decades: %llu",
                  SAY(o->crossing_g0), BIG(h->no_contact), SAY(o->guard_decades),
                  SAY(o->plateau_nm), SAY(o->window_decades), BIG(h->no_plateau));
  if (h->too_long > 0)
    mho_output_note(output, "  %llu traces are too long to be judged and count as accepted",
                    BIG(h->too_long));
}

static void stationarity_note(mho_output *output, int number, const mho_peak *p)
{
  if (!isfinite(p->drift_decades) || !isfinite(p->drift_p)) return;
  mho_output_note(output,
                  "  peak %d, second half of the traces minus first half: %s decades (p = %s): %s",
                  number, SAY(p->drift_decades), SAY(p->drift_p),
                  p->drift_p < 0.05 ? "it drifts, do not pool these traces" : "stationary");
}

void mho_peaks_note(mho_output *output, const mho_peaks *peaks)
{
  double low = peaks->low_log10_g0, high = peaks->high_log10_g0;
  if (peaks->count == 0)
    mho_output_note(output,
                    "no peak in the log histogram between %s and %s (log10 G/G0): nothing stands "
                    "out of the tunnelling background beyond chance",
                    SAY(low), SAY(high));
  for (int i = 0; i < peaks->count; i++) {
    const mho_peak *p = &peaks->peak[i];
    mho_output_note(output,
                    "peak %d of the log histogram: %s G0, 95 %% interval %s to %s G0 (bootstrap "
                    "over whole traces); %llu more traces would halve it",
                    i + 1, SAY(pow(10, p->log10_g0)), SAY(pow(10, p->low)), SAY(pow(10, p->high)),
                    BIG(p->traces_to_halve));
    stationarity_note(output, i + 1, p);
  }
}

void mho_unrejected_note(mho_output *output, const mho_peaks *peaks)
{
  const mho_peak *p = mho_main_peak(peaks);
  if (!p) mho_output_note(output, "without rejection: no peak");
  else
    mho_output_note(output, "without rejection the main peak is at %s G0, %s to %s G0",
                    SAY(pow(10, p->log10_g0)), SAY(pow(10, p->low)), SAY(pow(10, p->high)));
}

void mho_comb_note(mho_output *output, const mho_comb *comb)
{
  if (!comb->found) {
    mho_output_note(output, "no comb: the linear histogram has no significant peak to start from");
    return;
  }
  mho_output_note(output,
                  "comb of the linear histogram: G1 = %s G0, 95 %% interval %s to %s G0",
                  SAY(comb->g1_g0), SAY(comb->low), SAY(comb->high));
  mho_output_note(output,
                  "multiples of G1 against peaks that have nothing to do with each other: log "
                  "likelihood %s +- %s a unit of unseen traces; %s",
                  SAY(comb->comb_gain), SAY(comb->comb_gain_error),
                  comb->is_comb ? "a comb is supported: its first tooth is read as one molecule, "
                                  "the second as two (common practice)"
                                : "a comb is not supported");
}

void mho_plateaus_note(mho_output *output, const mho_histogram *h)
{
  double length = 0.0;
  for (size_t i = 0; i < h->plateaus; i++) length += h->plateau[i].length_nm;
  if (h->plateaus == 0) mho_output_note(output, "no plateaus");
  else
    mho_output_note(output,
                    "%llu plateaus in %llu accepted traces, mean length %s nm; steeper than %s "
                    "decades/nm is no plateau",
                    BIG(h->plateaus), BIG(h->accepted.traces),
                    SAY(length / (double)h->plateaus), SAY(h->options.plateau_slope));
  if (h->plateaus_dropped > 0)
    mho_output_note(output, "%llu further plateaus are not listed", BIG(h->plateaus_dropped));
}

void mho_clusters_note(mho_output *output, const mho_clusters *clusters, size_t samples)
{
  if (clusters->count == 0) mho_output_note(output, "no trace is left to divide by its shape");
  else if (clusters->count == 1)
    mho_output_note(output, "the shapes of %llu traces make one cluster: no division of them is "
                            "stable", BIG(samples));
  else
    mho_output_note(output, "%d clusters of %llu traces: silhouette %s, stability %s (adjusted "
                            "Rand index of halves)", clusters->count, BIG(samples),
                    SAY(clusters->silhouette), SAY(clusters->stability));
}

void mho_flicker_note(mho_output *output, const mho_flicker *f)
{
  if (!isfinite(f->exponent)) {
    mho_output_note(output, "no exponent: %llu junctions are long and dense enough, ten are needed",
                    BIG(f->junctions));
    return;
  }
  mho_output_note(output,
                  "noise power grows as G^%s, 95 %% interval %s to %s, from %llu junctions (%llu "
                  "unusable); about 1 is read as through-bond, about 2 as through-space",
                  SAY(f->exponent), SAY(f->low), SAY(f->high), BIG(f->junctions),
                  BIG(f->unusable));
}

static void dwell_note(mho_output *output, int number, const mho_level *l)
{
  if (isfinite(l->exponential_p))
    mho_output_note(output, "  level %d: %llu whole dwells; %s (p = %s)", number, BIG(l->dwells),
                    l->exponential_p < 0.05 ? "not exponential, so no single rate"
                                            : "exponential", SAY(l->exponential_p));
  else
    mho_output_note(output, "  level %d: %llu whole dwells, too few to test for an exponential",
                    number, BIG(l->dwells));
}

void mho_blink_note(mho_output *output, const mho_telegraph *t)
{
  mho_output_note(output, "%llu points every %s s, %llu of them missing and bridged",
                  BIG(t->points), SAY(t->sampling_s), BIG(t->missing));
  if (t->levels == 1) mho_output_note(output, "one level: the signal does not switch");
  for (int i = 0; i + 1 < t->levels; i++) {
    mho_output_note(output,
                    "step from level %d to %d: %s G0, 95 %% interval %s to %s G0; read as the "
                    "conductance of one molecule (common practice)",
                    i + 1, i + 2, SAY(t->step[i].height_g0), SAY(t->step[i].low),
                    SAY(t->step[i].high));
  }
  for (int i = 0; i < t->levels && t->levels > 1; i++) dwell_note(output, i + 1, &t->level[i]);
  if (t->levels > 1)
    mho_output_note(output, "dwells shorter than %s s are not seen; %s", SAY(t->dead_time_s),
                    t->corrected ? "mean dwells are corrected for it"
                                 : "mean dwells are not corrected for it");
  if (t->drift_g0_per_s != 0.0)
    mho_output_note(output, "a drift of %s G0/s was taken off", SAY(t->drift_g0_per_s));
}
