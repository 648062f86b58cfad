/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Nodes against closed forms: a site that hangs on the only path blocks it at
 * its own energy; benzene and azulene from the Green's function of Hueckel
 * theory; and against T itself on random graphs.
 */
#include "junctions.h"

#include <mho/nodes.h>

#define BETA (-2.7)

enum { SITES_MAX = 64 };

typedef struct {
  int sites;
  double h[SITES_MAX * SITES_MAX];
} graph;

static void join(graph *g, int i, int j, double hopping)
{
  g->h[i * g->sites + j] = g->h[j * g->sites + i] = hopping;
}

/* Contacts of one site each. */
static mho_plan *junction_plan(const graph *g, int left, int right, double gamma)
{
  double zero = 0, vector[2][SITES_MAX] = {{0}};
  vector[0][left] = vector[1][right] = 1;
  raw r = {g->sites, (double *)g->h, {{1, &gamma, &zero, vector[0], NULL}, {1, &gamma, &zero, vector[1], NULL}}};
  return plan_of(&r, false, false);
}

static mho_nodes find(const mho_plan *plan)
{
  mho_nodes nodes;
  mho_error error;
  mho_error_init(&error);
  if (mho_nodes_find(plan, &nodes, &error) != MHO_OK) fail_msg("%s", error.cause[0].message);
  return nodes;
}

static int total_order(const mho_nodes *nodes)
{
  int sum = 0;
  for (size_t k = 0; k < nodes->count; k++)
    sum += nodes->node[k].order * (nodes->node[k].kind == MHO_NODE_DIP ? 2 : 1);
  return sum;
}

static void check_energies(const graph *g, int left, int right, const double *expected,
                           size_t count, int unseen)
{
  mho_plan *plan = junction_plan(g, left, right, 0.5);
  mho_nodes nodes = find(plan);
  assert_int_equal(nodes.count, count);
  assert_int_equal(nodes.unseen, unseen);
  assert_int_equal(total_order(&nodes), nodes.zeros);
  for (size_t k = 0; k < count; k++) assert_near(nodes.node[k].energy_ev, expected[k], 1e-14);
  mho_nodes_clear(&nodes);
  mho_plan_free(plan);
}

static void ring(graph *g, int first, int size)
{
  for (int k = 0; k < size; k++) join(g, first + k, first + (k + 1) % size, BETA);
}

/* Meta position: g_13 = 0 at alpha (T. Tada and K. Yoshizawa, ChemPhysChem 3,
 * 1035 (2002)); the pairs at alpha +- beta block too, as both contacts fix them. */
static void benzene_blocks_in_meta_position_only(void **state)
{
  (void)state;
  graph g = {.sites = 6};
  ring(&g, 0, 6);
  check_energies(&g, 0, 2, (double[]){BETA, 0, -BETA}, 3, 0);
  check_energies(&g, 0, 3, NULL, 0, 2);
}

/* Azulene, sites 1 2 3 3a 4 5 6 7 8 8a: contacts 2,6 have no node that is not
 * cancelled by a state neither sees; 5,7 have alpha and 0.375 |beta| above. */
static void azulene_nodes_are_where_they_should_be(void **state)
{
  (void)state;
  graph g = {.sites = 10};
  ring(&g, 0, 10);
  join(&g, 3, 9, BETA);
  check_energies(&g, 1, 6, NULL, 0, 4);
  mho_plan *plan = junction_plan(&g, 5, 7, 0.5);
  mho_nodes nodes = find(plan);
  bool alpha = false, above = false;
  for (size_t k = 0; k < nodes.count; k++) {
    alpha |= nodes.node[k].kind == MHO_NODE_EXACT && nodes.node[k].energy_ev == 0.0;
    above |= nodes.node[k].kind == MHO_NODE_EXACT &&
             fabs(nodes.node[k].energy_ev / BETA + 0.375) < 5e-4;
  }
  assert_true(alpha && above);
  mho_nodes_clear(&nodes);
  mho_plan_free(plan);
}

