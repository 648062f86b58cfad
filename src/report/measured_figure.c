/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Figures of measured traces.  Counts are a shaded area, what is fitted a line,
 * a 95 % interval a band.
 */
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include <mho/quantity.h>

#include "report/plot.h"

#define AREA "#d8dce2"
#define BAND "#f3ddd6"

enum { WIDTH = 820, HEIGHT = 480 };

static void add_row(mho_buffer *script, double x, double y)
{
  add_number(script, x);
  add_number(script, y);
  mho_buffer_add(script, "\n");
}

/* `name [low:high]` */
static void set_range(mho_buffer *script, const char *name, double low, double high)
{
  mho_buffer_print(script, "set %s [", name);
  add_number(script, low);
  mho_buffer_add(script, ":");
  add_number(script, high);
  mho_buffer_add(script, "]\n");
}

static void add_band(mho_buffer *script, double low, double high)
{
  mho_buffer_add(script, "set object rectangle from ");
  mho_buffer_number(script, 8, low);
  mho_buffer_add(script, ", graph 0 to ");
  mho_buffer_number(script, 8, high);
  mho_buffer_add(script, ", graph 1 behind fillcolor '" BAND "' fillstyle solid noborder\n");
}

/* A thin upright line at x with a text beside its top. */
static void add_mark(mho_buffer *script, double x, const char *text, double height)
{
  mho_buffer_add(script, "set arrow from ");
  mho_buffer_number(script, 8, x);
  mho_buffer_add(script, ", graph 0 to ");
  mho_buffer_number(script, 8, x);
  mho_buffer_print(script, ", graph 1 nohead back linewidth 1.5 linecolor '%s' dashtype '-'\n", ink[1]);
  mho_buffer_add(script, "set label ");
  add_quoted(script, text);
  mho_buffer_add(script, " at ");
  mho_buffer_number(script, 8, x);
  mho_buffer_add(script, ", graph ");
  mho_buffer_number(script, 4, height);
  mho_buffer_print(script, " offset 0.6,0 noenhanced textcolor '%s'\n", ink[1]);
}

static void add_peak_marks(mho_buffer *script, const mho_peaks *peaks)
{
  for (int i = 0; i < peaks->count; i++) {
    char text[48];
    mho_number_write(text, sizeof text - 4, 3, pow(10, peaks->peak[i].log10_g0));
    strcat(text, " G0");
    add_band(script, peaks->peak[i].low, peaks->peak[i].high);
    add_mark(script, peaks->peak[i].log10_g0, text, 0.95 - 0.06 * i);
  }
}

static void add_fit(mho_buffer *script, const char *name, const mho_peaks *peaks,
                    const double *density)
{
  mho_buffer_print(script, "$%s << END\n", name);
  double step = (peaks->high_log10_g0 - peaks->low_log10_g0) / peaks->bins;
  for (int i = 0; i < peaks->bins; i++)
    add_row(script, peaks->low_log10_g0 + (i + 0.5) * step, density[i]);
  mho_buffer_add(script, "END\n");
}

/* The highest count below the contact, so that the peak at G0 does not flatten
 * the rest. */
static double highest_density(const mho_histogram *h, const mho_trace_counts *counts)
{
  double highest = 0.0, all = 0.0;
  for (int i = 0; i < counts->bins; i++) {
    double density = mho_histogram_density(counts, i);
    all = fmax(all, density);
    if (mho_histogram_log10_g0(h, i) < -0.5) highest = fmax(highest, density);
  }
  return highest > 0.0 ? highest : all > 0.0 ? all : 1.0;
}

