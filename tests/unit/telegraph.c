/* SPDX-License-Identifier: GPL-3.0-or-later */
#include "check.h"

#include <mho/telegraph.h>

#include "synthetic.h"

#include <gsl/gsl_fft_real.h>
#include <unistd.h>

enum { POINTS = 30000 };

static double g[POINTS];

static synthetic_telegraph two_levels(void)
{
  return (synthetic_telegraph){2, {1e-3, 2e-3, 0}, {0.02, 0.01, 0}, 2e-4, 0.0, 1e-4};
}

static mho_telegraph idealise(const synthetic_telegraph *s, uint64_t seed)
{
  mho_telegraph_options options;
  mho_telegraph_options_init(&options);
  mho_telegraph t;
  mho_error error;
  mho_error_init(&error);
  synthetic_signal(s, seed, POINTS, g);
  if (mho_telegraph_idealise(g, POINTS, s->sampling_s, &options, &t, &error))
    fail_msg("%s", error.cause[0].message);
  return t;
}

/* The truth lies within twice the 95 % interval, four standard errors. */
#define assert_within(truth, low, high) \
  assert_near(0.5 * ((low) + (high)), truth, 1.1 * ((high) - (low)))

static void two_levels_are_recovered(void **state)
{
  (void)state;
  static const double drifts[] = {0.0, 2e-3}; /* as much as two steps */
  for (uint64_t i = 0; i < 2; i++) {
    synthetic_telegraph s = two_levels();
    s.drift_g0 = drifts[i];
    mho_telegraph t = idealise(&s, 40 + i);
    assert_int_equal(t.levels, 2);
    assert_within(1e-3, t.step[0].low, t.step[0].high);
    assert_true(t.corrected);
    for (int k = 0; k < 2; k++) {
      assert_within(s.dwell_s[k], t.level[k].dwell_low_s, t.level[k].dwell_high_s);
      assert_true(t.level[k].exponential_p > 1e-3);
      assert_near(t.level[k].noise_g0, 2e-4, 2e-5);
    }
    assert_near(t.drift_g0_per_s * POINTS * 1e-4, s.drift_g0, 1e-4);
    assert_true(t.dwell[0].censored && t.dwell[t.dwells - 1].censored);
    double total = 0.0;
    for (size_t d = 0; d < t.dwells; d++) total += t.dwell[d].length_s;
    assert_near(total, POINTS * 1e-4, 1e-9);
    mho_telegraph_clear(&t);
  }
}

/* Dwells near the resolution: the correction must matter, and be right. */
static void missed_dwells_are_corrected_for(void **state)
{
  (void)state;
  synthetic_telegraph s = two_levels();
  s.dwell_s[0] = 0.004, s.dwell_s[1] = 0.002, s.noise_g0 = 5e-4;
  mho_telegraph t = idealise(&s, 50);
  assert_int_equal(t.levels, 2);
  assert_true(t.corrected);
  for (int k = 0; k < 2; k++) {
    assert_close(t.level[k].dwell_s, s.dwell_s[k], 0.15);
    assert_true(t.level[k].seen_dwell_s > 1.2 * s.dwell_s[k]);
  }
  mho_telegraph_clear(&t);
}

static void the_number_of_levels_is_tested(void **state)
{
  (void)state;
  synthetic_telegraph s = two_levels();
  for (int states = 1; states <= 3; states += 2) {
    s.states = states;
    s.g0[2] = 3e-3, s.dwell_s[2] = 0.015;
    s.drift_g0 = 1e-3 * (3 - states);
    mho_telegraph t = idealise(&s, 60);
    assert_int_equal(t.levels, states);
    for (int k = 0; k < states; k++)
      assert_near(t.level[k].conductance_g0, s.g0[k], 3e-5);
    mho_telegraph_clear(&t);
  }
}

/* Machlup, J. Appl. Phys. 25, 341 (1954): the spectrum of a noiseless signal,
 * averaged over segments and over an octave, and its integral, the variance. */
static void the_spectrum_is_machlups(void **state)
{
  (void)state;
  enum { LENGTH = 1 << 12, SEGMENTS = 200 };
  static double y[LENGTH], power[LENGTH];
  synthetic_telegraph s = two_levels();
  s.noise_g0 = 0.0;
  for (int r = 0; r < SEGMENTS; r++) {
    synthetic_signal(&s, 7000 + (uint64_t)r, LENGTH, y);
    double mean = 0.0;
    for (int i = 0; i < LENGTH; i++) mean += y[i] / LENGTH;
    for (int i = 0; i < LENGTH; i++) y[i] -= mean;
    gsl_fft_real_radix2_transform(y, 1, LENGTH);
    for (int k = 1; k < LENGTH / 2; k++)
      power[k] += (y[k] * y[k] + y[LENGTH - k] * y[LENGTH - k]) * 2.0 * s.sampling_s / LENGTH / SEGMENTS;
  }
  for (int from = 8; from < 128; from *= 2) { /* 20 to 310 Hz */
    double seen = 0.0, expected = 0.0;
    for (int k = from; k < 2 * from; k++) {
      seen += power[k];
      expected += mho_telegraph_spectrum(1e-3, 0.02, 0.01, k / (LENGTH * s.sampling_s));
    }
    assert_close(seen, expected, 0.08);
  }
  double integral = 0.0; /* p (1 - p) step^2 with p = 1/3 */
  for (double f = 0.005; f < 20000.0; f += 0.01) integral += 0.01 * mho_telegraph_spectrum(1.0, 0.02, 0.01, f);
  assert_close(integral, 2.0 / 9.0, 1e-3);
}

