/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Nodes of an interval against all nodes: bundled molecules between HOMO and
 * LUMO and across levels, random graphs, and zeros that touch without crossing.
 */
#include "junctions.h"

#include <glob.h>
#include <mho/molecule_file.h>
#include <mho/nodes.h>

enum { SITES_MAX = 64 };

/* No end of an interval below is nearer than this to a node, but for levels. */
#define MARGIN_EV 1e-9

static mho_nodes between(const mho_plan *plan, double low, double high)
{
  mho_nodes nodes;
  mho_error error;
  mho_error_init(&error);
  if (mho_nodes_between(plan, low, high, &nodes, &error) != MHO_OK)
    fail_msg("%s", error.cause[0].message);
  return nodes;
}

/* The exact nodes of `all` in the interval are those of the function. */
static size_t check_interval(const char *name, const mho_plan *plan, const mho_nodes *all,
                             double low, double high)
{
  mho_nodes some = between(plan, low, high);
  size_t found = 0;
  for (size_t k = 0; k < all->count; k++) {
    const mho_node *node = &all->node[k];
    if (node->kind == MHO_NODE_DIP || node->energy_ev < low + MARGIN_EV ||
        node->energy_ev > high - MARGIN_EV)
      continue;
    if (found >= some.count || some.node[found].order != node->order ||
        !(fabs(some.node[found].energy_ev - node->energy_ev) < 2e-12))
      fail_msg("%s: the node at %.15g eV, order %d, is not found", name, node->energy_ev,
               node->order);
    found++;
  }
  if (found != some.count) fail_msg("%s: %zu nodes too many", name, some.count - found);
  mho_nodes_clear(&some);
  return found;
}

static size_t check_file(const char *path)
{
  mho_molecule molecule;
  mho_junction junction = {0};
  mho_plan *plan;
  mho_nodes all;
  size_t found = 0;
  mho_molecule_init(&molecule);
  assert_int_equal(mho_molecule_read(path, NULL, NULL, &molecule, NULL), MHO_OK);
  assert_int_equal(mho_junction_build(&molecule, &junction, NULL), MHO_OK);
  assert_int_equal(mho_plan_create(&junction, &plan, NULL), MHO_OK);
  assert_int_equal(mho_nodes_find(plan, &all, NULL), MHO_OK);
  if (junction.has_homo && junction.has_lumo && junction.lumo_ev - junction.homo_ev > 0.01)
    found += check_interval(path, plan, &all, junction.homo_ev, junction.lumo_ev);
  found += check_interval(path, plan, &all, -4.1, 3.7); /* across levels */
  mho_nodes_clear(&all);
  mho_plan_free(plan);
  mho_junction_clear(&junction);
  mho_molecule_clear(&molecule);
  return found;
}

static void bundled_molecules_agree_with_all_nodes(void **state)
{
  (void)state;
  glob_t files;
  size_t found = 0;
  assert_int_equal(glob(MHO_TEST_PHYSICS "/../../molecules/*.yaml", 0, NULL, &files), 0);
  for (size_t i = 0; i < files.gl_pathc; i++) found += check_file(files.gl_pathv[i]);
  print_message("%zu molecules, %zu nodes\n", files.gl_pathc, found);
  assert_true(found > 100);
  globfree(&files);
}

typedef struct {
  int sites;
  double h[SITES_MAX * SITES_MAX];
} graph;

static void join(graph *g, int i, int j, double hopping)
{
  g->h[i * g->sites + j] = g->h[j * g->sites + i] = hopping;
}

static mho_plan *junction_plan(graph *g, int left, int right)
{
  double zero = 0, gamma = 0.5, vector[2][SITES_MAX] = {{0}};
  vector[0][left] = vector[1][right] = 1;
  raw r = {g->sites, g->h, {{1, &gamma, &zero, vector[0], NULL}, {1, &gamma, &zero, vector[1], NULL}}};
  return plan_of(&r, false, false);
}

static unsigned long long state_of_random = 7;

static double uniform(void)
{
  state_of_random = state_of_random * 6364136223846793005ULL + 1442695040888963407ULL;
  return (double)(state_of_random >> 11) * 0x1p-53;
}

