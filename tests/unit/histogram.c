/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Histograms and peaks of invented traces with known truth; GSL's histogram
 * as an outside reference.  With an argument: that many repeats of the
 * coverage of the 95 % interval.
 */
#include "check.h"

#include <mho/histogram.h>
#include <mho/peaks.h>

#include "measure/logbin.h"
#include "measure/tally.h"
#include "synthetic.h"

#include <gsl/gsl_histogram.h>
#include <omp.h>
#include <unistd.h>

static char path[] = "/tmp/mho-pulls-XXXXXX";

static mho_histogram *read_path(double floor_g0, const mho_histogram_options *options)
{
  const char *const paths[] = {path};
  mho_trace_options traces;
  mho_trace_options_init(&traces);
  traces.floor_g0 = floor_g0;
  mho_histogram_options defaults;
  mho_histogram_options_init(&defaults);
  mho_histogram *histogram;
  mho_error error;
  mho_error_init(&error);
  if (mho_histogram_read(paths, 1, &traces, options ? options : &defaults, &histogram, &error))
    fail_msg("%s", error.cause[0].message);
  return histogram;
}

static mho_histogram *pulls(const synthetic_pull *s, uint64_t seed, size_t traces,
                            const mho_histogram_options *options)
{
  assert_true(synthetic_write_npy(path, s, seed, traces));
  return read_path(2.0 * s->floor_g0, options);
}

static void write_text(const char *text)
{
  FILE *file = fopen(path, "w");
  assert_non_null(file);
  fputs(text, file);
  assert_int_equal(fclose(file), 0);
}

/* Every edge, its neighbours, and random numbers, against a binary search in
 * the same edges by GSL. */
static void bins_are_exact_at_their_edges(void **state)
{
  (void)state;
  static const struct { double low, high; int per_decade; } grids[] = {
      {-7, 1, 100}, {-8, 0, 37}, {-3.5, 2, 1}, {-6, -1, 1000}};
  for (size_t k = 0; k < 4; k++) {
    mho_logbin bins;
    assert_int_equal(mho_logbin_init(&bins, grids[k].low, grids[k].high, grids[k].per_decade, NULL), MHO_OK);
    gsl_histogram *reference = gsl_histogram_alloc((size_t)bins.bins);
    gsl_histogram_set_ranges(reference, bins.edge, (size_t)bins.bins + 1);
    mho_random random = mho_random_stream(3, k);
    for (int i = 0; i < 3 * (bins.bins + 1) + 100000; i++) {
      double value = i < 3 * (bins.bins + 1)
                         ? (i % 3 == 0   ? bins.edge[i / 3]
                            : i % 3 == 1 ? nextafter(bins.edge[i / 3], 0.0)
                                         : nextafter(bins.edge[i / 3], INFINITY))
                         : pow(10.0, -10.0 + 14.0 * synthetic_uniform(&random));
      size_t expected;
      int slot = mho_logbin_slot(&bins, value);
      if (value < bins.edge[0]) assert_int_equal(slot, 0);
      else if (value >= bins.edge[bins.bins]) assert_int_equal(slot, bins.bins + 1);
      else {
        assert_int_equal(gsl_histogram_find(reference, value, &expected), 0);
        assert_int_equal(slot, (int)expected + 1);
      }
    }
    static const double odd[] = {0.0, -1.0, -1e300, 5e-324};
    for (size_t i = 0; i < 4; i++) assert_int_equal(mho_logbin_slot(&bins, odd[i]), 0);
    assert_int_equal(mho_logbin_slot(&bins, 1.7976931348623157e308), bins.bins + 1);
    assert_int_equal(mho_logbin_slot(&bins, INFINITY), bins.bins + 1);
    gsl_histogram_free(reference);
    mho_logbin_clear(&bins);
  }
}

/* Every kind of vector against the table, which the test above holds to GSL:
 * edges and their neighbours in every place of a block, odd numbers, a floor. */
