/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * All methods of the solver against each other and, on long chains, against
 * the closed form
 *   T = Gamma^2 t^(2N-2) / |p_N + i Gamma p_(N-1) - Gamma^2/4 p_(N-2)|^2,
 *   p_k = t^k sin((k+1)q)/sin(q), E = 2t cos(q)   (sinh and cosh outside the band).
 */
#include "random_junction.h"

#include <pthread.h>

#include <mho/nodes.h>

#define BETA (-2.7)

typedef struct {
  int points, settled[MHO_METHOD_COUNT];
  double worst;
} tally;

/* Every method from `first` on, within what both say of their errors. */
static void compare(mho_plan *plan, double energy, tally *count)
{
  size_t band = plan->band;
  plan->first = MHO_METHOD_EXTENDED;
  plan->band = 0;
  mho_point exact = at(plan, energy);
  for (int first = MHO_METHOD_SPECTRUM; first < MHO_METHOD_COUNT; first++)
    for (int banded = 0; banded < 2; banded++) {
      plan->first = (mho_method)first;
      plan->band = banded ? plan->bandwidth : 0;
      mho_point point = at(plan, energy);
      count->points++;
      count->settled[point.method]++;
      assert_true(isfinite(point.transmission) && isfinite(point.log10_transmission));
      if (exact.node || point.node) {
        assert_true(exact.transmission < 1e-28 && point.transmission < 1e-28);
        continue;
      }
      double off = fabs(point.log10_transmission - exact.log10_transmission) * 2.302585092994046;
      if (exact.transmission > 1e-290)
        off = fabs(point.transmission - exact.transmission) / exact.transmission;
      double allowed = point.relative_error + exact.relative_error + 1e-15 +
                       (exact.transmission > 1e-290 ? 0 : 1e-15 * fabs(exact.log10_transmission));
      count->worst = fmax(count->worst, off);
      if (!(off <= allowed) || (!point.unresolved && !(point.relative_error <= 1e-10)))
        fail_msg("%d sites, E %.17g, method %d: T %.17g against %.17g, off by %g, bound %g",
                 plan->sites, energy, point.method, point.transmission, exact.transmission, off,
                 point.relative_error);
    }
  plan->first = MHO_METHOD_NO_PATH;
  plan->band = band;
}

/* The same junction by its non-zero entries. */
static mho_plan *sparse_plan_of(const raw *r)
{
  size_t n = (size_t)r->sites, count = 0;
  mho_entry *entry = malloc(n * n * sizeof *entry);
  mho_plan *plan = NULL;
  for (size_t i = 0; i < n; i++)
    for (size_t j = i; j < n; j++)
      if (r->h[i * n + j] != 0) entry[count++] = (mho_entry){(int)i, (int)j, r->h[i * n + j]};
  assert_int_equal(
      mho_plan_create_sparse(r->sites, entry, count, &r->lead[0], &r->lead[1], &plan, NULL), MHO_OK);
  free(entry);
  return plan;
}

/* Zero pivots, a level, its flank, far away, a node. */
static void compare_at_special_energies(mho_plan *plan, double level, double flank, tally *count)
{
  double special[] = {0.0, BETA, level, level + flank, -1e6};
  for (size_t k = 0; k < sizeof special / sizeof *special; k++) compare(plan, special[k], count);
  mho_nodes nodes;
  assert_int_equal(mho_nodes_find(plan, &nodes, NULL), MHO_OK);
  if (nodes.count) compare(plan, nodes.node[nodes.count / 2].energy_ev, count);
  mho_nodes_clear(&nodes);
}

