/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * T(E) against 60 digits on random junctions (tests/physics/junctions.json,
 * made by tests/physics/reference.py with mpmath), and its properties.
 */
#include "junctions.h"

#include "solver/spectrum.h"

/* xorshift64: G. Marsaglia, J. Stat. Softw. 8, 14 (2003). */
static int random_below(unsigned long long *state, int n)
{
  *state ^= *state << 13;
  *state ^= *state >> 7;
  *state ^= *state << 17;
  return (int)((*state >> 16) % (unsigned long long)n);
}

/* The same junction with its sites in reverse order. */
static void raw_reverse(const raw *from, raw *to)
{
  size_t n = (size_t)from->sites;
  *to = (raw){0};
  to->sites = from->sites;
  to->h = malloc(n * n * sizeof(double));
  for (size_t i = 0; i < n; i++)
    for (size_t j = 0; j < n; j++) to->h[(n - 1 - i) * n + n - 1 - j] = from->h[i * n + j];
  for (int side = 0; side < 2; side++) {
    const mho_lead *source = &from->lead[side];
    size_t m = (size_t)source->channels;
    mho_lead *lead = &to->lead[side];
    lead->channels = source->channels;
    lead->coupling_ev = malloc(m * sizeof(double));
    lead->shift_ev = calloc(m, sizeof(double));
    lead->vector = malloc(m * n * sizeof(double));
    memcpy(lead->coupling_ev, source->coupling_ev, m * sizeof(double));
    for (size_t c = 0; c < m; c++)
      for (size_t i = 0; i < n; i++)
        lead->vector[c * n + n - 1 - i] = source->vector[c * n + i];
  }
}

/* What the accuracy contract allows at a point of condition kappa. */
static double allowed_error(double kappa)
{
  double contract = fmax(1e-12, 64 * UNIT_ROUNDOFF * kappa);
  return contract > 1e-10 ? 1e-10 : contract;
}

static double relative_difference(double log10_a, double log10_b, double a, double b)
{
  if (b > 1e-290) return fabs(a - b) / b;
  return fabs(log10_a - log10_b) * 2.302585092994046;
}

/* log10 of a decimal text that may lie below the range of a double. */
static double log10_of_text(const char *text)
{
  long double value = strtold(text, NULL);
  return value > 0 ? (double)log10l(value) : -INFINITY;
}

typedef struct {
  int points, nodes, beyond, method[MHO_METHOD_COUNT];
  double worst_fraction;
} tally;

static void compare_point(const mho_plan *plan, const mho_plan *exchanged,
                          const mho_plan *reversed, const json_t *entry, size_t index,
                          double beta_scale, tally *count)
{
  double energy = json_number_value(json_object_get(entry, "E"));
  const char *text = json_string_value(json_object_get(entry, "T"));
  double exact = strtod(text, NULL), kappa = json_number_value(json_object_get(entry, "kappa"));
  mho_point point = at(plan, energy);
  count->points++;
  count->method[point.method]++;
  assert_true(isfinite(point.transmission) && isfinite(point.log10_transmission));
  assert_true(point.node || point.transmission > 0 || point.log10_transmission < -300);
  assert_true(point.transmission >= 0 && point.transmission <= mho_plan_channels(plan));
  if (strtold(text, NULL) == 0 || point.node) {
    count->nodes++;
    if (!(point.transmission <= 1e-28 * beta_scale) || !(exact <= 1e-28 * beta_scale))
      fail_msg("junction %zu E %.17g: node %d, T %g, exact %s", index, energy, point.node,
               point.transmission, text);
    return;
  }
  if (!(kappa < 1e20)) {
    count->beyond++;
    return;
  }
  double difference = relative_difference(point.log10_transmission, log10_of_text(text),
                                          point.transmission, exact);
  double allowed = allowed_error(kappa);
  if (!(difference <= allowed))
    fail_msg("junction %zu E %.17g method %d: T %.17g, exact %s, off by %.3g, allowed %.3g, "
             "claimed %.3g, kappa %.3g",
             index, energy, point.method, point.transmission, text, difference, allowed,
             point.relative_error, kappa);
  /* where T underflows its logarithm is compared, a double of its own */
  double rounding = exact > 1e-290 ? 4e-16 : 1e-15 * fabs(point.log10_transmission);
  if (difference > point.relative_error + rounding)
    fail_msg("junction %zu E %.17g method %d: off by %.3g, bound says %.3g", index, energy,
             point.method, difference, point.relative_error);
  count->worst_fraction = fmax(count->worst_fraction, difference / allowed);
  mho_point other[] = {at(exchanged, energy), at(reversed, energy)};
  for (int k = 0; k < 2; k++) {
    double change = relative_difference(other[k].log10_transmission, point.log10_transmission,
                                        other[k].transmission, point.transmission);
    bool both_nodes = other[k].node && point.transmission <= 1e-28 * beta_scale;
    if (!both_nodes && !(change <= 2 * allowed))
      fail_msg("junction %zu E %.17g: %s changes T by %.3g", index, energy,
               k ? "renumbering" : "exchange of contacts", change);
  }
}