/* A chain whose inner sites each carry a side site: P is the product of
 * E - eps over the side sites, here all of one energy. */
static void many_side_sites_make_one_node_of_high_order(void **state)
{
  (void)state;
  for (int order = 1; order <= 8; order++) {
    graph g = {.sites = 2 * order + 2};
    int chain = order + 2;
    for (int i = 0; i + 1 < chain; i++) join(&g, i, i + 1, BETA);
    for (int k = 0; k < order; k++) {
      join(&g, 1 + k, chain + k, 0.3 * BETA);
      g.h[(chain + k) * g.sites + chain + k] = 0.7;
    }
    mho_plan *plan = junction_plan(&g, 0, chain - 1, 0.1);
    mho_nodes nodes = find(plan);
    assert_int_equal(nodes.count, 1);
    assert_int_equal(nodes.node[0].order, order);
    assert_int_equal(nodes.node[0].kind, MHO_NODE_EXACT);
    assert_near(nodes.node[0].energy_ev, 0.7, 1e-14);
    mho_nodes_clear(&nodes);
    mho_plan_free(plan);
  }
}

/* A side chain of two sites blocks at its own levels eps +- t. */
static void side_chain_blocks_at_its_levels(void **state)
{
  (void)state;
  graph g = {.sites = 5};
  join(&g, 0, 1, BETA);
  join(&g, 1, 2, BETA);
  join(&g, 1, 3, 1.5);
  join(&g, 3, 4, 0.25);
  g.h[3 * 5 + 3] = g.h[4 * 5 + 4] = 1.0;
  check_energies(&g, 0, 2, (double[]){0.75, 1.25}, 2, 0);
}

/* Two ways of one and three bonds: a t^3 + t (E^2 - t^2) of opposite sign in
 * the direct hopping s gives s E^2 = s t^2 + t^3, for s < 0 < t a pair E = +-i x. */
static void opposite_paths_make_a_dip(void **state)
{
  (void)state;
  graph g = {.sites = 4};
  join(&g, 0, 1, 1.0);
  join(&g, 1, 2, 1.0);
  join(&g, 2, 3, 1.0);
  join(&g, 0, 3, -0.5); /* P = t^3 + s (E^2 - t^2) = 0: E^2 = 1 - 1/s = 3 */
  check_energies(&g, 0, 3, (double[]){-sqrt(3.0), sqrt(3.0)}, 2, 0);
  join(&g, 0, 3, 0.5); /* E^2 = -1 */
  mho_plan *plan = junction_plan(&g, 0, 3, 0.5);
  mho_nodes nodes = find(plan);
  assert_int_equal(nodes.count, 1);
  assert_int_equal(nodes.node[0].kind, MHO_NODE_DIP);
  assert_near(nodes.node[0].energy_ev, 0.0, 1e-14);
  assert_near(nodes.node[0].imaginary_ev, 1.0, 1e-14);
  mho_nodes_clear(&nodes);
  mho_plan_free(plan);
}

static unsigned long long state_of_random = 1;

static double uniform(void)
{
  state_of_random = state_of_random * 6364136223846793005ULL + 1442695040888963407ULL;
  return (double)(state_of_random >> 11) * 0x1p-53;
}

/* A tree with some rings; returns the number of bonds between the contacts. */
static void random_graph(graph *g)
{
  for (int i = 0; i < g->sites; i++) g->h[i * g->sites + i] = uniform() < 0.5 ? 0 : BETA * uniform();
  for (int i = 1; i < g->sites; i++) {
    int from = i - 1 - (int)(uniform() * (i < 4 ? i : 4));
    join(g, from < 0 ? 0 : from, i, BETA * (0.7 + 0.5 * uniform()));
  }
  for (int k = 0; k < 3; k++) {
    int i = (int)(uniform() * g->sites), j = (int)(uniform() * g->sites);
    if (i != j) join(g, i, j, BETA * (0.7 + 0.5 * uniform()));
  }
}