static void methods_agree_on_random_graphs(void **state)
{
  (void)state;
  tally count = {0};
  for (int trial = 0; trial < 63; trial++) {
    int sites = trial < 60 ? 2 + trial / 2 + (trial % 2) * 9 : 60 + 70 * (trial - 60);
    double gamma[2], zero = 0, *vectors = malloc(2 * (size_t)sites * sizeof(double));
    raw r = random_junction(sites, gamma, &zero, vectors);
    mho_plan *plan[2] = {plan_of(&r, false, false), sparse_plan_of(&r)};
    double level = plan[0]->level_ev[(size_t)(uniform() * sites)], energy = 8 * uniform() - 4;
    for (int given = 0; given < 2; given++) {
      compare(plan[given], energy, &count);
      if (sites < 100)
        compare_at_special_energies(plan[given], level, gamma[0] + gamma[1], &count);
      mho_plan_free(plan[given]);
    }
    free(r.h);
    free(vectors);
  }
  print_message("%d points, worst difference %.2g\n", count.points, count.worst);
  for (int m = MHO_METHOD_SPECTRUM; m < MHO_METHOD_COUNT; m++) {
    print_message("  %d by %s\n", count.settled[m], mho_method_name((mho_method)m));
    assert_true(m == MHO_METHOD_REPEAT || count.settled[m] > 50);
  }
}

/* A few sites, equal random units in a row, a few sites. */
static mho_plan *oligomer_plan(int unit, int units, int ends, double gamma[2])
{
  int n = unit * units + 2 * ends, in = (int)(unit * uniform()), out = (in + 1) % unit;
  double zero = 0, *vector = calloc(2 * (size_t)n, sizeof(double));
  mho_entry inner[64], *entry = malloc(64 * (size_t)n * sizeof *entry);
  int bonds = 0;
  size_t count = 0;
  for (int i = 0; i < unit; i++) {
    inner[bonds++] = (mho_entry){i, i, uniform() < 0.5 ? 0 : BETA * uniform()};
    for (int j = 0; j < i; j++)
      if (j == i - 1 || uniform() < 0.3) inner[bonds++] = (mho_entry){j, i, BETA * (0.8 + 0.4 * uniform())};
  }
  double joint = BETA * (0.8 + 0.4 * uniform());
  for (int u = 0; u < units; u++) {
    int first = ends + u * unit;
    for (int b = 0; b < bonds; b++)
      entry[count++] = (mho_entry){first + inner[b].i, first + inner[b].j, inner[b].value_ev};
    if (u + 1 < units) entry[count++] = (mho_entry){first + out, first + unit + in, joint};
  }
  for (int side = 0; side < 2; side++) {
    int start = side ? n - ends : 0;
    for (int i = 0; i + 1 < ends; i++)
      entry[count++] = (mho_entry){start + i, start + i + 1, BETA * (0.8 + 0.4 * uniform())};
    gamma[side] = pow(10, -6 + 7 * uniform());
    vector[side ? 2 * n - 1 : 0] = 1;
  }
  entry[count++] = (mho_entry){ends - 1, ends + in, BETA};
  entry[count++] = (mho_entry){ends + (units - 1) * unit + out, n - ends, BETA};
  mho_lead lead[2] = {{1, &gamma[0], &zero, vector, NULL}, {1, &gamma[1], &zero, vector + n, NULL}};
  mho_plan *plan;
  assert_int_equal(mho_plan_create_sparse(n, entry, count, &lead[0], &lead[1], &plan, NULL), MHO_OK);
  free(entry);
  free(vector);
  return plan;
}

/* Doubling against pivoted elimination in 113 bits, and by its own bound. */
static void equal_units_are_doubled(void **state)
{
  (void)state;
  int points = 0, doubled = 0;
  for (int trial = 0; trial < 40; trial++) {
    double gamma[2];
    int unit = 2 + trial % 5;
    mho_plan *plan = oligomer_plan(unit, 40 + trial % 9, 1 + trial % 4, gamma);
    assert_non_null(plan->repeat);
    for (int k = 0; k < 10; k++) {
      double energy = k == 0 ? 0 : k == 1 ? BETA : 12 * uniform() - 6;
      plan->first = MHO_METHOD_REPEAT;
      mho_point point = at(plan, energy);
      plan->first = MHO_METHOD_EXTENDED;
      mho_point exact = at(plan, energy);
      points++;
      doubled += point.method == MHO_METHOD_REPEAT;
      if (exact.node) continue;
      double off = 2.302585092994046 * fabs(point.log10_transmission - exact.log10_transmission);
      assert_true(off <= point.relative_error + exact.relative_error +
                             1e-15 * (1 + fabs(exact.log10_transmission)));
    }
    mho_plan_free(plan);
  }
  print_message("%d of %d points by doubling\n", doubled, points);
  assert_true(doubled > 9 * points / 10);
}