static double coupling_product(const raw *r)
{
  double product = 1;
  for (int side = 0; side < 2; side++) {
    double sum = 0;
    for (int c = 0; c < r->lead[side].channels; c++) sum += r->lead[side].coupling_ev[c];
    product *= sum;
  }
  return product;
}

static void check_junctions(bool banded)
{
  json_t *root = load_json("junctions.json");
  json_t *list = json_object_get(root, "junctions");
  tally count = {0};
  size_t index;
  json_t *entry;
  json_array_foreach(list, index, entry)
  {
    raw r, turned;
    raw_read(entry, &r);
    raw_reverse(&r, &turned);
    mho_plan *plan = plan_of(&r, false, banded), *exchanged = plan_of(&r, true, banded);
    mho_plan *reversed = plan_of(&turned, false, banded);
    size_t k;
    json_t *point;
    json_array_foreach(json_object_get(entry, "points"), k, point)
        compare_point(plan, exchanged, reversed, point, index, coupling_product(&r), &count);
    mho_plan_free(plan);
    mho_plan_free(exchanged);
    mho_plan_free(reversed);
    raw_clear(&r);
    raw_clear(&turned);
  }
  json_decref(root);
  print_message("%d points: spectrum %d, sparse %d, elimination %d, extended %d; %d nodes, %d with "
                "kappa > 1e20; worst %.2g of what is allowed\n",
                count.points, count.method[MHO_METHOD_SPECTRUM], count.method[MHO_METHOD_SPARSE],
                count.method[MHO_METHOD_ELIMINATION], count.method[MHO_METHOD_EXTENDED],
                count.nodes, count.beyond, count.worst_fraction);
  assert_true(count.points > 1000 && count.beyond * 20 < count.points);
  for (int method = MHO_METHOD_SPECTRUM; method < MHO_METHOD_COUNT; method++)
    if (method != MHO_METHOD_REPEAT && method != MHO_METHOD_REFINED) /* of longer ones */
      assert_true(count.method[method] > 20);
}

/* A chain with random cross-links, onsite 0 or h*beta: like a large molecule. */
static void raw_random(raw *r, int sites, unsigned long long *state)
{
  size_t n = (size_t)sites;
  *r = (raw){.sites = sites, .h = calloc(n * n, sizeof(double))};
  for (size_t i = 0; i < n; i++) {
    size_t j = i + 1 < n ? i + 1 : (size_t)random_below(state, sites - 2);
    double t = -2.7 * (0.6 + 0.01 * random_below(state, 50));
    r->h[i * n + j] = r->h[j * n + i] = t;
    if (random_below(state, 5) == 0) r->h[i * n + i] = -2.7 * 0.51;
    size_t k = (size_t)random_below(state, sites);
    if (random_below(state, 6) == 0 && k != i) r->h[i * n + k] = r->h[k * n + i] = -2.7;
  }
  for (int side = 0; side < 2; side++) {
    mho_lead *lead = &r->lead[side];
    lead->channels = 1;
    lead->coupling_ev = malloc(sizeof(double));
    lead->shift_ev = calloc(1, sizeof(double));
    lead->vector = calloc(n, sizeof(double));
    lead->coupling_ev[0] = pow(10, -8 + 0.09 * random_below(state, 100));
    lead->vector[random_below(state, sites)] = 1.0;
  }
}