static int distance(const graph *g, int from, int to)
{
  int length[SITES_MAX], queue[SITES_MAX], head = 0, tail = 0;
  for (int i = 0; i < g->sites; i++) length[i] = -1;
  length[queue[tail++] = from] = 0;
  for (; head < tail; head++)
    for (int j = 0; j < g->sites; j++)
      if (length[j] < 0 && g->h[queue[head] * g->sites + j] != 0) {
        length[j] = length[queue[head]] + 1;
        queue[tail++] = j;
      }
  return length[to];
}

/* T at the double next to a node, 1e-16 away, against T 1e-12 away. */
static void check_transmission(const mho_plan *plan, const mho_node *node, size_t which)
{
  mho_point here = at(plan, node->energy_ev), beside = at(plan, node->energy_ev + 1e-12);
  double depth = here.node ? INFINITY : beside.log10_transmission - here.log10_transmission;
  if (!(depth > 5.0 * node->order))
    fail_msg("node %zu at %.17g: T falls by %g decades only", which, node->energy_ev, depth);
}

/* The same H by its entries alone, which are solved in 113 bits throughout. */
static void check_extended(const graph *g, int right, const mho_nodes *nodes)
{
  mho_entry entry[SITES_MAX * 8];
  size_t entries = 0;
  for (int i = 0; i < g->sites; i++)
    for (int j = i; j < g->sites; j++)
      if (g->h[i * g->sites + j] != 0)
        entry[entries++] = (mho_entry){i, j, g->h[i * g->sites + j]};
  double gamma = 0.5, zero = 0, vector[2][SITES_MAX] = {{1}};
  vector[1][right] = 1;
  mho_lead left = {1, &gamma, &zero, vector[0], NULL}, other = {1, &gamma, &zero, vector[1], NULL};
  mho_plan *plan;
  assert_int_equal(mho_plan_create_sparse(g->sites, entry, entries, &left, &other, &plan, NULL), MHO_OK);
  free(plan->pair);
  plan->pair = NULL; /* its levels are not to be used */
  mho_nodes extended = find(plan);
  assert_int_equal(nodes->count, extended.count);
  assert_int_equal(nodes->unseen, extended.unseen);
  for (size_t k = 0; k < nodes->count; k++) {
    assert_int_equal(nodes->node[k].order, extended.node[k].order);
    assert_near(nodes->node[k].energy_ev, extended.node[k].energy_ev, 2e-15);
    assert_near(nodes->node[k].imaginary_ev, extended.node[k].imaginary_ev, 2e-15);
  }
  mho_nodes_clear(&extended);
  mho_plan_free(plan);
}

/* P has degree N - 1 less the bonds between the contacts, less what neither
 * sees; its zeros are the same for every Gamma, and T vanishes there. */
static void random_graphs_have_all_their_nodes(void **state)
{
  (void)state;
  int exact = 0, dips = 0;
  for (int trial = 0; trial < 60; trial++) {
    graph g = {.sites = 3 + trial / 2};
    random_graph(&g);
    int right = 1 + (int)(uniform() * (g.sites - 1));
    mho_plan *weak = junction_plan(&g, 0, right, 1e-6), *strong = junction_plan(&g, 0, right, 2.0);
    mho_nodes nodes = find(weak), same = find(strong);
    assert_int_equal(nodes.zeros + nodes.unseen, g.sites - 1 - distance(&g, 0, right));
    assert_int_equal(total_order(&nodes), nodes.zeros);
    assert_int_equal(nodes.count, same.count);
    check_extended(&g, right, &nodes);
    for (size_t k = 0; k < nodes.count; k++) {
      assert_near(nodes.node[k].energy_ev, same.node[k].energy_ev, 0);
      bool real = nodes.node[k].kind == MHO_NODE_EXACT;
      *(real ? &exact : &dips) += 1;
      if (real) check_transmission(weak, &nodes.node[k], k);
      if (real) check_transmission(strong, &nodes.node[k], k);
    }
    mho_nodes_clear(&nodes);
    mho_nodes_clear(&same);
    mho_plan_free(weak);
    mho_plan_free(strong);
  }
  print_message("%d exact nodes, %d dips\n", exact, dips);
  assert_true(exact > 300 && dips > 20);
}