static void slots_do_not_depend_on_the_processor(void **state)
{
  (void)state;
  static const struct { double low, high; int per_decade; } grids[] = {
      {-7, 1, 100}, {-30, 30, 333}, {-3.5, 2, 1}, {-6, -1, 1000}};
  static const double odd[] = {0.0, -0.0, -1.0, 5e-324, -INFINITY, INFINITY, NAN,
                               1.7976931348623157e308, 1e-310};
  enum { N = 100000 };
  double *value = malloc(N * sizeof *value);
  int32_t *slot = malloc(N * sizeof *slot);
  assert_true(value && slot);
  for (int k = 0; k < 8; k++) {
    mho_logbin bins;
    assert_int_equal(mho_logbin_init(&bins, grids[k / 2].low, grids[k / 2].high, grids[k / 2].per_decade, NULL), MHO_OK);
    double floor_g0 = k % 2 ? pow(10.0, 0.5 * (grids[k / 2].low + grids[k / 2].high)) : -INFINITY;
    mho_random random = mho_random_stream(5, (uint64_t)k);
    for (int i = 0; i < N; i++) {
      double edge = bins.edge[mho_random_below(&random, (uint64_t)bins.bins + 1)];
      double u = synthetic_uniform(&random), span = grids[k / 2].high - grids[k / 2].low;
      value[i] = i % 97 == 0   ? odd[mho_random_below(&random, sizeof odd / sizeof *odd)]
                 : i % 41 == 0 ? nextafter(edge, u < 0.4 ? 0.0 : u < 0.8 ? INFINITY : edge)
                 : i % 43 == 0 ? edge * (1.0 + 4e-7 * (u - 0.5))
                               : pow(10.0, grids[k / 2].low + span * (1.2 * u - 0.1));
    }
    for (int lanes = bins.lanes; lanes >= 1; lanes /= 2) {
      bins.lanes = lanes > 4 ? 8 : lanes > 1 ? 4 : 1;
      mho_logbin_slots(&bins, floor_g0, value, N, slot);
      for (int i = 0; i < N; i++) {
        int expected = value[i] >= floor_g0 ? mho_logbin_slot(&bins, value[i]) : 0;
        if (slot[i] != expected)
          fail_msg("%d lanes: %.17g in slot %d, not %d", bins.lanes, value[i], slot[i], expected);
      }
    }
    mho_logbin_clear(&bins);
  }
  free(value);
  free(slot);
}

static void no_count_is_lost(void **state)
{
  (void)state;
  mho_tally tally = {0};
  enum { N = 200003 }; /* three times what a part of a tally holds */
  static int32_t slot[N];
  assert_true(mho_tally_init(&tally, 5));
  for (int i = 0; i < N; i++) slot[i] = i % 7 ? 4 : i % 4;
  mho_tally_add(&tally, slot, 3);
  mho_tally_reset(&tally);
  uint64_t expected[5] = {0};
  for (int i = 0; i < N; i++) expected[slot[i]]++;
  mho_tally_add(&tally, slot, N);
  mho_tally_join(&tally);
  assert_memory_equal(tally.sum, expected, sizeof expected);
  mho_tally_clear(&tally);
}

static void densities_are_per_trace_and_decade(void **state)
{
  (void)state;
  write_text("1e-3\n1e-3\n1e-2\n\n1e-3\n-1\n1e-9\nnan\n2e1\n");
  mho_histogram *h = read_path(1e-8, NULL);
  assert_int_equal(h->all.traces, 2);
  assert_near(mho_histogram_density(&h->all, 400), 3 * 100.0 / 2.0, 1e-12);
  assert_near(mho_histogram_density(&h->all, 500), 1 * 100.0 / 2.0, 1e-12);
  assert_near(mho_histogram_log10_g0(h, 400), -2.995, 1e-12);
  assert_int_equal(h->all.censored, 2);
  assert_int_equal(h->all.above, 1);
  assert_int_equal(h->accepted.traces, 2); /* without a distance none is rejected */
  assert_near(mho_histogram_linear_density(h, 1), 3 / 1e-3 / 2.0, 1e-6);
  assert_int_equal(h->linear_above, 1);
  mho_histogram_free(h);
}