void mho_figure_histogram(mho_buffer *script, const mho_histogram *h,
                          const mho_trace_counts *counts, const mho_peaks *peaks)
{
  begin_figure(script, WIDTH, HEIGHT);
  mho_buffer_add(script, "$counts << END\n");
  for (int i = 0; i < counts->bins; i++)
    add_row(script, mho_histogram_log10_g0(h, i), mho_histogram_density(counts, i));
  mho_buffer_add(script, "END\n");
  bool fitted = peaks->bins > 0 && peaks->fit;
  if (fitted) {
    add_fit(script, "fit", peaks, peaks->fit);
    add_fit(script, "background", peaks, peaks->background);
  }
  add_peak_marks(script, peaks);
  double low = fmax(counts->low_log10_g0, counts->floor_log10_g0 - 0.5);
  set_range(script, "xrange", low, h->options.high_log10_g0);
  set_range(script, "yrange", 0.0, 1.15 * highest_density(h, counts));
  mho_buffer_add(script, "set xlabel 'conductance (G_0)'\nset format x '10^{%.0f}'\nset xtics 1\n"
                         "set ylabel 'points per trace and decade'\n"
                         "plot $counts with fillsteps fillstyle solid linecolor '" AREA
                         "' title 'log histogram'");
  if (fitted)
    mho_buffer_print(script,
                     ", $background with lines linewidth 1.5 linecolor '" NEUTRAL
                     "' dashtype '_' title 'background', $fit with lines linewidth 2 linecolor "
                     "'%s' title 'fit%s'",
                     ink[0], peaks->count > 0 ? " (band: 95 % of the peak)" : ", no peak");
  mho_buffer_add(script, "\n");
}

static int compare_counts(const void *a, const void *b)
{
  uint64_t x = *(const uint64_t *)a, y = *(const uint64_t *)b;
  return (x > y) - (x < y);
}

/* The count that one filled cell in fifty exceeds: the contact would darken
 * nothing but itself. */
static double darkest_count(const mho_histogram *h)
{
  size_t cells = (size_t)h->options.map_bins * (size_t)h->map_g_bins, filled = 0;
  uint64_t *count = malloc(cells * sizeof *count);
  if (!count) return 1.0;
  for (size_t i = 0; i < cells; i++)
    if (h->map[i]) count[filled++] = h->map[i];
  qsort(count, filled, sizeof *count, compare_counts);
  double darkest = filled ? (double)count[filled - 1 - filled / 50] : 1.0;
  free(count);
  return darkest;
}

void mho_figure_map(mho_buffer *script, const mho_histogram *h, const mho_peaks *peaks)
{
  const mho_histogram_options *o = &h->options;
  double step_nm = (o->map_high_nm - o->map_low_nm) / o->map_bins;
  double step = 1.0 / o->map_bins_per_decade;
  begin_figure(script, WIDTH, HEIGHT + 60);
  mho_buffer_add(script, "$map << END\n");
  for (int j = 0; j < h->map_g_bins; j++)
    for (int i = 0; i < o->map_bins; i++)
      mho_buffer_print(script, "%llu%s",
                       (unsigned long long)h->map[(size_t)i * (size_t)h->map_g_bins + (size_t)j],
                       i + 1 < o->map_bins ? " " : "\n");
  mho_buffer_add(script, "END\n");
  for (int k = 0; k < peaks->count; k++) {
    mho_buffer_print(script, "$peak%d << END\n", k);
    add_row(script, o->map_low_nm, peaks->peak[k].log10_g0);
    add_row(script, o->map_high_nm, peaks->peak[k].log10_g0);
    mho_buffer_add(script, "END\n");
  }
  set_range(script, "xrange", o->map_low_nm, o->map_high_nm);
  set_range(script, "yrange", fmax(o->low_log10_g0, h->all.floor_log10_g0 - 0.2), o->high_log10_g0);
  set_range(script, "cbrange", 0.0, darkest_count(h));
  mho_buffer_print(script,
                   "set key inside right bottom vertical\nset palette defined (0 '#ffffff', 0.25 '#cfe3df', 0.6 '%s', 1 '%s')\n"
                   "set xlabel 'displacement (nm)'\nset ylabel 'conductance (G_0)'\n"
                   "set format y '10^{%%.0f}'\nset ytics 1\nset cblabel 'points in a cell'\n"
                   "plot $map matrix using (",
                   ink[2], ink[0]);
  add_number(script, o->map_low_nm + 0.5 * step_nm);
  mho_buffer_add(script, " + $1*");
  mho_buffer_number(script, 12, step_nm);
  mho_buffer_add(script, "):(");
  add_number(script, o->low_log10_g0 + 0.5 * step);
  mho_buffer_add(script, " + $2*");
  mho_buffer_number(script, 12, step);
  mho_buffer_add(script, "):3 with image notitle");
  for (int k = 0; k < peaks->count; k++)
    mho_buffer_print(script, ", $peak%d with lines linewidth 2 linecolor '%s' dashtype '_' %s", k,
                     ink[1], k ? "notitle" : "title 'peak of the log histogram'");
  mho_buffer_add(script, "\n");
}

