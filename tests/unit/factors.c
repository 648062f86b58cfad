/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Nodes of molecules that fall apart at cut sites, against the search of the whole
 * in 113 bits, which knows nothing of links; few different numbers, so that links
 * have zeros in common, and states between them cancel.
 */
#include "junctions.h"

#include <mho/nodes.h>

#include "solver/factors.h"

#define BETA (-2.5) /* and its quarters are doubles: what is equal is so exactly */

enum { SITES_MAX = 200 };

typedef struct {
  int sites, left, right, tail; /* tail: where it grows */
  double h[SITES_MAX][SITES_MAX];
  double vector[2][SITES_MAX]; /* all 0: the sites left and right */
} molecule;

static unsigned long long state_of_random = 7;

static int below(int n)
{
  state_of_random = state_of_random * 6364136223846793005ULL + 1442695040888963407ULL;
  return (int)((state_of_random >> 33) % (unsigned)n);
}

static double hopping(void) { return (const double[]){BETA, BETA, BETA, 0.75 * BETA}[below(4)]; }

static double onsite(void) { return (const double[]){0, 0, 0, BETA, 0.5 * BETA}[below(5)]; }

static void join(molecule *m, int i, int j, double value) { m->h[i][j] = m->h[j][i] = value; }

static int add_site(molecule *m, int to, double energy, double value)
{
  int i = m->sites++;
  m->h[i][i] = energy;
  if (to >= 0) join(m, to, i, value);
  return i;
}

/* A ring joined to a site; its first site hangs on it. */
static int add_ring(molecule *m, int to, int size, bool plain)
{
  int first = m->sites;
  double value = plain ? BETA : hopping();
  for (int k = 0; k < size; k++) add_site(m, k ? m->sites - 1 : to, plain ? 0 : onsite(), value);
  join(m, first, m->sites - 1, value);
  return first;
}

/* Rings, sites, fused corners and side groups, one after the other. */
static void grow(int most, molecule *grown)
{
  molecule m = {0};
  m.left = m.tail = add_site(&m, -1, 0, 0);
  bool plain = below(2);
  while (m.sites < most) {
    int what = below(6), size = plain ? 6 : 3 + below(4);
    if (m.sites + size > most) what = 1 + below(2);
    if (what == 0) m.tail = add_ring(&m, m.tail, size, plain) + 1 + below(size - 1);
    else if (what < 3) m.tail = add_site(&m, m.tail, plain ? 0 : onsite(), hopping());
    else if (what == 3) add_ring(&m, m.tail, size, plain);
    else if (what == 4) add_site(&m, m.tail, plain ? 0 : onsite(), BETA);
    else if (m.tail > 0) { /* a ring that shares its corner */
      int first = m.tail, last = m.tail;
      for (int k = 1; k < size; k++) last = add_site(&m, last, 0, BETA);
      join(&m, first, last, BETA);
      m.tail = last - below(size - 1);
    }
  }
  m.right = m.tail;
  m.vector[0][m.left] = m.vector[1][m.right] = 1;
  *grown = m;
}

/* How: by links (empty if not sure), by the program's choice, in 113 bits. */
typedef enum { LINKS, CHOICE, EXTENDED } way;

static mho_nodes nodes_of(const molecule *m, way how, double gamma)
{
  double zero = 0;
  mho_lead lead[2] = {{1, &gamma, &zero, (double *)m->vector[0], NULL},
                      {1, &gamma, &zero, (double *)m->vector[1], NULL}};
  size_t n = (size_t)m->sites, entries = 0;
  double *h = calloc(n * n, sizeof *h);
  mho_entry *entry = malloc(n * n * sizeof *entry);
  for (int i = 0; i < m->sites; i++)
    for (int j = 0; j < m->sites; j++) {
      h[(size_t)i * n + (size_t)j] = m->h[i][j];
      if (i <= j && m->h[i][j] != 0) entry[entries++] = (mho_entry){i, j, m->h[i][j]};
    }
  mho_plan *plan = NULL;
  raw r = {m->sites, h, {lead[0], lead[1]}};
  if (how != EXTENDED) plan = plan_of(&r, false, false);
  else {
    assert_int_equal(mho_plan_create_sparse(m->sites, entry, entries, &lead[0], &lead[1], &plan, NULL),
                     MHO_OK);
    free(plan->pair);
    plan->pair = NULL; /* its levels are not to be used */
  }
  mho_nodes nodes;
  mho_error error;
  mho_error_init(&error);
  bool sure;
  mho_exact_counts counts;
  mho_status status = MHO_OK;
  if (how != LINKS) status = mho_nodes_find(plan, &nodes, &error);
  else {
    nodes = (mho_nodes){0};
    assert_int_equal(mho_exact_count(plan, &counts), MHO_OK);
    status = mho_factors_find(plan, &counts, false, &nodes, &sure, &error);
  }
  if (status != MHO_OK) fail_msg("%s", error.cause[0].message);
  mho_plan_free(plan);
  free(h);
  free(entry);
  return nodes;
}

