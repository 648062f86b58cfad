/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * What the compiled elimination claims to be its error of ln T, against a Schur
 * complement by banded elimination with row pivoting in 113 bits (N. J. Higham,
 * Accuracy and Stability of Numerical Algorithms, 2nd ed., section 9): an order of
 * its own, pivots, and ten more digits than double-double.
 */
#include "random_junction.h"

#include "solver/program.h"

#define BETA (-2.7)

enum { BAND = 4, WIDTH = 3 * BAND + 1, KEPT = 2 }; /* of random_junction */

/* Rows of E - H without the contacts' sites, row i from column i - BAND on, and
 * the columns of the contacts beside them. */
typedef struct {
  int sites;
  int *site; /* of a row */
  mho_quad (*row)[WIDTH], (*side)[KEPT];
} inside;

static inside inside_of(const raw *r, const int kept[KEPT], double energy)
{
  size_t n = (size_t)r->sites;
  inside s = {.site = malloc(n * sizeof(int)), .row = calloc(n, sizeof *s.row),
              .side = calloc(n, sizeof *s.side)};
  for (int i = 0; i < r->sites; i++)
    if (i != kept[0] && i != kept[1]) s.site[s.sites++] = i;
  for (int i = 0; i < s.sites; i++) {
    const double *h = r->h + (size_t)s.site[i] * n;
    for (int k = 0; k < 2 * BAND + 1; k++) {
      int j = i - BAND + k;
      if (j >= 0 && j < s.sites) s.row[i][k] = (i == j ? (mho_quad)energy : 0) - h[s.site[j]];
    }
    for (int c = 0; c < KEPT; c++) s.side[i][c] = -h[kept[c]];
  }
  return s;
}

static void swap_rows(inside *s, int i, int p)
{
  mho_quad row[WIDTH] = {0}, side[KEPT];
  for (int k = p - i; k < WIDTH; k++) row[k] = s->row[p][k - (p - i)];
  for (int k = 0; k < WIDTH; k++) {
    mho_quad above = s->row[i][k];
    s->row[i][k] = row[k];
    if (k >= p - i) s->row[p][k - (p - i)] = above;
  }
  memcpy(side, s->side[i], sizeof side);
  memcpy(s->side[i], s->side[p], sizeof side);
  memcpy(s->side[p], side, sizeof side);
}

/* Answers of all rows to the contacts' columns, in their place. */
static void solve(inside *s)
{
  for (int i = 0; i < s->sites; i++) {
    int last = i + BAND < s->sites ? i + BAND : s->sites - 1, best = i;
    for (int p = i + 1; p <= last; p++)
      if (mho_quad_abs(s->row[p][BAND - (p - i)]) > mho_quad_abs(s->row[best][BAND - (best - i)]))
        best = p;
    if (best != i) swap_rows(s, i, best);
    for (int p = i + 1; p <= last; p++) {
      mho_quad factor = s->row[p][BAND - (p - i)] / s->row[i][BAND];
      for (int k = BAND; k < WIDTH; k++) s->row[p][k - (p - i)] -= factor * s->row[i][k];
      for (int c = 0; c < KEPT; c++) s->side[p][c] -= factor * s->side[i][c];
    }
  }
  for (int i = s->sites; i-- > 0;)
    for (int c = 0; c < KEPT; c++) {
      for (int k = BAND + 1; k < WIDTH && i + k - BAND < s->sites; k++)
        s->side[i][c] -= s->row[i][k] * s->side[i + k - BAND][c];
      s->side[i][c] /= s->row[i][BAND];
    }
}

/* [a, b, c] of [[a, b], [b, c]], the Schur complement on the contacts' sites. */
static void schur(const raw *r, const int kept[KEPT], double energy, mho_quad result[3])
{
  size_t n = (size_t)r->sites;
  inside s = inside_of(r, kept, energy);
  solve(&s);
  for (int k = 0; k < 3; k++) {
    int from = kept[k / 2], to = kept[(k + 1) / 2];
    result[k] = (from == to ? (mho_quad)energy : 0) - r->h[(size_t)from * n + (size_t)to];
    for (int i = 0; i < s.sites; i++)
      result[k] += r->h[(size_t)from * n + (size_t)s.site[i]] * s.side[i][(k + 1) / 2];
  }
  free(s.site);
  free(s.row);
  free(s.side);
}

/* T of a Schur complement. */
static mho_quad transmission(const mho_quad s[3], const double gamma[2])
{
  mho_quad left = gamma[0] / 2, right = gamma[1] / 2;
  mho_quad re = s[0] * s[2] - left * right - s[1] * s[1], im = s[0] * right + s[2] * left;
  return 4 * left * right * s[1] * s[1] / (re * re + im * im);
}

typedef struct {
  int points, broken;
  double worst, largest; /* part of the bound that was reached; bound */
} tally;