static void displacement_zero_is_the_last_crossing(void **state)
{
  (void)state;
  /* From 1 to 0.01 G0 between 0.3 and 0.4 nm: log10 2 of two decades after
   * 0.3, as a straight line in log10 G has it. */
  write_text("0 1\n0.1 0.1\n0.2 1\n0.3 1\n0.4 0.01\n0.5 0.001\n");
  mho_histogram_options o;
  mho_histogram_options_init(&o);
  o.map_bins = 3000; /* of 0.001 nm */
  o.snap_back_nm = 0.2;
  o.plateau_nm = 0.0;
  mho_histogram *h = read_path(0.0, &o);
  double zero = 0.3 + 0.1 * log10(2.0) / 2.0;
  size_t bin = (size_t)((0.5 - zero + 0.2 + 0.5) / 0.001), g = (size_t)((-3.0 + 7.0) * 20);
  assert_int_equal(h->aligned, 1);
  assert_int_equal(h->map[bin * (size_t)h->map_g_bins + g], 1);
  uint64_t total = 0;
  for (size_t i = 0; i < 3000 * (size_t)h->map_g_bins; i++) total += h->map[i];
  assert_int_equal(total, 6);
  mho_histogram_free(h);
}

static void tunnelling_is_rejected_and_counted(void **state)
{
  (void)state;
  synthetic_pull s = synthetic_pull_default();
  mho_histogram *h = pulls(&s, 5, 300, NULL);
  assert_int_equal(h->all.traces, 300);
  assert_int_equal(h->accepted.traces + h->no_plateau + h->no_contact, 300);
  /* Binomial: 180 +- 4 standard deviations of 8.5. */
  assert_near((double)h->accepted.traces, 180.0, 34.0);
  mho_histogram_free(h);
  s.yield = 0.0;
  h = pulls(&s, 6, 300, NULL);
  assert_true(h->accepted.traces < 6);
  mho_histogram_free(h);
}

static void units_stay_bounded_and_complete(void **state)
{
  (void)state;
  FILE *file = fopen(path, "w");
  for (int i = 0; i < 5000; i++) fprintf(file, "1e-3\n1e-%d\n\n", 1 + i % 6);
  fclose(file);
  mho_histogram *h = read_path(0.0, NULL);
  assert_int_equal(h->all.traces, 5000);
  assert_int_equal(h->all.traces_per_unit, 4);
  assert_int_equal(h->all.units, 1250);
  uint64_t traces = 0, points = 0, sums[2] = {0};
  for (size_t u = 0; u < h->all.units; u++) {
    traces += h->all.unit_traces[u];
    for (int i = 0; i < h->all.bins; i++) sums[0] += h->all.unit_count[u * (size_t)h->all.bins + (size_t)i];
  }
  for (int i = 0; i < h->all.bins; i++) sums[1] += h->all.count[i];
  points = sums[0];
  assert_int_equal(traces, 5000);
  assert_int_equal(points, 10000);
  assert_int_equal(sums[1], 10000);
  mho_histogram_free(h);
}

static void plateaus_have_their_length_and_slope(void **state)
{
  (void)state;
  synthetic_pull s = synthetic_pull_default();
  s.yield = 1.0;
  s.length_spread_nm = 0.0;
  s.noise = 0.04;
  mho_histogram_options o;
  mho_histogram_options_init(&o);
  o.plateaus = true;
  mho_histogram *h = pulls(&s, 8, 200, &o);
  double length = 0.0, log10_g0 = 0.0, slope = 0.0;
  assert_true(h->plateaus >= 190 && h->plateaus <= 230);
  for (size_t i = 0; i < h->plateaus; i++) {
    length += h->plateau[i].length_nm / (double)h->plateaus;
    log10_g0 += h->plateau[i].log10_g0 / (double)h->plateaus;
    slope += h->plateau[i].slope_decades_per_nm / (double)h->plateaus;
  }
  assert_near(length, 0.5, 0.03);
  assert_near(log10_g0, -3.0, 4 * 0.25 / sqrt(200.0));
  assert_near(slope, 0.0, 0.1);
  mho_histogram_free(h);
}

