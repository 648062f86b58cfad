/* SPDX-License-Identifier: GPL-3.0-or-later
 *
 * Layouts: regular where they can be, apart in every bundled molecule, within
 * bounded work for any graph.  test_layout [graphs]
 */
#include <mho/mho.h>

#include <glob.h>
#include <stdlib.h>
#include <time.h>

#include "base/random.h"
#include "check.h"
#include "molecule/layout.h"
#include "report/drawing.h"

static long graphs = 3000;

static double now(void)
{
  struct timespec t;
  clock_gettime(CLOCK_PROCESS_CPUTIME_ID, &t);
  return (double)t.tv_sec + 1e-9 * (double)t.tv_nsec;
}

static double length_between(const double *a, const double *b)
{
  return hypot(a[0] - b[0], a[1] - b[1]);
}

static double to_segment(const double *p, const double *a, const double *b)
{
  double ux = b[0] - a[0], uy = b[1] - a[1], square = ux * ux + uy * uy;
  double t = square > 0 ? ((p[0] - a[0]) * ux + (p[1] - a[1]) * uy) / square : 0;
  t = fmax(0, fmin(1, t));
  double at[2] = {a[0] + t * ux, a[1] + t * uy};
  return length_between(p, at);
}

static double turn(const double *a, const double *b, const double *c)
{
  return (b[0] - a[0]) * (c[1] - a[1]) - (b[1] - a[1]) * (c[0] - a[0]);
}

/* Distance of two bonds that share no atom; 0 where they cross. */
static double between_bonds(const double *a, const double *b, const double *c, const double *d)
{
  if (turn(a, b, c) * turn(a, b, d) < 0 && turn(c, d, a) * turn(c, d, b) < 0) return 0;
  return fmin(fmin(to_segment(a, c, d), to_segment(b, c, d)),
              fmin(to_segment(c, a, b), to_segment(d, a, b)));
}

static void hold_apart(const mho_drawing *d, double least)
{
  const char *name = d->molecule->name;
  for (int i = 0; i < d->points; i++)
    for (int k = i + 1; k < d->points; k++)
      if (length_between(d->position[i], d->position[k]) < 0.7)
        fail_msg("%s: points %d and %d are %g apart", name, i, k,
                 length_between(d->position[i], d->position[k]));
  for (int b = 0; b < d->bonds; b++)
    for (int c = b + 1; c < d->bonds; c++) {
      const int *p = d->bond[b], *q = d->bond[c];
      if (p[0] == q[0] || p[0] == q[1] || p[1] == q[0] || p[1] == q[1]) continue;
      double gap = between_bonds(d->position[p[0]], d->position[p[1]], d->position[q[0]], d->position[q[1]]);
      if (gap < least) fail_msg("%s: bonds %d and %d are %g apart", name, b, c, gap);
    }
}

static void bundled_molecules_do_not_overlap(void **state)
{
  (void)state;
  glob_t found;
  assert_int_equal(glob(MHO_TEST_SOURCE "/molecules/*.yaml", 0, NULL, &found), 0);
  assert_true(found.gl_pathc > 20);
  double slowest = 0;
  for (size_t i = 0; i < found.gl_pathc; i++) {
    mho_molecule m;
    mho_drawing d;
    mho_buffer svg = {0};
    assert_int_equal(mho_molecule_read(found.gl_pathv[i], NULL, NULL, &m, NULL), MHO_OK);
    double start = now();
    assert_int_equal(mho_drawing_make(&m, &d, NULL), MHO_OK);
    mho_drawing_write(&d, NULL, &svg);
    slowest = fmax(slowest, now() - start);
    hold_apart(&d, 0.45);
    mho_buffer_clear(&svg);
    mho_drawing_clear(&d);
    mho_molecule_clear(&m);
  }
  print_message("%zu molecules, slowest %.3f ms\n", found.gl_pathc, 1e3 * slowest);
  globfree(&found);
  assert_true(slowest < 0.05); /* measured far below 2 ms; sanitizers are slow */
}

/* Fused, crowded, macrocyclic and chained ones; bond lengths where they are
 * regular. */