static void check_batch(const raw *r, const mho_plan *plan, const double gamma[2],
                        const double *energy, mho_program_trace *trace, tally *count)
{
  const mho_program *program = plan->program;
  int kept[KEPT] = {plan->support[0], plan->support[1]};
  double value[PROGRAM_LANES], relative[PROGRAM_LANES];
  mho_program_forward(program, energy, PROGRAM_LANES, plan->norm_ev, trace);
  mho_program_finish_pair(plan, trace, value, relative);
  mho_program_backward(program, energy, trace);
  for (int l = 0; l < PROGRAM_LANES; l++) {
    count->points++;
    count->broken += trace->broken[l];
    if (trace->broken[l] || !(value[l] > 1e-200)) continue;
    mho_quad ours[3], exact[3];
    for (int k = 0; k < 3; k++) {
      const double *number = PROGRAM_NUMBER(trace, program->kept_slot[k / 2][(k + 1) / 2]);
      ours[k] = (mho_quad)number[l] + number[trace->lanes + l];
    }
    schur(r, kept, energy[l], exact);
    mho_quad t = transmission(exact, gamma);
    double off = (double)mho_quad_abs((transmission(ours, gamma) - t) / t);
    double bound = trace->error[l];
    if (!(bound < 1e-6)) continue; /* says that it knows nothing */
    count->worst = fmax(count->worst, off / bound);
    count->largest = fmax(count->largest, bound);
    if (!(off <= 1.05 * bound))
      fail_msg("%d sites, E %.17g: off by %.3g, bound %.3g", plan->sites, energy[l], off, bound);
    if (!(fabs(value[l] - (double)t) <= (relative[l] + bound) * (double)t))
      fail_msg("%d sites, E %.17g: T off by more than %.3g", plan->sites, energy[l], relative[l]);
  }
}

/* Levels of the molecule without the contacts' sites, where answers are large. */
static int inner_levels(const raw *r, const mho_plan *plan, double **level)
{
  int n = 0;
  double *h = malloc((size_t)r->sites * (size_t)r->sites * sizeof(double));
  for (int i = 0; i < r->sites; i++) {
    if (i == plan->support[0] || i == plan->support[1]) continue;
    for (int j = 0; j < r->sites; j++)
      if (j != plan->support[0] && j != plan->support[1])
        h[n++] = r->h[(size_t)i * (size_t)r->sites + (size_t)j];
  }
  n = r->sites - 2;
  double one = 1, zero = 0, *vector = calloc((size_t)n, sizeof(double));
  vector[0] = 1;
  mho_lead lead = {1, &one, &zero, vector, NULL};
  mho_junction junction;
  assert_int_equal(mho_junction_from_hamiltonian(n, h, 0, 0, &lead, &lead, &junction, NULL), MHO_OK);
  *level = malloc((size_t)n * sizeof(double));
  memcpy(*level, junction.level_ev, (size_t)n * sizeof(double));
  mho_junction_clear(&junction);
  free(vector);
  free(h);
  return n;
}

/* A random energy, a zero pivot, or next to a level of the whole or of its inside. */
static double some_energy(int kind, const mho_plan *plan, const double *inner, int inners)
{
  double away = pow(10, -10 * uniform()) * (uniform() < 0.5 ? -1 : 1);
  if (kind % 4 == 1) return plan->level_ev[(size_t)(uniform() * plan->sites)] + (kind < 8 ? 0 : away);
  if (kind % 4 == 2 && inners) return inner[(size_t)(uniform() * inners)] + away;
  if (kind % 4 == 3) return (kind < 8 ? BETA * (0.51 * (kind / 4)) : 0) + (kind < 12 ? 0 : away);
  return 12 * uniform() - 6;
}

static void check_junction(int sites, tally *count)
{
  double gamma[2], zero = 0, energy[PROGRAM_LANES], *inner = NULL;
  double *vectors = malloc(2 * (size_t)sites * sizeof(double));
  raw r = random_junction(sites, gamma, &zero, vectors);
  mho_plan *plan = plan_of(&r, false, false);
  mho_program_trace trace = {0};
  if (plan->program && mho_program_is_pair(plan)) {
    int inners = inner_levels(&r, plan, &inner);
    assert_int_equal(mho_program_trace_create(plan->program, &trace), MHO_OK);
    for (int batch = 0; batch < 2; batch++) {
      for (int l = 0; l < PROGRAM_LANES; l++) energy[l] = some_energy(l % 16, plan, inner, inners);
      check_batch(&r, plan, gamma, energy, &trace, count);
    }
  }
  mho_program_trace_clear(&trace);
  mho_plan_free(plan);
  free(inner);
  free(vectors);
  free(r.h);
}

static void bounds_hold_against_113_bits(void **state)
{
  (void)state;
  tally count = {0};
  for (int trial = 0; trial < 60; trial++) check_junction(4 + trial, &count);
  for (int trial = 0; trial < 3; trial++) check_junction(200 + 400 * trial, &count);
  print_message("%d points, %d with a pivot too small; %.2g of the bound reached, up to %.2g\n",
                count.points, count.broken, count.worst, count.largest);
  assert_true(count.points > 1000 && count.broken < count.points / 2);
  assert_true(count.worst > 1e-4); /* and is not far from needed */
}

/* Each number is rounded a few times only, however long the molecule. */
static void eliminations_are_balanced(void **state)
{
  (void)state;
  for (int sites = 1000; sites <= 10000; sites *= 10) {
    double gamma = 1, zero = 0, *vector = calloc(2 * (size_t)sites, sizeof(double));
    mho_entry *entry = malloc((size_t)sites * sizeof *entry);
    for (int i = 0; i + 1 < sites; i++) entry[i] = (mho_entry){i, i + 1, BETA};
    vector[0] = vector[2 * sites - 1] = 1;
    mho_lead left = {1, &gamma, &zero, vector, NULL};
    mho_lead right = {1, &gamma, &zero, vector + sites, NULL};
    mho_plan *plan;
    assert_int_equal(
        mho_plan_create_sparse(sites, entry, (size_t)sites - 1, &left, &right, &plan, NULL), MHO_OK);
    const mho_program *program = plan->program;
    assert_int_equal(program->steps, sites - 2);
    assert_true(program->roundings <= 2 * ceil(log2(sites)));
    assert_true(program->slots <= 3 * ceil(log2(sites)) && program->taped < 2 * (size_t)sites);
    mho_plan_free(plan);
    free(vector);
    free(entry);
  }
}

int main(void)
{
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(bounds_hold_against_113_bits),
      cmocka_unit_test(eliminations_are_balanced),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