/* Where most points lie below the contact. */
static double commonest_g0(const mho_histogram *h, const mho_trace_counts *counts)
{
  int most = 0;
  for (int i = 0; i < counts->bins && mho_histogram_log10_g0(h, i) < -0.5; i++)
    if (counts->count[i] > counts->count[most]) most = i;
  return h->edge_g0[most];
}

/* Linear density of the logarithmic bins, whose width follows G. */
static double add_linear_density(mho_buffer *script, const mho_histogram *h,
                                 const mho_trace_counts *counts, double low, double high)
{
  double highest = 0.0, traces = counts->traces ? (double)counts->traces : 1.0;
  mho_buffer_add(script, "$counts << END\n");
  for (int i = 0; i < counts->bins; i++) {
    double left = h->edge_g0[i], right = h->edge_g0[i + 1];
    if (right < low || left > high) continue;
    double density = (double)counts->count[i] / (right - left) / traces;
    highest = fmax(highest, density);
    add_row(script, left, density);
  }
  mho_buffer_add(script, "END\n");
  return highest;
}

void mho_figure_comb(mho_buffer *script, const mho_histogram *h, const mho_trace_counts *counts,
                     const mho_comb *comb)
{
  double g1 = comb->found ? comb->g1_g0 : commonest_g0(h, counts);
  double low = 0.3 * g1, high = ((comb->count > 0 ? comb->count : 4) + 1.2) * g1;
  begin_figure(script, WIDTH, HEIGHT);
  double top = add_linear_density(script, h, counts, low, high);
  if (!(top > 0.0)) top = 1.0;
  mho_buffer_add(script, "$teeth << END\n");
  for (int i = 0; i < comb->count; i++) {
    const mho_comb_tooth *t = &comb->tooth[i];
    add_number(script, t->conductance_g0);
    add_number(script, 1.06 * top);
    add_number(script, t->low);
    add_number(script, t->high);
    mho_buffer_print(script, " %d\n", t->supported);
  }
  mho_buffer_add(script, "END\n");
  for (int n = 1; comb->found && n <= comb->count; n++) {
    char text[24] = "G1";
    if (n > 1) mho_number_write(text, sizeof text - 4, 3, n), strcat(text, " G1");
    add_mark(script, n * g1, text, 0.83);
  }
  if (comb->found) add_band(script, comb->low, comb->high);
  set_range(script, "xrange", low, high);
  set_range(script, "yrange", 0.0, 1.15 * top);
  mho_buffer_add(script, "set xlabel 'conductance (G_0)'\nset ylabel 'points per trace and G_0'\n"
                         "set format y '%.1s%c'\nset format x '%.3g'\nset key maxcols 2\n"
                         "plot $counts with fillsteps fillstyle solid linecolor '" AREA
                         "' title 'linear histogram'");
  if (comb->count > 0)
    mho_buffer_print(script,
                     ", $teeth using 1:2:3:4 with xerrorbars linewidth 2 pointtype 0 linecolor "
                     "'%s' notitle, $teeth using ($5 == 1 ? $1 : NaN):2 with points pointtype 7 "
                     "pointsize 1.2 linecolor '%s' title 'own centre, supported', $teeth using "
                     "($5 == 0 ? $1 : NaN):2 with points pointtype 6 pointsize 1.2 linecolor '%s' "
                     "title 'not supported'",
                     ink[0], ink[0], ink[0]);
  mho_buffer_add(script, "\n");
}

void mho_figure_linear(mho_buffer *script, const mho_histogram *h)
{
  double high = h->options.linear_high_g0, highest = 0.0;
  begin_figure(script, WIDTH, HEIGHT);
  mho_buffer_add(script, "$counts << END\n");
  for (int i = 0; i < h->options.linear_bins; i++) {
    double density = mho_histogram_linear_density(h, i), g0 = mho_histogram_linear_g0(h, i);
    if (g0 > 0.02 * high) highest = fmax(highest, density);
    add_row(script, g0, density);
  }
  mho_buffer_add(script, "END\n");
  set_range(script, "xrange", 0.0, high);
  set_range(script, "yrange", 0.0, highest > 0.0 ? 1.1 * highest : 1.0);
  mho_buffer_add(script, "set xlabel 'conductance (G_0)'\nset ylabel 'points per trace and G_0'\n"
                         "set format x '%.3g'\n"
                         "plot $counts with fillsteps fillstyle solid linecolor '" AREA
                         "' title 'linear histogram'\n");
}