/* Two plateaus that never share a trace exclude each other. */
static void exclusive_features_anticorrelate(void **state)
{
  (void)state;
  synthetic_pull s = synthetic_pull_default();
  s.yield = 0.5, s.other_yield = 0.5, s.other_log10_g0 = -4.5, s.spread = 0.15;
  mho_histogram_options o;
  mho_histogram_options_init(&o);
  o.clusters = true;
  mho_histogram *h = pulls(&s, 9, 400, &o);
  size_t n = (size_t)h->coarse_bins;
  double *correlation = malloc(n * n * sizeof *correlation);
  mho_histogram_correlation(h, correlation);
  size_t high = 40, low = 25; /* -3 and -4.5 */
  assert_true(correlation[high * n + low] < -0.3);
  assert_near(correlation[high * n + high], 1.0, 1e-9);
  free(correlation);
  mho_clusters clusters;
  assert_int_equal(mho_clusters_find(h, -6, -0.5, 1, &clusters, NULL), MHO_OK);
  assert_int_equal(clusters.count, 2);
  assert_true(clusters.stability > 0.8);
  int first = clusters.cluster[0].log10_g0 > clusters.cluster[1].log10_g0 ? 0 : 1;
  assert_near(clusters.cluster[first].log10_g0, -3.0, 0.15);
  assert_near(clusters.cluster[1 - first].log10_g0, -4.5, 0.15);
  assert_near(clusters.cluster[first].share, 0.5, 0.1);
  mho_clusters_clear(&clusters);
  mho_histogram_free(h);
}

static mho_peaks peaks_of(const mho_histogram *h, uint64_t seed)
{
  mho_peak_options options;
  mho_peak_options_init(&options);
  options.seed = seed;
  mho_peaks peaks;
  mho_error error;
  mho_error_init(&error);
  if (mho_peaks_find(&h->all, &options, &peaks, &error)) fail_msg("%s", error.cause[0].message);
  return peaks;
}

static void no_molecule_no_peak(void **state)
{
  (void)state;
  synthetic_pull s = synthetic_pull_default();
  s.yield = 0.0;
  for (uint64_t seed = 0; seed < 4; seed++) {
    mho_histogram *h = pulls(&s, 100 + seed, 300, NULL);
    mho_peaks peaks = peaks_of(h, seed);
    assert_int_equal(peaks.count, 0);
    mho_peaks_clear(&peaks);
    mho_histogram_free(h);
  }
}

static void two_peaks_and_a_drift_are_found(void **state)
{
  (void)state;
  synthetic_pull s = synthetic_pull_default();
  s.yield = 0.4, s.other_yield = 0.3, s.other_log10_g0 = -4.5;
  mho_histogram *h = pulls(&s, 11, 800, NULL);
  mho_peaks peaks = peaks_of(h, 1);
  assert_int_equal(peaks.count, 2);
  assert_near(peaks.peak[0].log10_g0, -3.0, 0.08);
  assert_near(peaks.peak[1].log10_g0, -4.5, 0.08);
  assert_int_equal(peaks.peak[0].traces_to_halve, 2400);
  mho_peaks_clear(&peaks);
  mho_histogram_free(h);
  s = synthetic_pull_default();
  s.drift_decades = 0.6;
  h = pulls(&s, 12, 600, NULL);
  peaks = peaks_of(h, 1);
  assert_int_equal(peaks.count, 1);
  assert_near(peaks.peak[0].drift_decades, 0.3, 0.1);
  assert_true(peaks.peak[0].drift_p < 1e-3);
  mho_peaks_clear(&peaks);
  mho_histogram_free(h);
}

static void threads_do_not_change_the_interval(void **state)
{
  (void)state;
  synthetic_pull s = synthetic_pull_default();
  mho_histogram *h = pulls(&s, 13, 120, NULL);
  int threads = omp_get_max_threads();
  omp_set_num_threads(1);
  mho_peaks one = peaks_of(h, 3);
  omp_set_num_threads(3);
  mho_peaks three = peaks_of(h, 3), other = peaks_of(h, 4);
  omp_set_num_threads(threads);
  assert_int_equal(one.count, 1);
  assert_memory_equal(one.peak, three.peak, sizeof one.peak);
  assert_true(one.peak[0].low != other.peak[0].low);
  mho_peaks_clear(&one);
  mho_peaks_clear(&three);
  mho_peaks_clear(&other);
  mho_histogram_free(h);
}