static void random_graph(graph *g, bool equal)
{
  for (int i = 0; i < g->sites; i++)
    g->h[i * g->sites + i] = equal || uniform() < 0.7 ? 0 : -2 * uniform();
  for (int i = 1; i < g->sites; i++)
    join(g, (int)(uniform() * i), i, equal ? -2.5 : -2 - uniform());
  for (int k = 0; k < 4; k++) {
    int i = (int)(uniform() * g->sites), j = (int)(uniform() * g->sites);
    if (i != j) join(g, i, j, equal ? -2.5 : -2 - uniform());
  }
}

static void random_graphs_agree_with_all_nodes(void **state)
{
  (void)state;
  size_t found = 0;
  for (int trial = 0; trial < 200; trial++) {
    graph g = {.sites = 4 + trial % 21};
    random_graph(&g, trial % 4 == 0);
    mho_plan *plan = junction_plan(&g, 0, 1 + (int)(uniform() * (g.sites - 1)));
    mho_nodes all;
    assert_int_equal(mho_nodes_find(plan, &all, NULL), MHO_OK);
    double low = -6 + 5 * uniform();
    found += check_interval("random graph", plan, &all, low, low + 4 * uniform() + 0.1);
    for (int k = trial % g.sites; k + 1 < g.sites; k += 3) { /* between two levels */
      double gap = plan->level_ev[k + 1] - plan->level_ev[k];
      if (gap > 0.01)
        found += check_interval("random gap", plan, &all, plan->level_ev[k], plan->level_ev[k + 1]);
    }
    mho_nodes_clear(&all);
    mho_plan_free(plan);
  }
  print_message("%zu nodes\n", found);
  assert_true(found > 400);
}

/* Sites that hang on the only path, all of one energy, are one zero of that
 * order; two a little apart are two. */
static void touching_zeros_are_counted(void **state)
{
  (void)state;
  for (int order = 1; order <= 6; order++) {
    graph g = {.sites = 2 * order + 2};
    int chain = order + 2;
    for (int i = 0; i + 1 < chain; i++) join(&g, i, i + 1, -2.7);
    for (int k = 0; k < order; k++) {
      join(&g, 1 + k, chain + k, -0.8);
      g.h[(chain + k) * g.sites + chain + k] = 0.7;
    }
    mho_plan *plan = junction_plan(&g, 0, chain - 1);
    mho_nodes nodes = between(plan, 0.6, 0.8);
    assert_int_equal(nodes.zeros, order);
    assert_int_equal(nodes.count, 1);
    assert_near(nodes.node[0].energy_ev, 0.7, 1e-14);
    mho_nodes_clear(&nodes);
    mho_plan_free(plan);
  }
  for (double apart = 1e-2; apart > 2e-12; apart /= 10) {
    graph g = {.sites = 6};
    for (int i = 0; i < 3; i++) join(&g, i, i + 1, -2.7);
    join(&g, 1, 4, -0.8);
    join(&g, 2, 5, -0.8);
    g.h[4 * 6 + 4] = 0.7;
    g.h[5 * 6 + 5] = 0.7 + apart;
    mho_plan *plan = junction_plan(&g, 0, 3);
    mho_nodes nodes = between(plan, 0.5, 0.9);
    if (nodes.count != 2) fail_msg("%zu nodes for two %g eV apart", nodes.count, apart);
    assert_near(nodes.node[0].energy_ev, 0.7, 1e-11);
    assert_near(nodes.node[1].energy_ev, 0.7 + apart, 1e-11);
    mho_nodes_clear(&nodes);
    mho_plan_free(plan);
  }
}

static void no_interval_is_refused(void **state)
{
  (void)state;
  graph g = {.sites = 2};
  join(&g, 0, 1, -2.7);
  mho_plan *plan = junction_plan(&g, 0, 1);
  mho_nodes nodes;
  assert_int_equal(mho_nodes_between(plan, 1, 1, &nodes, NULL), MHO_ERR_RANGE);
  assert_int_equal(mho_nodes_between(plan, 0, NAN, &nodes, NULL), MHO_ERR_RANGE);
  mho_plan_free(plan);
}

int main(void)
{
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(bundled_molecules_agree_with_all_nodes),
      cmocka_unit_test(random_graphs_agree_with_all_nodes),
      cmocka_unit_test(touching_zeros_are_counted),
      cmocka_unit_test(no_interval_is_refused),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
