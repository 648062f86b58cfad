/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * One pass: every piece of a trace is binned into the row of the trace as it
 * comes; at the end of the trace the row is added where it belongs.  A trace
 * whose file fails leaves nothing behind.
 */
#include <mho/histogram.h>

#include "measure/logbin.h"
#include "measure/pull.h"
#include "measure/tally.h"
#include "base/processor.h"
#include "base/random.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>
#include <sys/mman.h>

enum { COARSE_PER_DECADE = 10, TRACE_PLATEAUS = 32 };

/* What belongs to the reading only. */
typedef struct {
  mho_histogram *histogram;
  mho_logbin logbin;
  double floor_g0;
  mho_tally row, linear; /* points of this trace by slot; slot 0 of linear: left out */
  uint64_t censored, left_out; /* points; the first are among the second */
  double *spent;     /* [bins + 2] */
  double *coarse;    /* [coarse_bins] */
  int *map_slot;     /* [bins + 2] conductance bin of the map, or -1 */
  mho_pull pull;
  bool too_long;
  bool has_x;
} collector;

void mho_histogram_options_init(mho_histogram_options *options)
{
  *options = (mho_histogram_options){
      .low_log10_g0 = -7.0, .high_log10_g0 = 1.0, .bins_per_decade = 100,
      .linear_high_g0 = 1.5, .linear_bins = 1500,
      .map_low_nm = -0.5, .map_high_nm = 2.5, .map_bins = 300,
      .map_bins_per_decade = 20, .crossing_g0 = 0.5, .window_decades = 0.5,
      .guard_decades = 0.3, .plateau_nm = 0.15, .plateau_slope = 3.0,
      .step_decades = 0.2};
}

static mho_status check_options(const mho_histogram_options *o, mho_error *error)
{
  const struct { const char *name; bool good; const char *allowed; } rule[] = {
      {"linear", o->linear_high_g0 > 0 && isfinite(o->linear_high_g0), "a positive range"},
      {"linear", o->linear_bins >= 1 && o->linear_bins <= 100000, "1 to 100000 bins"},
      {"map", o->map_low_nm < o->map_high_nm && isfinite(o->map_high_nm - o->map_low_nm),
       "a range of distances"},
      {"map", o->map_bins >= 1 && o->map_bins <= 10000, "1 to 10000 bins"},
      {"map", o->map_bins_per_decade >= 1 && o->map_bins_per_decade <= o->bins_per_decade,
       "no more bins a decade than the histogram has"},
      {"crossing", o->crossing_g0 > 0 && isfinite(o->crossing_g0), "a positive conductance"},
      {"snap-back", isfinite(o->snap_back_nm) && o->snap_back_nm >= 0, "a length"},
      {"reject", o->window_decades > 0 && o->guard_decades >= 0 && o->plateau_nm >= 0,
       "a positive window"}};
  for (size_t i = 0; i < sizeof rule / sizeof *rule; i++)
    if (!rule[i].good)
      return mho_fail(error, MHO_ERR_RANGE, "measure", rule[i].name,
                      "%s: %s is allowed", rule[i].name, rule[i].allowed);
  return MHO_OK;
}

/* Large and filled from its start: large pages spare thousands of page faults,
 * which cost more than the counting. */
static uint32_t *allocate_units(size_t bins)
{
  enum { LARGE_PAGE = 1 << 21 };
  size_t bytes = MHO_UNIT_LIMIT * bins * sizeof(uint32_t);
  size_t page = bytes > LARGE_PAGE ? LARGE_PAGE : 64;
  uint32_t *units = aligned_alloc(page, (bytes + page - 1) / page * page);
#ifdef MADV_HUGEPAGE
  if (units && page == LARGE_PAGE) (void)madvise(units, bytes, MADV_HUGEPAGE); /* only a hint */
#endif
  return units;
}

static bool counts_allocate(mho_trace_counts *counts)
{
  counts->count = calloc((size_t)counts->bins, sizeof *counts->count);
  counts->unit_traces = calloc(MHO_UNIT_LIMIT, sizeof *counts->unit_traces);
  counts->unit_count = allocate_units((size_t)counts->bins);
  return counts->count && counts->unit_traces && counts->unit_count;
}

