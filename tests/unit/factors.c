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

enum { SITES_MAX = 60 };

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
static molecule grow(int most)
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
  return m;
}

/* How: by links (empty if not sure), by the program's choice, in 113 bits. */
typedef enum { LINKS, CHOICE, EXTENDED } way;

static mho_nodes nodes_of(const molecule *m, way how)
{
  double gamma = 0.5, zero = 0;
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
  else
    assert_int_equal(mho_plan_create_sparse(m->sites, entry, entries, &lead[0], &lead[1], &plan, NULL),
                     MHO_OK);
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
  int high = 0, unseen = 0, linked = 0;
  for (int trial = 0; trial < trials; trial++) {
    molecule m = grow(4 + trial % 30);
    mho_nodes nodes = nodes_of(&m, CHOICE), whole = nodes_of(&m, EXTENDED), links = nodes_of(&m, LINKS);
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
}

int main(int argc, char **argv)
{
  const struct CMUnitTest tests[] = {cmocka_unit_test(links_give_what_the_whole_gives)};
  if (argc > 1) trials = atoi(argv[1]);
  return cmocka_run_group_tests(tests, NULL, NULL);
}
