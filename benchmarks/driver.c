/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * One timed piece of work of libmho, for benchmarks/run.py:
 *
 *   driver dense|sparse CASE RESULT REPEATS
 *
 * CASE holds doubles: n, left, right, gamma, energies, entries, then the
 * energies and (i, j, value) of every entry, i <= j.  RESULT gets log10 T of
 * every energy.  Times of the repeats, set-up and sweep, go to stdout as JSON;
 * set-up is what a new plan costs more than one at hand, its end included;
 * `driver divide` gives the nanoseconds of one division in a loop of them.
 */
#include <mho/transmission.h>

#include <malloc.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

static double seconds(void)
{
  struct timespec now;
  clock_gettime(CLOCK_PROCESS_CPUTIME_ID, &now);
  return (double)now.tv_sec + 1e-9 * (double)now.tv_nsec;
}

typedef struct {
  int n, left, right;
  double gamma, *energy, *matrix; /* matrix: for dense work only */
  size_t energies, entries;
  mho_entry *entry;
  mho_lead lead[2];
} work;

static void *room(size_t count, size_t size)
{
  void *memory = calloc(count ? count : 1, size);
  if (!memory) exit(1);
  return memory;
}

static void read_doubles(FILE *file, double *value, size_t count)
{
  if (fread(value, sizeof *value, count, file) != count) exit(1);
}

static void read_work(const char *path, bool dense, work *w)
{
  FILE *file = fopen(path, "rb");
  double head[6], triple[3];
  if (!file) exit(1);
  read_doubles(file, head, 6);
  *w = (work){.n = (int)head[0], .left = (int)head[1], .right = (int)head[2], .gamma = head[3],
              .energies = (size_t)head[4], .entries = (size_t)head[5]};
  size_t n = (size_t)w->n;
  w->energy = room(w->energies, sizeof(double));
  w->entry = room(w->entries, sizeof *w->entry);
  if (dense) w->matrix = room(n * n, sizeof(double));
  read_doubles(file, w->energy, w->energies);
  for (size_t e = 0; e < w->entries; e++) {
    read_doubles(file, triple, 3);
    w->entry[e] = (mho_entry){(int)triple[0], (int)triple[1], triple[2]};
    if (!dense) continue;
    w->matrix[(size_t)triple[0] * n + (size_t)triple[1]] = triple[2];
    w->matrix[(size_t)triple[1] * n + (size_t)triple[0]] = triple[2];
  }
  fclose(file);
  static double none = 0;
  for (int side = 0; side < 2; side++) {
    double *vector = room(n, sizeof(double));
    vector[side ? w->right : w->left] = 1;
    w->lead[side] = (mho_lead){1, &w->gamma, &none, vector, NULL};
  }
}

static mho_plan *make_plan(const work *w)
{
  mho_plan *plan = NULL;
  mho_error error;
  mho_error_init(&error);
  mho_junction junction = {0};
  mho_status status = MHO_OK;
  if (w->matrix) {
    status = mho_junction_from_hamiltonian(w->n, w->matrix, 0, 0, &w->lead[0], &w->lead[1],
                                           &junction, &error);
    if (status == MHO_OK) status = mho_plan_create(&junction, &plan, &error);
    mho_junction_clear(&junction);
  } else {
    status = mho_plan_create_sparse(w->n, w->entry, w->entries, &w->lead[0], &w->lead[1], &plan,
                                    &error);
  }
  if (status != MHO_OK) {
    fprintf(stderr, "%s\n", error.cause[0].message);
    exit(1);
  }
  return plan;
}

static int divide(void)
{
  enum { LANES = 64, ROUNDS = 400000 };
  double x[LANES], best = INFINITY;
  for (int k = 0; k < LANES; k++) x[k] = 1.0 + k;
  for (int repeat = 0; repeat < 9; repeat++) {
    double start = seconds();
    for (int r = 0; r < ROUNDS; r++) {
      for (int k = 0; k < LANES; k++) x[k] = 2.0 / x[k];
      __asm__ volatile("" ::: "memory");
    }
    best = fmin(best, seconds() - start);
  }
  printf("%.4g\n", best / ((double)LANES * ROUNDS) * 1e9);
  return x[0] > 0 ? 0 : 1;
}

/* Asking for the time costs as much as some microseconds of work. */
static int rounds_of(const work *w) { return w->n < 100 ? 16 : 1; }

static void sweep(const work *w, const mho_plan *plan, mho_point *point)
{
  if (mho_transmission_sweep(plan, w->energies, w->energy, point, NULL) != MHO_OK) exit(1);
}

/* Seconds from the entries to T of all energies. */
static double time_whole(const work *w, mho_point *point)
{
  int rounds = rounds_of(w);
  double start = seconds();
  for (int k = 0; k < rounds; k++) {
    mho_plan *plan = make_plan(w);
    sweep(w, plan, point);
    mho_plan_free(plan);
  }
  return (seconds() - start) / rounds;
}

/* Seconds of a sweep with a plan that has been used before. */
static double time_sweep(const work *w, mho_point *point)
{
  int rounds = rounds_of(w);
  mho_plan *plan = make_plan(w);
  sweep(w, plan, point);
  double start = seconds();
  for (int k = 0; k < rounds; k++) sweep(w, plan, point);
  double spent = (seconds() - start) / rounds;
  mho_plan_free(plan);
  return spent;
}

int main(int argc, char **argv)
{
  if (argc == 2 && !strcmp(argv[1], "divide")) return divide();
  if (argc != 5) return 2;
  /* Freed memory stays, as it does in a process that has freed larger arrays. */
  mallopt(M_MMAP_THRESHOLD, 1 << 30);
  mallopt(M_TRIM_THRESHOLD, 1 << 30);
  work w;
  read_work(argv[2], !strcmp(argv[1], "dense"), &w);
  mho_point *point = room(w.energies, sizeof *point);
  size_t settled[MHO_METHOD_COUNT] = {0};
  int repeats = atoi(argv[4]);
  printf("{\"times\": [");
  for (int r = 0; r < repeats; r++) {
    double whole = time_whole(&w, point), sweep = time_sweep(&w, point);
    printf("%s[%.9g, %.9g]", r ? ", " : "", whole - sweep, sweep);
  }
  for (size_t i = 0; i < w.energies; i++) settled[point[i].method]++;
  printf("], \"methods\": {");
  for (int m = 0, first = 1; m < MHO_METHOD_COUNT; m++)
    if (settled[m]) {
      printf("%s\"%s\": %zu", first ? "" : ", ", mho_method_name((mho_method)m), settled[m]);
      first = 0;
    }
  printf("}}\n");
  FILE *file = fopen(argv[3], "wb");
  for (size_t i = 0; file && i < w.energies; i++)
    fwrite(&point[i].log10_transmission, sizeof(double), 1, file);
  return file && fclose(file) == 0 ? 0 : 1;
}