static bool counts_init(mho_trace_counts *counts, const mho_histogram_options *options,
                        int bins, double floor_g0)
{
  counts->low_log10_g0 = options->low_log10_g0;
  counts->bins_per_decade = options->bins_per_decade;
  counts->bins = bins;
  counts->floor_log10_g0 = floor_g0 > 0.0 ? log10(floor_g0) : -INFINITY;
  counts->traces_per_unit = 1;
  return counts_allocate(counts);
}

static void counts_clear(mho_trace_counts *counts)
{
  free(counts->count);
  free(counts->unit_traces);
  free(counts->unit_count);
}

static uint32_t add_capped(uint32_t a, uint64_t b)
{
  return b > UINT32_MAX - a ? UINT32_MAX : a + (uint32_t)b;
}

static void merge_units(mho_trace_counts *counts)
{
  size_t bins = (size_t)counts->bins;
  for (size_t i = 0; i < counts->units / 2; i++) {
    uint32_t *to = counts->unit_count + i * bins;
    const uint32_t *a = counts->unit_count + 2 * i * bins, *b = a + bins;
    for (size_t j = 0; j < bins; j++) to[j] = add_capped(a[j], b[j]);
    counts->unit_traces[i] = counts->unit_traces[2 * i] + counts->unit_traces[2 * i + 1];
  }
  counts->units /= 2;
  counts->traces_per_unit *= 2;
}

FOR_EVERY_PROCESSOR
static void add_row(const uint64_t *row, size_t bins, uint64_t *count, uint32_t *unit)
{
  for (size_t i = 0; i < bins; i++) {
    uint64_t sum = unit[i] + row[i];
    unit[i] = sum < row[i] || sum > UINT32_MAX ? UINT32_MAX : (uint32_t)sum;
    count[i] += row[i];
  }
}

static void counts_add(mho_trace_counts *counts, const uint64_t *row, uint64_t censored)
{
  size_t bins = (size_t)counts->bins, unit = counts->units;
  bool is_open = unit > 0 && counts->unit_traces[unit - 1] < counts->traces_per_unit;
  if (!is_open && unit == MHO_UNIT_LIMIT) {
    merge_units(counts);
    unit = counts->units;
  }
  if (is_open) unit--;
  else {
    counts->units = unit + 1;
    counts->unit_traces[unit] = 0;
    memset(counts->unit_count + unit * bins, 0, bins * sizeof *counts->unit_count);
  }
  add_row(row + 1, bins, counts->count, counts->unit_count + unit * bins);
  counts->unit_traces[unit]++;
  counts->traces++;
  counts->censored += censored;
  counts->below += row[0];
  counts->above += row[bins + 1];
}

/* Accepted traces are counted in the arrays of all until one is rejected. */
static bool counts_part(mho_histogram *h)
{
  const mho_trace_counts *all = &h->all;
  size_t bins = (size_t)all->bins;
  mho_trace_counts *to = &h->accepted;
  if (to->unit_count != all->unit_count) return true;
  *to = *all;
  bool good = counts_allocate(to);
  if (good) {
    memcpy(to->count, all->count, bins * sizeof *to->count);
    memcpy(to->unit_traces, all->unit_traces, all->units * sizeof *to->unit_traces);
    memcpy(to->unit_count, all->unit_count, all->units * bins * sizeof *to->unit_count);
  }
  return good;
}