static void known_shapes(void **state)
{
  (void)state;
  static const struct {
    const char *smiles;
    bool regular;
  } table[] = {
      {"c1ccccc1", true}, {"c1ccc2ccccc2c1", true}, {"c1cc2ccc3cccc4ccc(c1)c2c34", true},
      {"c1cc2ccc3ccc4ccc5ccc6ccc1c1c2c3c4c5c61", true}, {"c1cc2cccc3c4cccc5cccc(c(c1)c23)c45", true},
      {"C1=CC=C2C=CC=C2C=C1", true}, {"c1ccc2c(c1)Cc1ccccc12", true}, {"c1ccc2cccc-2cc1", true},
      {"C1=CC2=CC3=CC=C(N3)C=C3C=CC(=N3)C=C3C=CC(N3)=CC1=N2", false},
      {"C=CC=CC=CC=CC=C", true}, {"N#CC(C#N)=C1C=CC(=C(C#N)C#N)C=C1", true},
      {"CC(C)(C)c1cc(cc(c1)C(C)(C)C)-c1ccccc1", true}, {"c1ccc(cc1)N(c1ccccc1)c1ccccc1", true},
      {"c1ccc2c(c1)-c1ccccc1C21c2ccccc2-c2ccccc12", false}, {"C1=CC=C1", true},
      {"c1ccc2c(c1)ccc1ccc3ccc4ccc5ccccc5c4c3c12", false}, /* a helicene must open */
  };
  for (size_t i = 0; i < sizeof table / sizeof *table; i++) {
    mho_molecule m;
    mho_drawing d;
    mho_settings s = {.contacts_optional = true};
    mho_molecule_init(&m);
    assert_int_equal(mho_molecule_read_smiles(table[i].smiles, NULL, &s, 0, &m, NULL), MHO_OK);
    assert_int_equal(mho_drawing_make(&m, &d, NULL), MHO_OK);
    hold_apart(&d, table[i].regular ? 0.45 : 0.25);
    for (int b = 0; table[i].regular && b < d.bonds; b++) {
      double length = length_between(d.position[d.bond[b][0]], d.position[d.bond[b][1]]);
      if (fabs(length - 1) > 2e-6) fail_msg("%s: bond %d has length %g", table[i].smiles, b, length);
    }
    mho_drawing_clear(&d);
    mho_molecule_clear(&m);
  }
}

static void random_graphs_end(void **state)
{
  (void)state;
  double longest = 0;
  for (long i = 0; i < graphs; i++) {
    mho_random random = mho_random_stream(7, (uint64_t)i);
    bool large = i % 200 == 0;
    int points = 1 + (int)mho_random_below(&random, large ? 2500 : 40);
    int bonds = (int)mho_random_below(&random, (uint64_t)points * 2 + 1);
    int(*bond)[2] = malloc(((size_t)bonds + 1) * sizeof *bond);
    double(*position)[2] = malloc((size_t)points * sizeof *position);
    int count = 0;
    for (int b = 0; b < bonds; b++) {
      int first = (int)mho_random_below(&random, (uint64_t)points);
      int near = first + 1 + (int)mho_random_below(&random, 4);
      int second = i % 2 ? near % points : (int)mho_random_below(&random, (uint64_t)points);
      if (first == second) continue;
      bond[count][0] = first;
      bond[count++][1] = second;
    }
    mho_layout_graph graph = {points, count, (const int(*)[2])bond, NULL};
    double start = now();
    assert_int_equal(mho_layout(&graph, position, NULL), MHO_OK);
    longest = fmax(longest, now() - start);
    for (int v = 0; v < points; v++)
      assert_true(isfinite(position[v][0]) && isfinite(position[v][1]));
    free(bond);
    free(position);
  }
  print_message("%ld graphs, longest %.1f ms\n", graphs, 1e3 * longest);
  assert_true(longest < 5);
}

int main(int count, char **argument)
{
  if (count > 1) graphs = atol(argument[1]);
  const struct CMUnitTest tests[] = {
      cmocka_unit_test(bundled_molecules_do_not_overlap),
      cmocka_unit_test(known_shapes),
      cmocka_unit_test(random_graphs_end),
  };
  return cmocka_run_group_tests(tests, NULL, NULL);
}