void mho_figure_plateaus(mho_buffer *script, const mho_histogram *h)
{
  const double width = 0.02;
  int last = 0;
  begin_figure(script, WIDTH, HEIGHT);
  mho_buffer_add(script, "$lengths << END\n");
  for (int i = 0; i < MHO_PLATEAU_LENGTH_BINS; i++) {
    if (h->plateau_lengths[i]) last = i;
    add_row(script, (i + 0.5) * width, (double)h->plateau_lengths[i]);
  }
  mho_buffer_add(script, "END\n");
  set_range(script, "xrange", 0.0, (last + 2) * width);
  mho_buffer_print(script, "set yrange [0:*]\nset xlabel 'length of a plateau (nm)'\n"
                           "set ylabel 'plateaus'\nset boxwidth 0.018\n"
                           "plot $lengths with boxes fillstyle solid linecolor '%s' notitle\n", ink[2]);
}

static int compare_doubles(const void *a, const void *b)
{
  double x = *(const double *)a, y = *(const double *)b;
  return (x > y) - (x < y);
}

/* Fraction of the whole dwells of a level that last longer than t. */
static size_t add_survival(mho_buffer *script, const mho_telegraph *t, int level, double *length,
                           double *longest)
{
  size_t count = 0;
  for (size_t i = 0; i < t->dwells; i++)
    if (t->dwell[i].level == level && !t->dwell[i].censored) length[count++] = t->dwell[i].length_s;
  qsort(length, count, sizeof *length, compare_doubles);
  mho_buffer_print(script, "$level%d << END\n", level);
  for (size_t i = 0; i < count; i++)
    add_row(script, length[i], (double)(count - i) / (double)count);
  if (count > 0) *longest = fmax(*longest, length[count - 1]);
  mho_buffer_add(script, "END\n");
  return count;
}

void mho_figure_dwells(mho_buffer *script, const mho_telegraph *t)
{
  double *length = malloc((t->dwells + 1) * sizeof *length), longest = 0.0;
  size_t count[MHO_LEVEL_LIMIT] = {0}, most = 1;
  if (!length) {
    script->failed = true;
    return;
  }
  begin_figure(script, WIDTH, HEIGHT);
  for (int k = 0; k < t->levels; k++) {
    count[k] = add_survival(script, t, k, length, &longest);
    if (count[k] > most) most = count[k];
  }
  free(length);
  set_range(script, "xrange", 0.0, longest > 0.0 ? 1.02 * longest : 1.0);
  set_range(script, "yrange", 0.5 / (double)most, 1.3);
  mho_buffer_add(script, "set logscale y\nset format y '10^{%L}'\nset xlabel 'dwell time (s)'\n"
                         "set ylabel 'whole dwells that last longer'\nset samples 400\n"
                         "set key inside right top vertical\nplot ");
  bool first = true;
  for (int k = 0; k < t->levels; k++) {
    if (count[k] == 0) continue;
    mho_buffer_print(script, "%s$level%d with steps linewidth 2 linecolor '%s' dashtype %s title 'level %d, ",
                     first ? "" : ", ", k, ink[k], dash[k], k + 1);
    mho_buffer_number(script, 3, t->level[k].conductance_g0);
    mho_buffer_add(script, " G0'");
    first = false;
    if (!isfinite(t->level[k].seen_dwell_s) || !(t->level[k].seen_dwell_s > 0.0)) continue;
    mho_buffer_add(script, ", exp(-(x -");
    add_number(script, t->dead_time_s);
    mho_buffer_add(script, ")/");
    mho_buffer_number(script, 8, fmax(t->level[k].seen_dwell_s - t->dead_time_s, 1e-300));
    mho_buffer_print(script, ") with lines linewidth 1 linecolor '%s' notitle", ink[k]);
  }
  if (first) mho_buffer_add(script, "0 with lines linecolor '" NEUTRAL "' title 'no whole dwell'");
  mho_buffer_add(script, "\n");
}