static void a_file_gives_the_same_as_memory(void **state)
{
  (void)state;
  char path[] = "/tmp/mho-blink-XXXXXX";
  int file = mkstemp(path);
  FILE *out = fdopen(file, "w");
  synthetic_telegraph s = two_levels();
  mho_telegraph memory = idealise(&s, 70), t;
  fprintf(out, "time_s,conductance_G0\n");
  for (int i = 0; i < POINTS; i++) fprintf(out, "%.9g,%.17g\n", i * 1e-4, g[i]);
  fclose(out);
  const char *const paths[] = {path};
  mho_trace_options traces;
  mho_trace_options_init(&traces);
  mho_telegraph_options options;
  mho_telegraph_options_init(&options);
  assert_int_equal(mho_telegraph_read(paths, 1, &traces, &options, &t, NULL), MHO_OK);
  assert_int_equal(t.dwells, memory.dwells);
  assert_close(t.step[0].height_g0, memory.step[0].height_g0, 1e-9);
  mho_telegraph_clear(&t);
  mho_telegraph_clear(&memory);
  unlink(path);
}

/* Noise in proportion to G: power goes as G^2; to sqrt(G): as G. */
static void flicker_exponent(void **state)
{
  (void)state;
  for (int n = 1; n <= 2; n++) {
    char path[] = "/tmp/mho-flicker-XXXXXX";
    int file = mkstemp(path);
    FILE *out = fdopen(file, "w");
    mho_random random = mho_random_stream(1, (uint64_t)n);
    for (int j = 0; j < 60; j++) {
      double mean = pow(10.0, -4.0 + 2.0 * synthetic_uniform(&random));
      for (int i = 0; i < 2000; i++)
        fprintf(out, "%.8g\n", mean + 0.01 * pow(mean / 1e-3, 0.5 * n) * 1e-3 * synthetic_normal(&random));
      fprintf(out, "\n");
    }
    fclose(out);
    const char *const paths[] = {path};
    mho_trace_options traces;
    mho_trace_options_init(&traces);
    traces.sampling_hz = 10000.0;
    mho_flicker_options options;
    mho_flicker_options_init(&options);
    mho_flicker flicker;
    assert_int_equal(mho_flicker_read(paths, 1, &traces, &options, &flicker, NULL), MHO_OK);
    assert_int_equal(flicker.junctions, 60);
    assert_true(flicker.low < n && n < flicker.high);
    assert_near(flicker.exponent, n, 0.1);
    /* White noise of deviation s has the density 2 s^2/f_s. */
    double noise = 0.01e-3 * pow(flicker.conductance_g0[0] / 1e-3, 0.5 * n);
    assert_close(flicker.noise_g0_squared[0], 2.0 * noise * noise / 10000.0 * 900.0, 0.5);
    mho_flicker_clear(&flicker);
    unlink(path);
  }
}

static void bad_options_and_short_signals(void **state)
{
  (void)state;
  mho_telegraph_options options;
  mho_telegraph_options_init(&options);
  mho_telegraph t;
  synthetic_telegraph s = two_levels();
  synthetic_signal(&s, 1, POINTS, g);
  assert_int_equal(mho_telegraph_idealise(g, 100, 1e-4, &options, &t, NULL), MHO_ERR_RANGE);
  assert_int_equal(mho_telegraph_idealise(g, POINTS, 0.0, &options, &t, NULL), MHO_ERR_RANGE);
  options.most_levels = 9;
  assert_int_equal(mho_telegraph_idealise(g, POINTS, 1e-4, &options, &t, NULL), MHO_ERR_RANGE);
  mho_telegraph_options_init(&options);
  for (int i = 0; i < POINTS; i++) g[i] = 1e-3; /* no noise at all */
  assert_int_equal(mho_telegraph_idealise(g, POINTS, 1e-4, &options, &t, NULL), MHO_OK);
  assert_int_equal(t.levels, 1);
  mho_telegraph_clear(&t);
}

int main(void)
{
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(two_levels_are_recovered),
      cmocka_unit_test(missed_dwells_are_corrected_for),
      cmocka_unit_test(the_number_of_levels_is_tested),
      cmocka_unit_test(the_spectrum_is_machlups),
      cmocka_unit_test(a_file_gives_the_same_as_memory),
      cmocka_unit_test(flicker_exponent),
      cmocka_unit_test(bad_options_and_short_signals),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