/* Two channels on one side: minima of T instead. */
static void independent_channels_report_minima(void **state)
{
  (void)state;
  graph g = {.sites = 6};
  ring(&g, 0, 6);
  double gamma[2] = {0.5, 0.5}, zero[2] = {0}, left[12] = {[0] = 1, [6 + 1] = 1};
  double right[6] = {0, 0, 0, 1};
  raw r = {6, g.h, {{2, gamma, zero, left, NULL}, {1, gamma, zero, right, NULL}}};
  mho_plan *plan = plan_of(&r, false, false);
  mho_nodes nodes = find(plan);
  assert_true(nodes.count > 0);
  for (size_t k = 0; k < nodes.count; k++) {
    double energy = nodes.node[k].energy_ev, low = at(plan, energy).log10_transmission;
    assert_int_equal(nodes.node[k].kind, MHO_NODE_MINIMUM);
    assert_true(at(plan, energy - 1e-4).log10_transmission > low);
    assert_true(at(plan, energy + 1e-4).log10_transmission > low);
  }
  mho_nodes_clear(&nodes);
  mho_plan_free(plan);
}

/* A grid for a plot holds every node, and every resonance however narrow. */
static void grid_misses_no_node_and_no_resonance(void **state)
{
  (void)state;
  graph g = {.sites = 6};
  ring(&g, 0, 6);
  mho_plan *plan = junction_plan(&g, 0, 2, 1e-6);
  double *energy = NULL;
  size_t count;
  assert_int_equal(mho_energy_grid(plan, -6, 6, 101, &energy, &count, NULL), MHO_OK);
  double nearest = INFINITY;
  mho_point *point = malloc(count * sizeof *point);
  assert_int_equal(mho_transmission_sweep(plan, count, energy, point, NULL), MHO_OK);
  double top = 0;
  for (size_t i = 0; i < count; i++) {
    nearest = fmin(nearest, fabs(energy[i]));
    if (fabs(energy[i] - 5.4) < 1e-3) top = fmax(top, point[i].transmission);
  }
  assert_near(nearest, 0, 0);
  assert_true(top > 0.99);
  free(energy);
  free(point);
  mho_plan_free(plan);
}

/* Widths of poles are the shares of the two contacts, also far below what the
 * eigenvalue itself resolves; a state at one contact only has one share. */
static void pole_widths_are_shared_by_the_contacts(void **state)
{
  (void)state;
  graph g = {.sites = 3};
  g.h[0] = -1.0;
  g.h[4] = 0.5;
  g.h[8] = 2.0;
  join(&g, 1, 2, 1e-6);
  mho_plan *plan = junction_plan(&g, 1, 2, 1e-3);
  mho_pole pole[3];
  assert_int_equal(mho_poles(plan, pole, NULL), MHO_OK);
  assert_near(pole[0].width_ev, 0, 0);
  assert_close(pole[1].left_width_ev, 1e-3, 1e-9);
  assert_close(pole[1].right_width_ev, 1e-3 * 1e-12 / 2.25, 1e-4); /* t^2 / (gap)^2 */
  mho_plan_free(plan);
}

int main(void)
{
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(benzene_blocks_in_meta_position_only),
      cmocka_unit_test(azulene_nodes_are_where_they_should_be),
      cmocka_unit_test(many_side_sites_make_one_node_of_high_order),
      cmocka_unit_test(side_chain_blocks_at_its_levels),
      cmocka_unit_test(opposite_paths_make_a_dip),
      cmocka_unit_test(random_graphs_have_all_their_nodes),
      cmocka_unit_test(independent_channels_report_minima),
      cmocka_unit_test(grid_misses_no_node_and_no_resonance),
      cmocka_unit_test(pole_widths_are_shared_by_the_contacts),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