static mho_plan *chain_plan(int sites, double gamma)
{
  size_t n = (size_t)sites;
  mho_entry *entry = malloc(n * sizeof *entry);
  double zero = 0, *left = calloc(n, sizeof(double)), *right = calloc(n, sizeof(double));
  for (int i = 0; i + 1 < sites; i++) entry[i] = (mho_entry){i, i + 1, BETA};
  left[0] = right[n - 1] = 1;
  mho_lead lead[2] = {{1, &gamma, &zero, left, NULL}, {1, &gamma, &zero, right, NULL}};
  mho_plan *plan;
  assert_int_equal(mho_plan_create_sparse(sites, entry, n - 1, &lead[0], &lead[1], &plan, NULL),
                   MHO_OK);
  free(entry);
  free(left);
  free(right);
  return plan;
}

/* In the band; long double has the digits to take the sine of N q. */
static double chain_transmission(int sites, double gamma, double energy)
{
  long double t = BETA, q = acosl(energy / (2 * t)), p[3];
  for (int k = 0; k < 3; k++) p[k] = sinl((sites + 1 - k) * q) / sinl(q); /* p_(N-k) / t^(N-k) */
  long double re = p[0] - gamma * gamma / (4 * t * t) * p[2], im = gamma / t * p[1];
  return (double)(gamma * gamma / (t * t) / (re * re + im * im));
}

/* Outside: p_k = t^k e^(kq) (1 - e^(-2(k+1)q)) / (1 - e^(-2q)), up to its sign. */
static double chain_log10(int sites, double gamma, double energy)
{
  long double t = fabsl((long double)BETA), q = acoshl(fabsl(energy) / (2 * t)), p[3];
  for (int k = 0; k < 3; k++)
    p[k] = expl(-k * q) * (1 - expl(-2 * (sites + 1 - k) * q)) / (1 - expl(-2 * q));
  long double re = p[0] - gamma * gamma / (4 * t * t) * p[2], im = gamma / t * p[1];
  return (double)(log10l(gamma * gamma / (t * t) / (re * re + im * im)) -
                  2 * sites * q / logl(10.0L));
}

static void long_chains_follow_the_closed_form(void **state)
{
  (void)state;
  static const int length[] = {60, 1000, 10000, 100000};
  for (size_t k = 0; k < 4; k++) {
    mho_plan *plan = chain_plan(length[k], 0.5);
    mho_point inside = at(plan, 0.3), outside = at(plan, -5.6), middle = at(plan, 0.0);
    double exact = chain_transmission(length[k], 0.5, 0.3);
    print_message("%d sites: T %.12g by %s; log10 T %.12g by %s\n", length[k],
                  inside.transmission, mho_method_name(inside.method), outside.log10_transmission,
                  mho_method_name(outside.method));
    assert_close(inside.transmission, exact, 1e-10);
    assert_close(outside.log10_transmission, chain_log10(length[k], 0.5, -5.6), 1e-13);
    /* even chain at alpha, reference value T = 4y^2/(1+y^2)^2, y = Gamma / 2|beta| */
    double y = 0.5 / (2 * 2.7);
    assert_close(middle.transmission, 4 * y * y / ((1 + y * y) * (1 + y * y)), 1e-10);
    assert_true(!inside.unresolved && !outside.unresolved && !middle.unresolved);
    mho_plan_free(plan);
  }
}