static mho_status allocate(collector *c, const mho_histogram_options *o, mho_error *error)
{
  mho_histogram *h = c->histogram;
  mho_status status = mho_logbin_init(&c->logbin, o->low_log10_g0, o->high_log10_g0,
                                      o->bins_per_decade, error);
  if (status != MHO_OK) return status;
  size_t bins = (size_t)c->logbin.bins, slots = bins + 2;
  double decades = o->high_log10_g0 - o->low_log10_g0;
  h->map_g_bins = (int)ceil(decades * o->map_bins_per_decade - 1e-9);
  h->coarse_bins = (int)ceil(decades * COARSE_PER_DECADE - 1e-9);
  size_t coarse = (size_t)h->coarse_bins;
  bool good = counts_init(&h->all, o, (int)bins, c->floor_g0) &&
              mho_tally_init(&c->row, slots) &&
              mho_tally_init(&c->linear, (size_t)o->linear_bins + 2);
  h->edge_g0 = malloc((bins + 1) * sizeof(double));
  h->linear = calloc((size_t)o->linear_bins, sizeof(uint64_t));
  h->map = calloc((size_t)o->map_bins * (size_t)h->map_g_bins, sizeof(uint64_t));
  h->coarse_sum = calloc(coarse, sizeof(double));
  h->coarse_product = calloc(coarse * coarse, sizeof(double));
  c->spent = malloc(slots * sizeof *c->spent);
  c->coarse = malloc(coarse * sizeof *c->coarse);
  c->map_slot = malloc(slots * sizeof *c->map_slot);
  good = good && h->edge_g0 && h->linear && h->map && h->coarse_sum &&
         h->coarse_product && c->spent && c->coarse && c->map_slot;
  if (o->clusters) {
    h->sample_trace = malloc(MHO_UNIT_LIMIT * sizeof(uint64_t));
    h->sample_count = malloc((size_t)MHO_UNIT_LIMIT * bins * sizeof(uint32_t));
    good = good && h->sample_trace && h->sample_count;
  }
  h->accepted = h->all;
  if (!good) return mho_fail(error, MHO_ERR_MEMORY, "measure", NULL, "out of memory");
  memcpy(h->edge_g0, c->logbin.edge, (bins + 1) * sizeof(double));
  for (int slot = 0; slot < (int)slots; slot++)
    c->map_slot[slot] = slot == 0 || slot > (int)bins
                            ? -1 : (slot - 1) * o->map_bins_per_decade / o->bins_per_decade;
  return MHO_OK;
}

static void start_trace(collector *c, bool has_x)
{
  mho_tally_reset(&c->row);
  mho_tally_reset(&c->linear);
  c->censored = c->left_out = 0;
  c->pull.count = 0;
  c->too_long = false;
  c->has_x = has_x;
}

/* What points below the floor, and those that are missing, come to. */
typedef struct {
  uint64_t censored, left_out;
} dropped_points;

/* Slots of the linear histogram, 0 for points left out. */
FOR_EVERY_PROCESSOR
static dropped_points linear_slots(const mho_histogram_options *options, double floor_g0,
                                   const double *g0, size_t n, int32_t *slot)
{
  const double top = options->linear_bins, scale = top / options->linear_high_g0;
  dropped_points dropped = {0, 0};
  for (size_t i = 0; i < n; i++) {
    double at = g0[i] * scale;
    at = at < top ? at : top;
    slot[i] = g0[i] >= floor_g0 ? (int32_t)at + 1 : 0;
    dropped.censored += g0[i] < floor_g0;
    dropped.left_out += !(g0[i] >= floor_g0);
  }
  return dropped;
}

/* Bins points; slot[n] is filled, 0 for what is missing or censored. */
static void bin_points(collector *c, const double *g0, size_t n, int32_t *slot)
{
  enum { AT_ONCE = 1024 };
  const double floor_g0 = fmax(c->floor_g0, 5e-324);
  int32_t linear[AT_ONCE];
  mho_logbin_slots(&c->logbin, floor_g0, g0, n, slot);
  mho_tally_add(&c->row, slot, n);
  for (size_t i = 0; i < n; i += AT_ONCE) {
    size_t now = n - i < AT_ONCE ? n - i : AT_ONCE;
    dropped_points dropped = linear_slots(&c->histogram->options, floor_g0, g0 + i, now, linear);
    mho_tally_add(&c->linear, linear, now);
    c->censored += dropped.censored;
    c->left_out += dropped.left_out;
  }
}

/* Bins the points of a piece: 1D, and what alignment will need. */
static bool add_piece(collector *c, const mho_trace_chunk *chunk)
{
  size_t n = chunk->count;
  mho_pull *pull = &c->pull;
  if (chunk->first) start_trace(c, chunk->x != NULL);
  if (c->has_x && pull->count + n > MHO_PULL_LIMIT) c->too_long = true;
  if (!c->has_x || c->too_long) pull->count = 0;
  if (!mho_pull_reserve(pull, n)) return false;
  bin_points(c, chunk->g0, n, pull->slot + pull->count);
  if (!c->has_x || c->too_long) return true;
  memcpy(pull->g0 + pull->count, chunk->g0, n * sizeof(double));
  memcpy(pull->x + pull->count, chunk->x, n * sizeof(double));
  pull->count += n;
  return true;
}

