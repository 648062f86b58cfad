/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Edmonds' matching against all matchings of random small graphs.
 */
#include "check.h"

#include "molecule/matching.h"

enum { MOST = 9 };

typedef struct {
  int n;
  bool edge[MOST][MOST];
  int best;
  bool missed[MOST]; /* by some matching of the best size */
} small_graph;

/* Enumerates the matchings: the first undecided vertex stays free or pairs. */
static void enumerate(small_graph *g, int vertex, bool *used, int *free_list, int free_count,
                      int size, bool mark)
{
  while (vertex < g->n && used[vertex]) vertex++;
  if (vertex == g->n) {
    if (!mark && size > g->best) g->best = size;
    for (int i = 0; mark && size == g->best && i < free_count; i++)
      g->missed[free_list[i]] = true;
    return;
  }
  used[vertex] = true;
  free_list[free_count] = vertex;
  enumerate(g, vertex + 1, used, free_list, free_count + 1, size, mark);
  for (int v = vertex + 1; v < g->n; v++) {
    if (used[v] || !g->edge[vertex][v]) continue;
    used[v] = true;
    enumerate(g, vertex + 1, used, free_list, free_count, size + 1, mark);
    used[v] = false;
  }
  used[vertex] = false;
}

static void brute_force(small_graph *g)
{
  bool used[MOST] = {false};
  int free_list[MOST];
  g->best = 0;
  memset(g->missed, 0, sizeof g->missed);
  enumerate(g, 0, used, free_list, 0, 0, false);
  enumerate(g, 0, used, free_list, 0, 0, true);
}

static int run(const small_graph *g, int *mate, bool *missed)
{
  int start[MOST + 1], next[MOST * MOST], count = 0;
  for (int u = 0; u < g->n; u++) {
    start[u] = count;
    for (int v = 0; v < g->n; v++)
      if (g->edge[u][v]) next[count++] = v;
  }
  start[g->n] = count;
  mho_match_graph graph = {g->n, start, next};
  assert_int_equal(mho_match_maximum(&graph, mate, missed), MHO_OK);
  int pairs = 0;
  for (int v = 0; v < g->n; v++) {
    if (mate[v] < 0) continue;
    assert_true(g->edge[v][mate[v]]);
    assert_int_equal(mate[mate[v]], v);
    pairs += mate[v] > v;
  }
  return pairs;
}

static void it_is_maximum_and_knows_what_may_stay_free(void **state)
{
  (void)state;
  unsigned seed = 1;
  for (int round = 0; round < 6000; round++) {
    small_graph g = {.n = 2 + round % (MOST - 1)};
    unsigned density = 1 + (unsigned)round % 7;
    for (int u = 0; u < g.n; u++)
      for (int v = u + 1; v < g.n; v++) {
        seed = seed * 1664525u + 1013904223u;
        g.edge[u][v] = g.edge[v][u] = (seed >> 24) % 10 < density;
      }
    brute_force(&g);
    int mate[MOST];
    bool missed[MOST];
    for (int v = 0; v < g.n; v++) mate[v] = -1;
    assert_int_equal(run(&g, mate, missed), g.best);
    for (int v = 0; v < g.n; v++) assert_int_equal(missed[v], g.missed[v]);
    /* From a poor start, without the set D: still perfect where possible. */
    for (int v = 0; v < g.n; v++) mate[v] = -1;
    if (g.edge[0][1]) mate[0] = 1, mate[1] = 0;
    int pairs = run(&g, mate, NULL);
    assert_int_equal(2 * pairs == g.n, 2 * g.best == g.n);
  }
}

int main(void)
{
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(it_is_maximum_and_knows_what_may_stay_free),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