/* Same doubles whatever else is in the call. */
static void results_do_not_depend_on_the_company(void **state)
{
  (void)state;
  enum { COUNT = 37 };
  mho_plan *plan = chain_plan(60, 1e-3);
  double energy[COUNT];
  mho_point together[COUNT];
  for (int i = 0; i < COUNT; i++) energy[i] = -6 + 12.0 * i / (COUNT - 1);
  assert_int_equal(mho_transmission_sweep(plan, COUNT, energy, together, NULL), MHO_OK);
  for (int i = 0; i < COUNT; i++) {
    mho_point alone = at(plan, energy[i]);
    assert_true(alone.log10_transmission == together[i].log10_transmission &&
                alone.method == together[i].method);
  }
  mho_plan_free(plan);
}

enum { SHARED_ENERGIES = 400, THREADS = 4 };

typedef struct {
  const mho_plan *plan;
  const double *energy;
  const mho_point *expected;
  int different;
} shared_work;

static void *sweep_many_times(void *argument)
{
  shared_work *work = argument;
  mho_point point[SHARED_ENERGIES];
  for (int repeat = 0; repeat < 20; repeat++) {
    if (mho_transmission_sweep(work->plan, SHARED_ENERGIES, work->energy, point, NULL) != MHO_OK)
      work->different++;
    for (int i = 0; i < SHARED_ENERGIES; i++)
      work->different += point[i].log10_transmission != work->expected[i].log10_transmission ||
                         point[i].method != work->expected[i].method;
  }
  return NULL;
}

static void threads_share_a_plan(void **state)
{
  (void)state;
  double gamma[2], zero = 0, vectors[2 * 40], energy[SHARED_ENERGIES];
  raw r = random_junction(40, gamma, &zero, vectors);
  mho_plan *plan = plan_of(&r, false, false);
  mho_point expected[SHARED_ENERGIES];
  for (int i = 0; i < SHARED_ENERGIES; i++) energy[i] = -4 + 8.0 * i / SHARED_ENERGIES;
  assert_int_equal(mho_transmission_sweep(plan, SHARED_ENERGIES, energy, expected, NULL), MHO_OK);
  pthread_t thread[THREADS];
  shared_work work[THREADS];
  for (int k = 0; k < THREADS; k++) {
    work[k] = (shared_work){plan, energy, expected, 0};
    assert_int_equal(pthread_create(&thread[k], NULL, sweep_many_times, &work[k]), 0);
  }
  for (int k = 0; k < THREADS; k++) {
    pthread_join(thread[k], NULL);
    assert_int_equal(work[k].different, 0);
  }
  mho_plan_free(plan);
  free(r.h);
}

static void sparse_plans_refuse_bad_entries(void **state)
{
  (void)state;
  double gamma = 1, zero = 0, vector[2] = {1, 0};
  mho_lead lead = {1, &gamma, &zero, vector, NULL}, none = {0};
  mho_plan *plan;
  mho_entry good = {0, 1, 1.0}, order = {1, 0, 1.0}, outside = {0, 2, 1.0}, bad = {0, 1, NAN};
  assert_int_equal(mho_plan_create_sparse(2, &order, 1, &lead, &lead, &plan, NULL), MHO_ERR_SIZE);
  assert_int_equal(mho_plan_create_sparse(2, &outside, 1, &lead, &lead, &plan, NULL), MHO_ERR_SIZE);
  assert_int_equal(mho_plan_create_sparse(2, &bad, 1, &lead, &lead, &plan, NULL),
                   MHO_ERR_NOT_FINITE);
  assert_int_equal(mho_plan_create_sparse(2, &good, 1, &lead, &none, &plan, NULL),
                   MHO_ERR_CONTACTS);
  assert_null(plan);
}

int main(void)
{
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(methods_agree_on_random_graphs),
      cmocka_unit_test(equal_units_are_doubled),
      cmocka_unit_test(long_chains_follow_the_closed_form),
      cmocka_unit_test(results_do_not_depend_on_the_company),
      cmocka_unit_test(threads_share_a_plan),
      cmocka_unit_test(sparse_plans_refuse_bad_entries),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