/* What a method claims to be its error must cover the distance to 113 bits. */
static void claimed_errors_hold_for_larger_molecules(void **unused)
{
  (void)unused;
  unsigned long long state = 12345;
  int checked = 0;
  for (int trial = 0; trial < 60; trial++) {
    raw r;
    raw_random(&r, 20 + random_below(&state, 50), &state);
    mho_plan *plan = plan_of(&r, false, trial % 2);
    mho_elimination_double *plain = mho_elimination_create_double(plan);
    mho_elimination_quad *exact = mho_elimination_create_quad(plan);
    for (int k = 0; k < 6; k++) {
      /* Half of the energies next to a level. */
      double energy = -6 + 0.012 * random_below(&state, 1000);
      if (k % 2) energy = plan->level_ev[random_below(&state, r.sites)] * (1 + 1e-9 * (k - 3));
      mho_estimate reference, estimate[3];
      mho_spectrum_batch batch;
      double energies[SPECTRUM_LANES];
      mho_elimination_evaluate_quad(plan, exact, energy, &reference);
      mho_elimination_evaluate_double(plan, plain, energy, &estimate[0]);
      mho_spectrum_evaluate(plan, energy, &estimate[1]);
      for (int l = 0; l < SPECTRUM_LANES; l++) energies[l] = l == k ? energy : 0.1 * l;
      mho_spectrum_evaluate_pair(plan, energies, &batch);
      estimate[2] = (mho_estimate){.transmission = batch.transmission[k],
                                   .relative_error = batch.relative_error[k],
                                   .first_order = true};
      if (!(reference.relative_error < 1e-14) || !reference.first_order) continue;
      for (int m = 0; m < 3; m++) {
        if (!(estimate[m].relative_error < 0.1) || !estimate[m].first_order) continue;
        double difference =
            fabs(estimate[m].transmission / reference.transmission - 1);
        if (difference > estimate[m].relative_error)
          fail_msg("trial %d energy %.17g method %d: off by %.3g, claims %.3g", trial, energy, m,
                   difference, estimate[m].relative_error);
        checked++;
      }
    }
    mho_elimination_free_double(plain);
    mho_elimination_free_quad(exact);
    mho_plan_free(plan);
    raw_clear(&r);
  }
  assert_true(checked > 300);
}

static void what_is_not_a_junction_is_refused(void **state)
{
  (void)state;
  double h[] = {0, 1, 1, 0}, skew[] = {0, 1, 2, 0}, bad[] = {0, NAN, NAN, 0};
  mho_junction junction;
  mho_plan *plan;
  assert_int_equal(mho_junction_from_hamiltonian(2, skew, 0, 0, NULL, NULL, &junction, NULL),
                   MHO_ERR_NOT_FINITE);
  mho_junction_clear(&junction);
  assert_int_equal(mho_junction_from_hamiltonian(2, bad, 0, 0, NULL, NULL, &junction, NULL),
                   MHO_ERR_NOT_FINITE);
  mho_junction_clear(&junction);
  assert_int_equal(mho_junction_from_hamiltonian(2, h, 5, 0, NULL, NULL, &junction, NULL),
                   MHO_ERR_SIZE);
  mho_junction_clear(&junction);
  assert_int_equal(mho_junction_from_hamiltonian(2, h, 2, 0, NULL, NULL, &junction, NULL), MHO_OK);
  assert_int_equal(mho_plan_create(&junction, &plan, NULL), MHO_ERR_CONTACTS);
  mho_junction_clear(&junction);
}

static void transmission_keeps_the_accuracy_contract(void **state)
{
  (void)state;
  check_junctions(false);
}

static void elimination_within_the_band_keeps_it_too(void **state)
{
  (void)state;
  check_junctions(true);
}

int main(void)
{
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(claimed_errors_hold_for_larger_molecules),
      cmocka_unit_test(what_is_not_a_junction_is_refused),
      cmocka_unit_test(elimination_within_the_band_keeps_it_too),
      cmocka_unit_test(transmission_keeps_the_accuracy_contract),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