static void add_map(collector *c, double zero_nm)
{
  mho_histogram *h = c->histogram;
  const mho_histogram_options *o = &h->options;
  double scale = o->map_bins / (o->map_high_nm - o->map_low_nm);
  for (size_t i = 0; i < c->pull.count; i++) {
    int g = c->map_slot[c->pull.slot[i]];
    double x = c->pull.x[i] - zero_nm;
    if (x > 0.0) x += o->snap_back_nm;
    double at = (x - o->map_low_nm) * scale;
    if (g < 0 || !(at >= 0.0 && at < o->map_bins)) continue;
    h->map[(size_t)at * (size_t)h->map_g_bins + (size_t)g]++;
  }
}

static bool add_plateaus(collector *c, uint64_t trace, size_t start)
{
  mho_histogram *h = c->histogram;
  mho_plateau found[TRACE_PLATEAUS];
  size_t count = mho_pull_plateaus(&c->pull, start, c->floor_g0, &h->options, found, TRACE_PLATEAUS);
  for (size_t i = 0; i < count; i++) {
    int bin = (int)fmin(found[i].length_nm / 0.02, MHO_PLATEAU_LENGTH_BINS - 1);
    h->plateau_lengths[bin]++;
    if (h->plateaus == MHO_PLATEAU_LIMIT) {
      h->plateaus_dropped++;
      continue;
    }
    if ((h->plateaus & (h->plateaus - 1)) == 0) { /* full at powers of two */
      size_t capacity = h->plateaus ? 2 * h->plateaus : 1;
      mho_plateau *larger = realloc(h->plateau, capacity * sizeof *larger);
      if (!larger) return false;
      h->plateau = larger;
    }
    found[i].trace = trace;
    h->plateau[h->plateaus++] = found[i];
  }
  return true;
}

FOR_EVERY_PROCESSOR
static void add_multiple(double *to, const double *from, double factor, int n)
{
  for (int i = 0; i < n; i++) to[i] += factor * from[i];
}

/* Whole numbers, so that sums are exact; of the products the upper triangle. */
static void add_coarse(collector *c)
{
  mho_histogram *h = c->histogram;
  int n = h->coarse_bins, per_decade = h->options.bins_per_decade;
  const uint64_t *count = c->row.sum + 1;
  double *coarse = c->coarse;
  for (int i = 0, bin = 0; i < n; i++) {
    int end = ((i + 1) * per_decade + COARSE_PER_DECADE - 1) / COARSE_PER_DECADE;
    uint64_t sum = 0;
    for (end = end < c->logbin.bins ? end : c->logbin.bins; bin < end; bin++) sum += count[bin];
    coarse[i] = (double)sum;
  }
  for (int i = 0; i < n; i++) {
    if (coarse[i] == 0.0) continue;
    h->coarse_sum[i] += coarse[i];
    add_multiple(h->coarse_product + i * n + i, coarse + i, coarse[i], n - i);
  }
}

static void mirror_coarse(mho_histogram *h)
{
  int n = h->coarse_bins;
  for (int i = 0; i < n; i++)
    for (int j = 0; j < i; j++) h->coarse_product[i * n + j] = h->coarse_product[j * n + i];
}

/* Reservoir sampling: every accepted trace stays with equal probability. */
static void add_sample(collector *c, uint64_t trace)
{
  mho_histogram *h = c->histogram;
  if (!h->options.clusters) return;
  uint64_t seen = h->accepted.traces; /* this one is not counted yet */
  size_t place = h->samples;
  if (place == MHO_UNIT_LIMIT) {
    mho_random random = mho_random_stream(h->options.seed, seen);
    uint64_t drawn = mho_random_below(&random, seen + 1);
    if (drawn >= MHO_UNIT_LIMIT) return;
    place = (size_t)drawn;
  } else {
    h->samples++;
  }
  size_t bins = (size_t)c->logbin.bins;
  h->sample_trace[place] = trace;
  for (size_t i = 0; i < bins; i++)
    h->sample_count[place * bins + i] = add_capped(0, c->row.sum[i + 1]);
}

