/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Levels and two rows of the orbitals against LAPACK's diagonalisation: levels,
 * and of the rows what does not depend on signs nor on a choice within a
 * degenerate level, the sums of w w^T over all levels up to each.
 */
#include "check.h"

#include <stdlib.h>

#include "base/lapack.h"
#include "solver/rows.h"

enum { N = 64 };

#define BETA (-2.7)

static unsigned long long state_of_random = 11;

static double uniform(void)
{
  state_of_random = state_of_random * 6364136223846793005ULL + 1442695040888963407ULL;
  return (double)(state_of_random >> 11) * 0x1p-53;
}

typedef struct {
  int sites;
  size_t entries;
  mho_entry entry[N * (N + 1) / 2];
  double vector[2 * N];
} graph;

static void add(graph *g, int i, int j, double value)
{
  g->entry[g->entries++] = (mho_entry){i < j ? i : j, i < j ? j : i, value};
}

static bool rows_of(graph *g, double *level, double (*amplitude)[2])
{
  mho_plan plan = {.sites = g->sites, .entry = g->entry, .entries = g->entries,
                   .vector = g->vector};
  return mho_rows_diagonalise(&plan, level, amplitude);
}

static void compare(graph *g)
{
  int n = g->sites;
  double h[N * N] = {0}, level[N], expected[N], amplitude[N][2], size = 0;
  assert_true(rows_of(g, level, amplitude));
  for (size_t e = 0; e < g->entries; e++) {
    int i = g->entry[e].i, j = g->entry[e].j;
    h[i * n + j] += g->entry[e].value_ev;
    h[j * n + i] = h[i * n + j];
  }
  assert_int_equal(mho_eigen_symmetric(n, h, expected, NULL), MHO_OK);
  for (int k = 0; k < n; k++) size = fmax(size, fabs(expected[k]));
  double sum[3] = {0}, other[3] = {0};
  for (int k = 0; k < n; k++) {
    assert_near(level[k], expected[k], 1e-14 * size);
    double w[2] = {0};
    for (int i = 0; i < n; i++)
      for (int c = 0; c < 2; c++) w[c] += h[k * n + i] * g->vector[c * n + i];
    for (int p = 0; p < 3; p++) {
      sum[p] += amplitude[k][p > 1] * amplitude[k][p > 0];
      other[p] += w[p > 1] * w[p > 0];
      double gap = k + 1 < n ? expected[k + 1] - expected[k] : size;
      if (gap > 1e-9 * size) assert_near(sum[p], other[p], 1e-14 + 1e-14 * size / gap);
    }
  }
}

static void choose_contacts(graph *g)
{
  memset(g->vector, 0, sizeof g->vector);
  for (int c = 0; c < 2; c++) g->vector[c * g->sites + (int)(uniform() * g->sites)] = 1;
}

static void random_graphs(void **state)
{
  (void)state;
  graph *g = calloc(1, sizeof *g);
  for (int trial = 0; trial < 2000; trial++) {
    *g = (graph){.sites = 1 + trial % N};
    for (int i = 0; i < g->sites; i++) {
      if (uniform() < 0.4 || g->sites == 1) add(g, i, i, BETA * uniform());
      for (int bond = 0; i && bond < 2; bond++)
        if (uniform() < 0.7) add(g, i, (int)(uniform() * i), BETA * (uniform() < 0.5 ? 1 : uniform()));
    }
    choose_contacts(g);
    if (trial % 3 == 0) /* a contact of several sites */
      for (int i = 0; i < g->sites; i++) g->vector[i] = uniform() - 0.5;
    if (g->entries) compare(g);
  }
  free(g);
}

/* Rings, stars and equal pieces: levels that fall together exactly. */
static void degenerate_levels(void **state)
{
  (void)state;
  graph *g = calloc(1, sizeof *g);
  for (int n = 3; n <= N; n++) {
    *g = (graph){.sites = n};
    for (int i = 0; i < n; i++) add(g, i, (i + 1) % n, BETA);
    choose_contacts(g);
    compare(g);
    *g = (graph){.sites = n};
    for (int i = 1; i < n; i++) add(g, 0, i, BETA);
    choose_contacts(g);
    compare(g);
    *g = (graph){.sites = n};
    for (int i = 0; i < n; i++) add(g, i, i, 1.5);
    choose_contacts(g);
    compare(g);
    *g = (graph){.sites = n};
    for (int i = 0; i + 3 < n; i += 3) { /* threes without a bond between them */
      add(g, i, i + 1, BETA);
      add(g, i + 1, i + 2, BETA);
    }
    choose_contacts(g);
    if (g->entries) compare(g);
  }
  free(g);
}

/* Far from an eV: as exact, or refused. */
static void any_scale(void **state)
{
  (void)state;
  graph *g = calloc(1, sizeof *g);
  for (int power = -300; power <= 300; power += 10) {
    *g = (graph){.sites = 12};
    for (int i = 0; i + 1 < 12; i++) add(g, i, i + 1, pow(10, power) * (1 + 0.1 * uniform()));
    choose_contacts(g);
    double level[N], amplitude[N][2];
    if (abs(power) < 30) compare(g);
    else if (abs(power) > 30) assert_false(rows_of(g, level, amplitude));
  }
  free(g);
}

int main(void)
{
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(random_graphs),
      cmocka_unit_test(degenerate_levels),
      cmocka_unit_test(any_scale),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
