/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Chains as electrodes: a perfect chain transmits everything; and the closed
 * form of the source-and-sink potential (B. T. Pickup and P. W. Fowler, Chem.
 * Phys. Lett. 459, 198 (2008); its shape from memory) over the characteristic
 * polynomials s, t, u, v of the molecule without none, l, r and both sites:
 *
 *   T = 4 b_L b_R sin(q_L) sin(q_R) (u t - s v) /
 *       |e^(-i(q_L+q_R)) s - e^(-i q_R) b_L t - e^(-i q_L) b_R u + b_L b_R v|^2,
 *
 * b = V^2 / hopping of the chain, E = center + 2 hopping cos(q).
 */
#include "junctions.h"

#include <complex.h>

#include <mho/inside.h>
#include <mho/nodes.h>

enum { SITES_MAX = 10 };

/* det(E - H) without the sites of `left_out`. */
static long double determinant(int n, const double *h, double energy, unsigned left_out)
{
  long double a[SITES_MAX][SITES_MAX], result = 1;
  int kept[SITES_MAX], m = 0;
  for (int i = 0; i < n; i++)
    if (!(left_out >> i & 1)) kept[m++] = i;
  for (int i = 0; i < m; i++)
    for (int j = 0; j < m; j++)
      a[i][j] = (i == j ? energy : 0) - (long double)h[kept[i] * n + kept[j]];
  for (int k = 0; k < m; k++) {
    int p = k;
    for (int i = k; i < m; i++)
      if (fabsl(a[i][k]) > fabsl(a[p][k])) p = i;
    if (a[p][k] == 0) return 0;
    for (int j = 0; j < m; j++) {
      long double swap = a[k][j];
      a[k][j] = a[p][j];
      a[p][j] = swap;
    }
    result *= p == k ? a[k][k] : -a[k][k];
    for (int i = k + 1; i < m; i++)
      for (int j = m - 1; j >= k; j--) a[i][j] -= a[i][k] / a[k][k] * a[k][j];
  }
  return result;
}

static double closed_form(int n, const double *h, int l, int r, const mho_chain_electrode chain[2],
                          double energy)
{
  long double s = determinant(n, h, energy, 0), t = determinant(n, h, energy, 1u << l);
  long double u = determinant(n, h, energy, 1u << r);
  long double v = l == r ? 0 : determinant(n, h, energy, 1u << l | 1u << r);
  long double b[2], q[2];
  for (int side = 0; side < 2; side++) {
    b[side] = chain[side].joint_ev * chain[side].joint_ev / chain[side].hopping_ev;
    q[side] = acosl((energy - chain[side].center_ev) / (2 * (long double)chain[side].hopping_ev));
    if (b[side] < 0) q[side] = -q[side]; /* waves leave the molecule */
  }
  long double complex d = cexpl(-I * (q[0] + q[1])) * s - cexpl(-I * q[1]) * b[0] * t -
                          cexpl(-I * q[0]) * b[1] * u + b[0] * b[1] * v;
  return (double)(4 * b[0] * b[1] * sinl(q[0]) * sinl(q[1]) * (u * t - s * v) /
                  (creall(d) * creall(d) + cimagl(d) * cimagl(d)));
}

static mho_plan *chain_plan(int n, const double *h, int l, int r,
                            const mho_chain_electrode chain[2])
{
  double unused = 0, left[SITES_MAX] = {0}, right[SITES_MAX] = {0};
  left[l] = right[r] = 1;
  mho_lead a = {1, &unused, &unused, left, &chain[0]}, b = {1, &unused, &unused, right, &chain[1]};
  mho_junction junction;
  mho_plan *plan;
  assert_int_equal(mho_junction_from_hamiltonian(n, h, 0, 0, &a, &b, &junction, NULL), MHO_OK);
  assert_int_equal(mho_plan_create(&junction, &plan, NULL), MHO_OK);
  mho_junction_clear(&junction);
  return plan;
}

static void a_perfect_chain_transmits_everything(void **state)
{
  (void)state;
  double h[36] = {0};
  for (int i = 0; i < 5; i++) h[i * 6 + i + 1] = h[(i + 1) * 6 + i] = -2.7;
  mho_chain_electrode same[2] = {{0, -2.7, -2.7}, {0, -2.7, -2.7}};
  mho_plan *plan = chain_plan(6, h, 0, 5, same);
  for (double energy = -5.35; energy < 5.4; energy += 0.17)
    assert_close(at(plan, energy).transmission, 1.0, 1e-12);
  assert_int_equal(at(plan, 5.41).method, MHO_METHOD_NO_BAND);
  assert_true(at(plan, 5.41).node && at(plan, -7).node);
  mho_pole pole[6];
  assert_int_equal(mho_poles(plan, pole, NULL), MHO_ERR_RANGE);
  mho_nodes nodes; /* do not depend on electrodes */
  assert_int_equal(mho_nodes_find(plan, &nodes, NULL), MHO_OK);
  assert_int_equal(nodes.count, 0);
  mho_nodes_clear(&nodes);
  mho_plan_free(plan);
}