static void a_comb_is_told_from_one_peak(void **state)
{
  (void)state;
  synthetic_pull s = synthetic_pull_default();
  s.spread = 0.05, s.noise = 0.03;
  mho_comb_options options;
  mho_comb_options_init(&options);
  mho_comb comb;
  mho_histogram *h = pulls(&s, 21, 500, NULL);
  assert_int_equal(mho_comb_find(&h->all, &options, &comb, NULL), MHO_OK);
  assert_true(comb.found && !comb.is_comb);
  assert_close(comb.g1_g0, 1e-3, 0.04);
  mho_histogram_free(h);
  s.multiple[0] = 0.5, s.multiple[1] = 0.3, s.multiple[2] = 0.2;
  h = pulls(&s, 22, 900, NULL);
  assert_int_equal(mho_comb_find(&h->all, &options, &comb, NULL), MHO_OK);
  assert_true(comb.found && comb.is_comb);
  assert_true(comb.tooth[1].supported && !comb.tooth[3].supported);
  assert_close(comb.g1_g0, 1e-3, 0.04);
  mho_histogram_free(h);
  s.yield = 0.0;
  h = pulls(&s, 23, 500, NULL);
  assert_int_equal(mho_comb_find(&h->all, &options, &comb, NULL), MHO_OK);
  assert_false(comb.found);
  mho_histogram_free(h);
}

/* Of `repeats` intervals 92 % to 97 % must hold the truth; of a few, what
 * four standard deviations of a binomial of 0.95 allow. */
static int check_coverage(int repeats)
{
  synthetic_pull s = synthetic_pull_default();
  int held = 0, found = 0;
  for (int r = 0; r < repeats; r++) {
    mho_histogram *h = pulls(&s, 1000 + (uint64_t)r, 200, NULL);
    mho_peaks peaks = peaks_of(h, (uint64_t)r);
    if (peaks.count == 1) {
      found++;
      held += peaks.peak[0].low <= s.log10_g0 && s.log10_g0 <= peaks.peak[0].high;
    }
    mho_peaks_clear(&peaks);
    mho_histogram_free(h);
  }
  double share = (double)held / repeats, margin = 4.0 * sqrt(0.95 * 0.05 / repeats);
  printf("%d of %d intervals hold the truth (%.3f), %d found\n", held, repeats, share, found);
  bool many = repeats >= 200;
  return found >= repeats * 0.99 && share >= (many ? 0.92 : 0.95 - margin) &&
                 share <= (many ? 0.97 : 1.0) ? 0 : 1;
}

static void intervals_hold_the_truth(void **state)
{
  (void)state;
  assert_int_equal(check_coverage(16), 0);
}

static int make_path(void **state)
{
  (void)state;
  int file = mkstemp(path);
  return file < 0 ? -1 : close(file);
}

static int remove_path(void **state)
{
  (void)state;
  return unlink(path);
}

int main(int argc, char **argv)
{
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(bins_are_exact_at_their_edges),
      cmocka_unit_test(slots_do_not_depend_on_the_processor),
      cmocka_unit_test(no_count_is_lost),
      cmocka_unit_test(densities_are_per_trace_and_decade),
      cmocka_unit_test(displacement_zero_is_the_last_crossing),
      cmocka_unit_test(tunnelling_is_rejected_and_counted),
      cmocka_unit_test(units_stay_bounded_and_complete),
      cmocka_unit_test(plateaus_have_their_length_and_slope),
      cmocka_unit_test(exclusive_features_anticorrelate),
      cmocka_unit_test(no_molecule_no_peak),
      cmocka_unit_test(two_peaks_and_a_drift_are_found),
      cmocka_unit_test(threads_do_not_change_the_interval),
      cmocka_unit_test(a_comb_is_told_from_one_peak),
      cmocka_unit_test(intervals_hold_the_truth),
  };
  if (argc > 1) {
    int result = make_path(NULL) == 0 ? check_coverage(atoi(argv[1])) : 1;
    remove_path(NULL);
    return result;
  }
  return cmocka_run_group_tests(tests, make_path, remove_path);
}