/* True where the trace shows more than tunnelling; counts why not. */
static bool accept_trace(collector *c, bool aligned, size_t start)
{
  mho_histogram *h = c->histogram;
  const mho_histogram_options *o = &h->options;
  if (!c->has_x || c->too_long) return true;
  if (!aligned) {
    h->no_contact++;
    return false;
  }
  double low = c->floor_g0 * pow(10.0, o->guard_decades);
  int first = mho_logbin_slot(&c->logbin, fmax(low, c->logbin.edge[0]));
  int last = mho_logbin_slot(&c->logbin, o->crossing_g0);
  if (first < 1) first = 1;
  if (last > c->logbin.bins) last = c->logbin.bins;
  int window = (int)rint(o->window_decades * o->bins_per_decade);
  if (mho_pull_longest_stay(&c->pull, start, first, last, window > 0 ? window : 1, c->spent) >=
      o->plateau_nm)
    return true;
  h->no_plateau++;
  return false;
}

FOR_EVERY_PROCESSOR
static void add_counts(uint64_t *to, const uint64_t *from, size_t n)
{
  for (size_t i = 0; i < n; i++) to[i] += from[i];
}

static bool end_trace(collector *c, uint64_t trace)
{
  mho_histogram *h = c->histogram;
  size_t start = 0;
  double zero_nm = 0.0;
  mho_tally_join(&c->row);
  mho_tally_join(&c->linear);
  c->row.sum[0] -= c->left_out;
  h->has_distance |= c->has_x;
  h->too_long += c->too_long;
  bool aligned = c->has_x && !c->too_long &&
                 mho_pull_align(&c->pull, h->options.crossing_g0, &start, &zero_nm);
  h->aligned += aligned;
  bool accepted = accept_trace(c, aligned, start);
  if (!accepted && !counts_part(h)) return false;
  bool apart = h->accepted.unit_count != h->all.unit_count;
  if (accepted) add_sample(c, trace);
  if (accepted && apart) counts_add(&h->accepted, c->row.sum, c->censored);
  counts_add(&h->all, c->row.sum, c->censored);
  if (!accepted) return true;
  if (!apart) h->accepted = h->all;
  add_counts(h->linear, c->linear.sum + 1, (size_t)h->options.linear_bins);
  h->linear_above += c->linear.sum[h->options.linear_bins + 1];
  add_coarse(c);
  if (!aligned) return true;
  add_map(c, zero_nm);
  return !h->options.plateaus || add_plateaus(c, trace, start);
}

static mho_status collect(collector *c, mho_trace_reader *reader, mho_error *error)
{
  mho_trace_chunk chunk;
  for (;;) {
    bool more;
    mho_status status = mho_trace_reader_next(reader, &chunk, &more, error);
    if (status != MHO_OK || !more) return status;
    if (!add_piece(c, &chunk) || (chunk.last && !end_trace(c, chunk.trace)))
      return mho_fail(error, MHO_ERR_MEMORY, "measure", NULL, "out of memory");
  }
}

mho_status mho_histogram_read(const char *const *paths, size_t count,
                              const mho_trace_options *traces,
                              const mho_histogram_options *options,
                              mho_histogram **result, mho_error *error)
{
  *result = NULL;
  mho_status status = check_options(options, error);
  if (status != MHO_OK) return status;
  mho_histogram *histogram = calloc(1, sizeof *histogram);
  if (!histogram) return mho_fail(error, MHO_ERR_MEMORY, "measure", NULL, "out of memory");
  histogram->options = *options;
  collector c = {.histogram = histogram, .floor_g0 = mho_trace_floor_g0(traces)};
  mho_trace_reader *reader = NULL;
  status = allocate(&c, options, error);
  if (status == MHO_OK)
    status = mho_trace_reader_create(paths, count, traces, MHO_ABSCISSA_DISTANCE, &reader, error);
  if (status == MHO_OK) {
    status = collect(&c, reader, error);
    mirror_coarse(histogram);
    histogram->report = *mho_trace_reader_report(reader);
  }
  mho_trace_reader_free(reader);
  mho_pull_clear(&c.pull);
  mho_logbin_clear(&c.logbin);
  mho_tally_clear(&c.row);
  mho_tally_clear(&c.linear);
  free(c.spent);
  free(c.coarse);
  free(c.map_slot);
  if (status != MHO_OK) {
    mho_histogram_free(histogram);
    return status;
  }
  *result = histogram;
  return MHO_OK;
}