static void show(const char *name, const mho_nodes *nodes)
{
  print_message("%s: %d zeros, %d unseen\n", name, nodes->zeros, nodes->unseen);
  for (size_t k = 0; k < nodes->count; k++)
    print_message("  %.17g %.17g order %d\n", nodes->node[k].energy_ev,
                  nodes->node[k].imaginary_ev, nodes->node[k].order);
}

static void check_same(const mho_nodes *a, const mho_nodes *b, double tolerance)
{
  bool same = a->count == b->count && a->unseen == b->unseen && a->zeros == b->zeros &&
              a->everywhere == b->everywhere;
  for (size_t k = 0; same && k < a->count; k++) {
    const mho_node *p = &a->node[k], *q = &b->node[k];
    same = p->order == q->order && p->kind == q->kind &&
           fabs(p->energy_ev - q->energy_ev) <= tolerance &&
           fabs(p->imaginary_ev - q->imaginary_ev) <= tolerance;
  }
  if (same) return;
  show("one way", a);
  show("the other", b);
  fail_msg("nodes differ");
}

static int trials = 400;

static void links_give_what_the_whole_gives(void **state)
{
  (void)state;
  static molecule m;
  int high = 0, unseen = 0, linked = 0;
  for (int trial = 0; trial < trials; trial++) {
    grow(4 + trial % 30, &m);
    if (trial % 5 == 0 && m.sites > 2) { /* contacts of several sites, coupled as one */
      m.vector[0][1] = 0.5;
      m.vector[1][m.sites - 2] = -0.25;
    }
    mho_nodes nodes = nodes_of(&m, CHOICE, 0.5), whole = nodes_of(&m, EXTENDED, 0.5);
    mho_nodes links = nodes_of(&m, LINKS, 0.5);
    check_same(&nodes, &whole, 2e-14);
    for (size_t k = 0; k < nodes.count; k++) high += nodes.node[k].order > 2;
    unseen += nodes.unseen > 0;
    linked += links.node != NULL;
    mho_nodes_clear(&nodes);
    mho_nodes_clear(&whole);
    mho_nodes_clear(&links);
  }
  print_message("%d nodes of order 3 and more, %d of %d molecules with unseen states, %d by links\n",
                high, unseen, trials, linked);
  assert_true(linked > trials * 9 / 10 && high > trials / 5 && unseen > trials / 3);
}

/* Sites in another order, the contacts exchanged. */
static void renumber(const molecule *m, molecule *other)
{
  int to[SITES_MAX];
  *other = (molecule){.sites = m->sites};
  for (int i = 0; i < m->sites; i++) {
    int j = below(i + 1);
    to[i] = to[j];
    to[j] = i;
  }
  for (int i = 0; i < m->sites; i++) {
    for (int side = 0; side < 2; side++) other->vector[side][to[i]] = m->vector[!side][i];
    for (int j = 0; j < m->sites; j++) other->h[to[i]][to[j]] = m->h[i][j];
  }
}

static void numbering_direction_and_coupling_do_not_matter(void **state)
{
  (void)state;
  static molecule m, other;
  for (int trial = 0; trial < 60; trial++) {
    grow(10 + trial, &m);
    mho_nodes nodes = nodes_of(&m, CHOICE, 0.5), weak = nodes_of(&m, CHOICE, 1e-6);
    renumber(&m, &other);
    mho_nodes same = nodes_of(&other, CHOICE, 0.5);
    check_same(&nodes, &weak, 0);
    check_same(&nodes, &same, 4e-15);
    mho_nodes_clear(&nodes);
    mho_nodes_clear(&weak);
    mho_nodes_clear(&same);
  }
}

