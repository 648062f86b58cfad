/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Timed by benchmarks/traces.py: reads the files into a histogram, or bins
 * the doubles of a raw file, and writes seconds and counts.
 *
 *   bench_traces read FILE...      bench_traces bin FILE.raw
 */
#include <mho/histogram.h>

#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

static double now(void)
{
  struct timespec t;
  clock_gettime(CLOCK_MONOTONIC, &t);
  return (double)t.tv_sec + 1e-9 * (double)t.tv_nsec;
}

static int print(double seconds, const uint64_t *count, int bins)
{
  printf("%.9f\n", seconds);
  for (int i = 0; i < bins; i++) printf("%llu\n", (unsigned long long)count[i]);
  return 0;
}

static int fail(const mho_error *error)
{
  char line[1200];
  mho_cause_format(&error->cause[0], line, sizeof line);
  fprintf(stderr, "%s\n", line);
  return 1;
}

static int read_files(const char *const *paths, size_t count, mho_error *error)
{
  mho_trace_options traces;
  mho_histogram_options options;
  mho_trace_options_init(&traces);
  mho_histogram_options_init(&options);
  mho_histogram *histogram;
  double start = now();
  if (mho_histogram_read(paths, count, &traces, &options, &histogram, error)) return fail(error);
  double seconds = now() - start;
  print(seconds, histogram->all.count, histogram->all.bins);
  mho_histogram_free(histogram);
  return 0;
}

static int bin_file(const char *path, mho_error *error)
{
  FILE *file = fopen(path, "rb");
  if (!file || fseek(file, 0, SEEK_END) != 0) return 1;
  size_t n = (size_t)ftell(file) / sizeof(double);
  double *g = malloc(n * sizeof *g);
  rewind(file);
  if (!g || fread(g, sizeof *g, n, file) != n) return 1;
  fclose(file);
  uint64_t count[800] = {0}, below = 0, above = 0;
  double best = 1e9;
  for (int i = 0; i < 3; i++) {
    memset(count, 0, sizeof count);
    double start = now();
    if (mho_histogram_bin(g, n, -7, 1, 100, count, &below, &above, error)) return fail(error);
    best = now() - start < best ? now() - start : best;
  }
  free(g);
  return print(best, count, 800);
}

int main(int argc, char **argv)
{
  mho_error error;
  mho_error_init(&error);
  if (argc < 3) return 2;
  if (!strcmp(argv[1], "bin")) return bin_file(argv[2], &error);
  return read_files((const char *const *)argv + 2, (size_t)argc - 2, &error);
}