void mho_histogram_free(mho_histogram *histogram)
{
  if (!histogram) return;
  if (histogram->accepted.unit_count != histogram->all.unit_count)
    counts_clear(&histogram->accepted);
  counts_clear(&histogram->all);
  free(histogram->edge_g0);
  free(histogram->linear);
  free(histogram->map);
  free(histogram->coarse_sum);
  free(histogram->coarse_product);
  free(histogram->plateau);
  free(histogram->sample_trace);
  free(histogram->sample_count);
  free(histogram);
}

double mho_histogram_log10_g0(const mho_histogram *histogram, int bin)
{
  return histogram->all.low_log10_g0 + (bin + 0.5) / histogram->all.bins_per_decade;
}

double mho_histogram_density(const mho_trace_counts *counts, int bin)
{
  if (counts->traces == 0) return 0.0;
  return (double)counts->count[bin] * counts->bins_per_decade / (double)counts->traces;
}

double mho_histogram_linear_g0(const mho_histogram *histogram, int bin)
{
  return (bin + 0.5) * histogram->options.linear_high_g0 / histogram->options.linear_bins;
}

double mho_histogram_linear_density(const mho_histogram *histogram, int bin)
{
  if (histogram->accepted.traces == 0) return 0.0;
  double width = histogram->options.linear_high_g0 / histogram->options.linear_bins;
  return (double)histogram->linear[bin] / width / (double)histogram->accepted.traces;
}

void mho_histogram_correlation(const mho_histogram *histogram, double *correlation)
{
  int n = histogram->coarse_bins;
  double traces = (double)histogram->accepted.traces;
  const double *sum = histogram->coarse_sum, *product = histogram->coarse_product;
  for (int i = 0; i < n; i++)
    for (int j = 0; j < n; j++) {
      double covariance = product[i * n + j] - sum[i] * sum[j] / traces;
      double variance_i = product[i * n + i] - sum[i] * sum[i] / traces;
      double variance_j = product[j * n + j] - sum[j] * sum[j] / traces;
      bool varies = traces > 1 && variance_i > 0.0 && variance_j > 0.0;
      correlation[i * n + j] = varies ? covariance / sqrt(variance_i * variance_j) : 0.0;
    }
}

FOR_EVERY_PROCESSOR
static size_t count_missing(const double *g0, size_t n)
{
  size_t missing = 0;
  for (size_t i = 0; i < n; i++) missing += g0[i] != g0[i];
  return missing;
}

mho_status mho_histogram_bin(const double *g0, size_t n, double low_log10_g0,
                             double high_log10_g0, int bins_per_decade, uint64_t *count,
                             uint64_t *below, uint64_t *above, mho_error *error)
{
  mho_logbin logbin;
  mho_status status = mho_logbin_init(&logbin, low_log10_g0, high_log10_g0, bins_per_decade, error);
  if (status != MHO_OK) return status;
  mho_tally tally = {0};
  if (!mho_tally_init(&tally, (size_t)logbin.bins + 2)) {
    mho_tally_clear(&tally);
    mho_logbin_clear(&logbin);
    return mho_fail(error, MHO_ERR_MEMORY, "measure", NULL, "out of memory");
  }
  enum { AT_ONCE = 1024 };
  int32_t slot[AT_ONCE];
  uint64_t missing = 0;
  for (size_t i = 0; i < n; i += AT_ONCE) {
    size_t now = n - i < AT_ONCE ? n - i : AT_ONCE;
    mho_logbin_slots(&logbin, -INFINITY, g0 + i, now, slot);
    mho_tally_add(&tally, slot, now);
    missing += count_missing(g0 + i, now);
  }
  mho_tally_join(&tally);
  for (int i = 0; i < logbin.bins; i++) count[i] += tally.sum[i + 1];
  *below += tally.sum[0] - missing;
  *above += tally.sum[logbin.bins + 1];
  mho_tally_clear(&tally);
  mho_logbin_clear(&logbin);
  return MHO_OK;
}