/* g_13 of benzene is E (E^2 - beta^2) over its determinant: rings in a row make a node
 * as often as there are rings, at alpha and at alpha +- beta. */
static void meta_rings_have_nodes_of_their_number(void **state)
{
  (void)state;
  static molecule m;
  for (int rings = 1; rings <= 33; rings += 8) {
    memset(&m, 0, sizeof m);
    for (int r = 0; r < rings; r++) m.tail = add_ring(&m, r ? m.tail : -1, 6, true) + 2;
    m.vector[0][0] = m.vector[1][m.tail] = 1;
    mho_nodes nodes = nodes_of(&m, CHOICE, 0.5);
    assert_int_equal(nodes.count, 3);
    for (int k = 0; k < 3; k++) {
      assert_near(nodes.node[k].energy_ev, (k - 1) * -BETA, 1e-15);
      assert_int_equal(nodes.node[k].order, rings);
    }
    mho_nodes_clear(&nodes);
  }
}

/* A path of sites of which two, with one between, carry equal groups: both block at
 * their energy, and a state of both groups and the site between, of that energy too,
 * is seen by no contact.  With another site between it is not one. */
static void a_state_between_two_groups_cancels(void **state)
{
  (void)state;
  static molecule m;
  for (int other = 0; other < 2; other++) {
    memset(&m, 0, sizeof m);
    for (int i = 0; i < 5; i++) m.tail = add_site(&m, i - 1, i == 2 ? 1.5 + other : 0, BETA);
    add_site(&m, 1, 1.5, BETA);
    add_site(&m, 3, 1.5, 0.5 * BETA);
    m.vector[0][0] = m.vector[1][4] = 1;
    mho_nodes nodes = nodes_of(&m, LINKS, 0.5);
    assert_int_equal(nodes.count, 1);
    assert_int_equal(nodes.unseen, !other);
    assert_int_equal(nodes.node[0].order, 1 + other);
    assert_near(nodes.node[0].energy_ev, 1.5, 0);
    mho_nodes_clear(&nodes);
  }
}

/* Zigzag edges have levels and zeros 1e-7 eV and less from alpha; too large for 113 bits. */
static void flake_of_400_sites_has_all_its_nodes(void **state)
{
  (void)state;
  enum { WIDE = 20, SITES = 400 };
  double *h = calloc(SITES * SITES, sizeof *h), gamma = 0.5, zero = 0;
  double *vector = calloc(2 * SITES, sizeof *vector);
  for (int i = 0; i < SITES; i++) {
    bool right = i % WIDE + 1 < WIDE, up = i + WIDE < SITES && (i % WIDE + i / WIDE) % 2 == 0;
    if (right) h[i * SITES + i + 1] = h[(i + 1) * SITES + i] = -2.7;
    if (up) h[i * SITES + i + WIDE] = h[(i + WIDE) * SITES + i] = -2.7;
  }
  vector[0] = vector[2 * SITES - 1] = 1;
  raw r = {SITES, h, {{1, &gamma, &zero, vector, NULL}, {1, &gamma, &zero, vector + SITES, NULL}}};
  mho_plan *plan = plan_of(&r, false, false);
  mho_nodes nodes;
  int zeros = 0;
  assert_int_equal(mho_nodes_find(plan, &nodes, NULL), MHO_OK);
  for (size_t k = 0; k < nodes.count; k++)
    zeros += nodes.node[k].order * (nodes.node[k].kind == MHO_NODE_DIP ? 2 : 1);
  assert_int_equal(zeros, nodes.zeros);
  assert_int_equal(nodes.zeros + nodes.unseen, SITES - 1 - 38); /* 38 bonds between the corners */
  mho_nodes_clear(&nodes);
  mho_plan_free(plan);
  free(h);
  free(vector);
}

int main(int argc, char **argv)
{
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(links_give_what_the_whole_gives),
      cmocka_unit_test(numbering_direction_and_coupling_do_not_matter),
      cmocka_unit_test(meta_rings_have_nodes_of_their_number),
      cmocka_unit_test(a_state_between_two_groups_cancels),
      cmocka_unit_test(flake_of_400_sites_has_all_its_nodes),
  };
  if (argc > 1) trials = atoi(argv[1]);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