static void source_and_sink_agree(void **state)
{
  (void)state;
  double h[100] = {0};
  for (int i = 0; i < 10; i++) h[i * 10 + (i + 1) % 10] = h[(i + 1) % 10 * 10 + i] = -2.7;
  h[3 * 10 + 9] = h[9 * 10 + 3] = -2.7; /* azulene */
  h[44] = -1.4;
  mho_chain_electrode chain[2] = {{0, -2.7, 1.1}, {0.3, 3.0, 0.4}};
  int contacts[][2] = {{0, 2}, {1, 6}, {5, 7}, {2, 2}};
  for (int k = 0; k < 4; k++) {
    mho_plan *plan = chain_plan(10, h, contacts[k][0], contacts[k][1], chain);
    for (double energy = -5.3; energy < 5.3; energy += 0.0973) {
      double exact = closed_form(10, h, contacts[k][0], contacts[k][1], chain, energy);
      assert_close(at(plan, energy).transmission, exact, 1e-11);
    }
    mho_plan_free(plan);
  }
}

/* Views at one energy are those of the Gamma and shift there: against a wide band
 * that has them.  The junction owns its chain. */
static void views_are_those_of_the_wide_band_at_that_energy(void **state)
{
  (void)state;
  double h[36] = {0}, left[6] = {1}, right[6] = {0, 0, 0, 1}, energy = 0.9;
  for (int i = 0; i < 6; i++) h[i * 6 + (i + 1) % 6] = h[(i + 1) % 6 * 6 + i] = -2.7;
  mho_chain_electrode chain = {0.2, -1.5, 0.8};
  double x = (energy - chain.center_ev) / 2, strength = 0.8 * 0.8 / (1.5 * 1.5);
  double gamma = 2 * strength * sqrt(1.5 * 1.5 - x * x), shift = strength * x, none = 0, half = 0.5;
  mho_lead wide[2] = {{1, &gamma, &shift, left, NULL}, {1, &half, &none, right, NULL}};
  mho_lead narrow[2] = {{1, &none, &none, left, &chain}, wide[1]};
  mho_inside view[2], outside;
  for (int k = 0; k < 2; k++) {
    mho_lead *lead = k ? narrow : wide;
    mho_junction junction;
    mho_plan *plan;
    assert_int_equal(mho_junction_from_hamiltonian(6, h, 6, 0, &lead[0], &lead[1], &junction, NULL),
                     MHO_OK);
    if (k) chain.joint_ev = 99;
    assert_int_equal(mho_plan_create(&junction, &plan, NULL), MHO_OK);
    assert_int_equal(mho_inside_compute(&junction, plan, energy, &view[k], NULL), MHO_OK);
    if (k) assert_int_equal(mho_inside_compute(&junction, plan, 3.3, &outside, NULL), MHO_OK);
    mho_plan_free(plan);
    mho_junction_clear(&junction);
  }
  assert_false(view[1].outside_band);
  assert_close(view[1].transmission, view[0].transmission, 1e-12);
  assert_close(view[1].eigenchannel[0], view[0].transmission, 1e-12);
  for (size_t i = 0; i < view[0].bonds; i++)
    assert_near(view[1].bond[i].flow, view[0].bond[i].flow, 1e-13);
  for (size_t k = 0; k < view[0].orbitals; k++)
    assert_near(view[1].orbital[k].alone, view[0].orbital[k].alone, 1e-13);
  assert_true(outside.outside_band && !outside.flows && outside.transmission == 0);
  assert_true(outside.bonds == 6 && outside.bond[0].flow == 0 && outside.orbitals == 6);
  for (int k = 0; k < 2; k++) mho_inside_clear(&view[k]);
  mho_inside_clear(&outside);
}

static void a_chain_without_hopping_is_refused(void **state)
{
  (void)state;
  double h = 0, unused = 0, one = 1;
  mho_chain_electrode bad = {0, 0, 1};
  mho_lead lead = {1, &unused, &unused, &one, &bad};
  mho_junction junction;
  mho_plan *plan;
  assert_int_equal(mho_junction_from_hamiltonian(1, &h, 0, 0, &lead, &lead, &junction, NULL), MHO_OK);
  assert_int_equal(mho_plan_create(&junction, &plan, NULL), MHO_ERR_RANGE);
  assert_null(plan);
  mho_junction_clear(&junction);
}

int main(void)
{
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(a_perfect_chain_transmits_everything),
      cmocka_unit_test(source_and_sink_agree),
      cmocka_unit_test(views_are_those_of_the_wide_band_at_that_energy),
      cmocka_unit_test(a_chain_without_hopping_is_refused),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
